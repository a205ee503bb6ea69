"""How atoms leave the ground: laws of speed, direction and place, each a map from even random numbers.

A law turns numbers u, even in [0, 1), into speeds, angles or places by inverting its distribution; the same map
serves plain and stratified random numbers. A new law is one new file here and its line in the run file's models.
"""
