"""From a run file to a product: scene, batches, executors.

This floor knows how work is made, ordered and folded; it must not know the command line or figures.
"""
