"""Stretches without data, and the sentence that names one.

Knows samples and the bounds of rasters; opens nothing.
"""

from collections.abc import Callable

import numpy as np

from fellspan.errors import TerrainGapError
from fellspan.terrain.profile import Gap, PathProfile
from fellspan.terrain.samples import Samples
from fellspan.terrain.stack import RasterStack


def gaps_of(samples: Samples, ground: RasterStack, *, reason: Callable[[float, float], str]) -> tuple[Gap, ...]:
    """The stretches on which the ground is not known, from the first to the last sample without data.

    `reason` says of a stretch, from its beginning to its end in m, why it was not taken as sea.
    """
    missing = ~np.isfinite(samples.ground_m)
    if not missing.any():
        return ()
    change = np.diff(np.concatenate(([0], missing.astype(np.int8), [0])))
    starts, stops = np.flatnonzero(change > 0), np.flatnonzero(change < 0) - 1
    return tuple(
        Gap(
            from_m=float(samples.distance_m[i]),
            to_m=float(samples.distance_m[j]),
            raster=_raster_beside(samples, ground.names, int(i), int(j)),
            reason=reason(float(samples.distance_m[i]), float(samples.distance_m[j])),
        )
        for i, j in zip(starts, stops, strict=True)
    )


def _raster_beside(samples: Samples, names: tuple[str, ...], first: int, last: int) -> str:
    """The raster that answers just before a gap, else just after it, else all there are."""
    for i in (first - 1, last + 1):
        if 0 <= i < samples.source.size and 0 <= samples.source[i] < len(names):
            return names[int(samples.source[i])]
    return ", ".join(names) if len(names) <= 3 else f"{names[0]} and {len(names) - 1} more"


def gap_error(profile: PathProfile) -> TerrainGapError:
    """The error that names the first gap, in km from A, with the raster, where it ends, and the remedy."""
    gap = profile.gaps[0]
    others = len(profile.gaps) - 1
    more = f", and {others} more stretch{'es' if others > 1 else ''}" if others else ""
    called = f"'{profile.name}'" if profile.name else "the path"
    ends = ""
    if gap.from_m <= 0.0 and gap.to_m >= profile.length_m:
        middle = profile.distance_m.size // 2
        here = _place(profile, middle)
        ends = f", nothing on the whole path (middle: {here})"
    elif gap.from_m <= 0.0 or gap.to_m >= profile.length_m:
        finite = np.flatnonzero(np.isfinite(profile.ground_m))
        i = int(finite[0] if gap.from_m <= 0.0 else finite[-1])
        ends = f", which ends at {_place(profile, i)}"
    remedy = 'add a raster that covers the stretch, or set terrain.gaps = "sea" if it is open water'
    if gap.reason:
        remedy = (
            "add a raster that covers the stretch; if it is open water, survey the ground at its shore or at the end"
        )
    return TerrainGapError(
        f"terrain has no data from {gap.from_m / 1000.0:.2f} km to {gap.to_m / 1000.0:.2f} km of {called}{more}",
        f"raster: {gap.raster}{ends}",
        *([gap.reason] if gap.reason else []),
        remedy,
    )


def _place(profile: PathProfile, i: int) -> str:
    latitude, longitude = profile.latitude_deg[i], (profile.longitude_deg[i] + 180.0) % 360.0 - 180.0
    return f"{abs(latitude):.4f} {'N' if latitude >= 0 else 'S'} {abs(longitude):.4f} {'E' if longitude >= 0 else 'W'}"
