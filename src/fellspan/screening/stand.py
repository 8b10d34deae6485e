"""What stands at the ends of many paths and what rays must clear: antennas, own cover out, how far heights may be wrong.

`links.ends`, `links.own_building` and `links.uncertainty` on arrays, for paths on which rasters alone count. Knows no rays.
"""

from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

from fellspan.links.ends import ROOF_DOUBT_M, ROOF_FROM_M
from fellspan.links.own_building import ERRORS, NEAR_M, NEAR_SHARE, SAME_SPOT_M
from fellspan.screening.pairs import HEIGHT_REFERENCES, SiteColumns
from fellspan.screening.profiles import Profiles
from fellspan.vocabulary import COVER_KINDS

Floats = NDArray[np.float64]
Index = NDArray[np.int64]

_GROUND, _ROOF, _SEA = (HEIGHT_REFERENCES.index(word) for word in ("ground", "roof", "sea"))
_BUILDING, _OTHER = COVER_KINDS.index("building"), COVER_KINDS.index("other")
_BELOW_M: Final = 1e-9


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Antennas:
    """Antennas at one end, columns (q,), levels m above sea level."""

    amsl_m: Floats
    refused: NDArray[np.bool_]
    """Below ground, or measured from a roof that neither the site nor the data give,"""
    unroofed: NDArray[np.bool_]
    """the latter."""
    of_roof: NDArray[np.bool_]
    """Whether its error is that of the surface there: the roof was read from the data."""
    of_sea: NDArray[np.bool_]
    roof_m: Floats
    """The typed roof above ground; NaN where none is typed or nothing is measured from it."""

    def rows(self, rows: Index | NDArray[np.bool_]) -> "Antennas":
        """Some of them."""
        return Antennas(
            amsl_m=self.amsl_m[rows],
            refused=self.refused[rows],
            unroofed=self.unroofed[rows],
            of_roof=self.of_roof[rows],
            of_sea=self.of_sea[rows],
            roof_m=self.roof_m[rows],
        )


def antennas_at(sites: SiteColumns, index: Index, profiles: Profiles, *, at_a: bool, ground_is_bare: bool) -> Antennas:
    """The antennas of sites `index`, (q,), at one end of profiles."""
    end = 0 if at_a else -1
    ground, height = profiles.ground_m[:, end], sites.height_m[index]
    reference = sites.height_reference[index]
    typed = sites.roof_m[index]
    above_roof = reference == _ROOF
    has_roof = ~np.isnan(typed)
    if not ground_is_bare:
        # The surface holds the roof.
        roof, known, read = np.zeros(ground.shape), np.ones(ground.shape, dtype=np.bool_), above_roof
    elif profiles.cover_m is None or profiles.cover_kind is None:
        roof, known, read = np.where(has_roof, typed, 0.0), has_roof, np.zeros(ground.shape, dtype=np.bool_)
    else:
        cover, kind = profiles.cover_m[:, end], profiles.cover_kind[:, end]
        held = ((kind == _BUILDING) & (cover > 0.0)) | ((kind == _OTHER) & (cover >= ROOF_FROM_M))
        roof = np.where(has_roof, typed, np.where(held, cover, 0.0))
        known, read = has_roof | held, above_roof & ~has_roof
    amsl = np.where(reference == _SEA, height, ground + np.where(above_roof, roof, 0.0) + height)
    refused = (above_roof & ~known) | ~np.isfinite(amsl) | (amsl < ground - _BELOW_M)
    return Antennas(
        amsl_m=amsl,
        refused=refused,
        unroofed=above_roof & ~known,
        of_roof=read,
        of_sea=reference == _SEA,
        roof_m=np.where(above_roof, typed, np.nan),
    )


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Standings:
    """What rays must clear along profiles, own cover out; (q, n). `left_out_m` is -inf where nothing was left out."""

    surface_m: Floats
    cover_kind: NDArray[np.int8] | None
    left_out_m: Floats | None
    bared: NDArray[np.bool_] | None
    """Where cover was left out; None where it was nowhere."""


def standings(profiles: Profiles) -> Standings:
    """Take the cover that antennas stand on, or in, out of profiles."""
    if profiles.cover_m is None or profiles.cover_kind is None:
        return Standings(surface_m=profiles.ground_m, cover_kind=None, left_out_m=None, bared=None)
    surface = profiles.ground_m + profiles.cover_m
    out = _near_ends(profiles) & (profiles.cover_m > 0.0)
    if not out.any():
        return Standings(surface_m=surface, cover_kind=profiles.cover_kind, left_out_m=None, bared=None)
    return Standings(
        surface_m=np.where(out, profiles.ground_m, surface),
        cover_kind=np.where(out, 0, profiles.cover_kind).astype(np.int8),
        left_out_m=np.where(out, surface, -np.inf),
        bared=out,
    )


def _near_ends(profiles: Profiles, *, at_a: bool | None = None) -> NDArray[np.bool_]:
    """Samples at an antenna's own spot: at either end, or at one of them."""
    near = np.minimum(NEAR_M, NEAR_SHARE * profiles.length_m)[:, np.newaxis] + SAME_SPOT_M
    distance = profiles.distance_m
    by_a, by_b = distance <= near, distance >= profiles.length_m[:, np.newaxis] - near
    return by_a | by_b if at_a is None else by_a if at_a else by_b


def roof_doubts(antennas: Antennas, profiles: Profiles, *, at_a: bool) -> NDArray[np.bool_]:
    """Where a typed roof stands above the building in the data, (q,): the verdict is then 'marginal' at most."""
    none = np.zeros(antennas.roof_m.shape, dtype=np.bool_)
    if profiles.cover_m is None or profiles.cover_kind is None or not np.isfinite(antennas.roof_m).any():
        return none
    houses = np.isin(profiles.cover_kind, (_BUILDING, _OTHER)) & (profiles.cover_m >= ROOF_FROM_M)
    houses &= _near_ends(profiles, at_a=at_a)
    held = np.where(houses, profiles.cover_m, 0.0).max(axis=1)
    sigma = profiles.sigma_m[:, 0 if at_a else -1]
    with np.errstate(invalid="ignore"):
        return np.asarray((held > 0.0) & (antennas.roof_m - held > ROOF_DOUBT_M + ERRORS * sigma))


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class HeightErrors:
    """Standard errors: of the antennas' levels, (q,); of what must be cleared, (q, n) or (q, 1)."""

    a_m: Floats
    b_m: Floats
    surface_m: Floats


def height_errors(profiles: Profiles, stands: Standings, a: Antennas, b: Antennas) -> HeightErrors:
    """How far heights may be wrong against the rays."""
    bare_a, bare_b = _bare_error_m(profiles, 0), _bare_error_m(profiles, -1)
    errors = [
        np.where(end.of_sea, 0.0, np.where(end.of_roof, profiles.sigma_m[:, column], bare))
        for end, bare, column in ((a, bare_a, 0), (b, bare_b, -1))
    ]
    surface = profiles.sigma_m
    if stands.bared is not None:
        near_a = profiles.distance_m < 0.5 * profiles.length_m[:, np.newaxis]
        ground = np.where(near_a, bare_a[:, np.newaxis], bare_b[:, np.newaxis])
        surface = np.where(stands.bared, np.minimum(surface, ground), surface)
    return HeightErrors(a_m=errors[0], b_m=errors[1], surface_m=surface)


def _bare_error_m(profiles: Profiles, column: int) -> Floats:
    """Standard error of the ground at an end, (q,): of its source where that is bare anywhere, else the stated one there."""
    own, stated = profiles.ground_sigma_m[:, column], profiles.sigma_m[:, column]
    if profiles.cover_m is None:
        return own
    alike = (profiles.cover_m == 0.0) & (profiles.source == profiles.source[:, column][:, np.newaxis])
    return np.where(alike.any(axis=1), np.minimum(own, stated), stated)
