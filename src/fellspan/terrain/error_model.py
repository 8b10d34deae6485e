"""Standard errors of rasters whose maker states none, by cell size and role.

A default, to be replaced by the maker's figure wherever there is one: real errors grow on steep slopes and under trees.
"""

from typing import Final

from fellspan.vocabulary import RasterRole

GROUND_ERRORS_M: Final = (
    # up to this cell, one standard error, where the figure comes from
    (2.0, 0.3, "airborne laser scanning; common practice, no source"),
    (12.0, 2.0, "photogrammetry and fine radar models; common practice, no source"),
    (
        100.0,
        5.0,
        "SRTM class: 90 % error 5.6 to 9.0 m by continent (JPL, 2006), so 3.4 to 5.5 m standard; from memory",
    ),
    (float("inf"), 15.0, "global models of 30 arc seconds and coarser; common practice, no source"),
)
SURFACE_ERRORS_M: Final = (
    (2.0, 0.5, "as bare ground, with edges of roofs and crowns; common practice, no source"),
    (12.0, 3.0, "as bare ground, with edges of roofs and crowns; common practice, no source"),
    (100.0, 5.0, "SRTM class; as bare ground"),
    (float("inf"), 15.0, "as bare ground"),
)
COVER_ERRORS_M: Final = (
    (2.0, 1.0, "difference of two laser models; common practice, no source"),
    (12.0, 3.0, "canopy and building heights from images; common practice, no source"),
    (float("inf"), 6.0, "global canopy height models state about 6 m; from memory"),
)

_TABLES: Final = {"ground": GROUND_ERRORS_M, "surface": SURFACE_ERRORS_M, "cover": COVER_ERRORS_M}


def default_error_m(cell_m: float, role: RasterRole) -> float:
    """One standard error of height, m, of a raster with cells of `cell_m` metres on the ground."""
    return next(error for up_to, error, _ in _TABLES[role] if cell_m <= up_to)


def default_error_source(cell_m: float, role: RasterRole) -> str:
    """Where the figure of `default_error_m` comes from."""
    return next(source for up_to, _, source in _TABLES[role] if cell_m <= up_to)
