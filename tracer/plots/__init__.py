"""Figures, one file a figure: functions that return a matplotlib Figure.

This floor knows matplotlib, and is the only one that does; it must not know run files or the command line.
"""
