"""Figures, one file a figure: functions that return a matplotlib Figure, most of them of a product's Dataset.

This floor knows matplotlib, and is the only one that does; it must not know run files, the command line, or how a
product was traced.
"""
