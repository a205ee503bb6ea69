"""From a product to what an observer gets: columns, brightness, counts along lines of sight.

This floor reads Datasets and tables; it must not know how a product was traced, nor import `tracer.engine`.
"""
