"""Cited laws in NumPy and SI that make parameters for the kernels.

This floor knows release laws, surface temperature, losses and retention; it must not know run files, products
or how particles are scheduled.
"""
