"""Figures, one file a figure: functions of a Dataset or of plain records that return a matplotlib Figure.

This floor knows matplotlib, and is the only one that does, and how quantities are read by people; it must not know run
files, how a product was traced, or the command line.
"""
