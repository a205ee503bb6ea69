"""Tallies and metadata to and from netCDF: layout, writing, reading.

This floor knows the product's variables and files; it must not know how a product was traced.
"""
