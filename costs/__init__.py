"""Prices in, money out: price lists, bills, and the faults of what people write.

Nothing here knows of a diagram, an effect or a route.
"""
