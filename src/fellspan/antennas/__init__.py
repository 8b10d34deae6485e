"""Antennas: gain in every direction, from physics, data sheets, files and reference envelopes.

`mounting.py` owns direction and polarisation on the mast. Knows nothing of terrain, files of studies, or links.
"""
