"""What input files of TOML are made of: tables, fields of quantities, numbers and text, and words for what is wrong.

This floor knows keys and units; it must not know what a run, a product or an observation is.
"""
