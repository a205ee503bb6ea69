"""Compiled particle physics: floats, arrays, NamedTuples of numbers and one random Generator.

This floor knows numbers in SI units and nothing else: no units, no names of bodies, no files, no switches in
module globals. It must not import any other floor.
"""
