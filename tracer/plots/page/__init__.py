"""One page about a product that can be handed round: words, tables and figures in a single file.

This package knows HTML and how people read; it must not know how a product was traced, or the command line.
"""
