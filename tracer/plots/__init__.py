"""Figures of a product, one file a figure: a function of a Dataset that returns a matplotlib Figure.

This floor knows how the product's fields are read by people; it must not know how they were traced.
"""
