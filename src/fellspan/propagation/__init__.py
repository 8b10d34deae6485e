"""Physics of radio waves over terrain: free space, refraction, Fresnel zones, diffraction.

Pure functions of numbers and arrays with no I/O. Knows nothing of terrain files, sites or links. Every formula stands here
once, with its source and validity range as data in `sources`.
"""
