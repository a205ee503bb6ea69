"""The run file: its tables as frozen records, how it is read, written and explained.

This folder knows keys, units and ranges; it must not know the catalogue or SI numbers of a scene.
"""
