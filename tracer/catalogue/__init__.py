"""Bodies and gases with the values and sources the package carries, as frozen records.

This floor knows data files and how to read them; it must not know what a run is.
"""
