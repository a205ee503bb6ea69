"""What is counted: axes, cells, volumes, batch statistics, the particle budget.

This floor knows arrays of numbers and their shapes; it must not know run files or netCDF.
"""
