"""Terrain: rasters, mosaics, cover, obstacles and surveyed points become a PathProfile, batch first.

Reads only the blocks that paths cross. Knows nothing of radio: no frequency, no antenna, no k. Nodata is never zero, and
heights of different datums are never mixed silently.
"""
