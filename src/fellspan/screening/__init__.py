"""Many pairs at once, as arrays: what `links` decides for one link, decided for a batch by the same functions.

Takes columns of sites and index arrays, gives columns of results; a pair's result equals its plan result. Knows nothing
of files, stores, schedulers or pages.
"""
