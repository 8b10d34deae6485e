"""LaidBucket: pairs laid on the terrain, as arrays of one shape; what the geometry hands to the signal of a batch.

Holds arrays and nothing else: no terrain, no physics.
"""

from collections.abc import Sequence
from dataclasses import dataclass, fields

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Index = NDArray[np.int64]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class LaidBucket:
    """Pairs with about the same number of samples: per-pair columns (p,), path arrays (p, n).

    End A is the hub, end B the place. A path with fewer samples than n repeats its last sample but one, so that distances
    rise but not strictly, the first is 0 and the last the path length: maxima, minima and sums over lengths do not notice.
    """

    row: Index
    """Which of the pairs asked for."""
    hub: Index
    place: Index
    sector: Index
    """Index into `Candidates.sectors`."""
    length_m: Floats
    bearing_ab_deg: Floats
    bearing_ba_deg: Floats
    tilt_ab_deg: Floats
    tilt_ba_deg: Floats
    """Tilts at the median k, up positive."""
    a_amsl_m: Floats
    b_amsl_m: Floats
    """Levels of the antennas."""
    middle_latitude_deg: Floats
    middle_longitude_deg: Floats
    """Of the sample nearest mid-path."""
    trees_in_zone: NDArray[np.bool_]
    """Trees reach into what a criterion requires to be free."""
    distance_m: Floats
    ground_m: Floats
    surface_m: Floats
    """What a ray must clear, the antennas' own buildings out; the same array as `ground_m` where nothing stands anywhere."""
    cover_kind: NDArray[np.int8] | None
    """Index into `vocabulary.COVER_KINDS`; None where nothing stands anywhere."""
    is_sea: NDArray[np.bool_] | None
    """Samples that the study took as open sea; None where there are none."""


def pair_columns(buckets: Sequence[LaidBucket]) -> LaidBucket:
    """The columns of buckets of any widths as one bucket without samples, in their order."""
    if len(buckets) == 1:
        return buckets[0]
    count = sum(bucket.row.size for bucket in buckets)
    columns: dict[str, NDArray[np.generic]] = {}
    for field in fields(LaidBucket):
        if field.name in ("distance_m", "ground_m", "surface_m", "cover_kind", "is_sea"):
            columns[field.name] = np.zeros((count, 0))
        else:
            columns[field.name] = np.concatenate([getattr(bucket, field.name) for bucket in buckets])
    return LaidBucket(**columns)  # type: ignore[arg-type]
