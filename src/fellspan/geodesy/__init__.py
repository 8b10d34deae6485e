"""Positions, geodesics on the WGS 84 ellipsoid, bearings, coordinate text and magnetic declination.

Knows nothing of rasters or links. Latitude and longitude are always named and in degrees; bearings are true, 0 to 360,
unless the name says magnetic.
"""
