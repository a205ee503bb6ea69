"""Sweeps: one run file traced again and again, with other values of some of its keys each time.

A point of a sweep is a run like any other; nothing here traces atoms or knows physics.
"""
