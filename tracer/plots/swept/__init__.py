"""Figures of a sweep's product: one number a point, against what varies.

Each figure says what the number of one point is, from that point's own product; how points lie and are drawn is shared.
"""
