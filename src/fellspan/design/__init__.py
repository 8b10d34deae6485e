"""Design: what to build. Antenna heights, how sure they are, what to verify on the ground, reflections.

Takes an assessed link and finds decisions; shows nothing, reads no file.
"""
