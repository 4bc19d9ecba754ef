"""Prices in, money out: price lists, what a choice of purchases costs, and the faults of what people write.

Nothing here knows of a diagram, an effect or a route.
"""
