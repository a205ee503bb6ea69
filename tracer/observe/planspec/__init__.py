"""What a plan file may hold: the path of the observer, where the instrument points, what it is.

It must not know products or what is computed from a plan.
"""
