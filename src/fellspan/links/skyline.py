"""The skyline from an antenna: how high the land stands on either side of the link, and what a crew can aim by.

Angles are those of a ray at the median k, as the tilt of the link is. Knows no pages and no antennas.
"""

from dataclasses import dataclass
from typing import Final, Literal

import numpy as np
from numpy.typing import NDArray

from fellspan.propagation.constants import EARTH_RADIUS_M
from fellspan.terrain.fan import Fan, FanObstacle

Floats = NDArray[np.float64]
LayerName = Literal["near", "middle", "far"]

HALF_WIDTH_DEG: Final = 30.0
STEP_DEG: Final = 0.2
REACH_M: Final = 15_000.0
"""Skylines look this far, or as far as the link is long where that is more (our own choice)."""
BANDS: Final[tuple[tuple[LayerName, float], ...]] = (("near", 1_000.0), ("middle", 5_000.0), ("far", np.inf))
"""Outlines and the distance to which each reaches, m (our own choice)."""
_GROWTH: Final = 0.004
"""Beyond the first stretch the step of the first look grows with this share of the distance."""
_CANDIDATES, _PARTS = 4, 8
_LANDMARKS, _PROMINENCE_DEG, _APART_DEG = 8, 0.12, 2.0
_CHUNK_RAYS: Final = 100


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class SkylineLayer:
    """The outline of what stands in one band of distance, arrays (m,); -inf and NaN where nothing does."""

    name: LayerName
    elevation_deg: Floats
    distance_m: Floats


@dataclass(frozen=True, slots=True, kw_only=True)
class Landmark:
    """A summit of the skyline: true bearing and elevation, degrees, distance and level above sea, m, and what it is."""

    bearing_deg: float
    elevation_deg: float
    distance_m: float
    top_amsl_m: float
    what: str


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Skyline:
    """The horizon seen from one antenna; arrays (m,), one value a ray.

    `offset_deg` is counted from the bearing of the link, clockwise positive. `elevation_deg` is the highest angle at which
    anything stands, at `distance_m`; -inf where the rasters hold nothing on the ray. `reach_m` is where the rasters end on it.
    """

    antenna_amsl_m: float
    k: float
    bearing_deg: float
    offset_deg: Floats
    elevation_deg: Floats
    distance_m: Floats
    reach_m: Floats
    wanted_reach_m: float
    layers: tuple[SkylineLayer, ...]
    landmarks: tuple[Landmark, ...]
    notes: tuple[str, ...]


def elevation_deg(*, distance_m: Floats, from_amsl_m: float, to_amsl_m: Floats, k: float) -> Floats:
    """Elevation angle toward points, degrees, as `budget.tilt_deg` has it for one."""
    rise = (to_amsl_m - from_amsl_m) / distance_m - 0.5 * distance_m / (k * EARTH_RADIUS_M)
    return np.asarray(np.degrees(np.arctan(rise)))


def skyline(
    fan: Fan,
    *,
    antenna_amsl_m: float,
    bearing_deg: float,
    k: float,
    link_m: float = 0.0,
    half_width_deg: float = HALF_WIDTH_DEG,
    step_deg: float = STEP_DEG,
) -> Skyline:
    """The skyline on both sides of a bearing.

    Parameters
    ----------
    fan
        Rays from the place of the antenna.
    link_m
        Length of the link: the skyline looks as far, and `REACH_M` at least.
    half_width_deg, step_deg
        How far to either side, and the step between rays, degrees.

    Returns
    -------
    skyline
        Angles within 0.01 degree of the bilinear rasters on their rays; a spike much narrower than 0.4 % of its distance may be
        missed.
    """
    sides = round(half_width_deg / step_deg)
    offset: Floats = np.arange(-sides, sides + 1, dtype=np.float64) * np.float64(step_deg)
    bearing: Floats = np.asarray(bearing_deg + offset)
    wanted = max(link_m, REACH_M)
    distance = _first_look(fan.cell_m, wanted)
    best = _Best(len(BANDS), offset.size)
    reach = np.empty(offset.size)
    for start in range(0, offset.size, _CHUNK_RAYS):
        part = slice(start, min(start + _CHUNK_RAYS, offset.size))
        reach[part] = _look(fan, bearing[part], distance, part, best, antenna_amsl_m=antenna_amsl_m, k=k)
    obstacles = fan.obstacles(bearing, wanted)
    for number, obstacle in enumerate(obstacles):
        angle = elevation_deg(distance_m=obstacle.distance_m, from_amsl_m=antenna_amsl_m, to_amsl_m=obstacle.top_m, k=k)
        angle = np.where(obstacle.distance_m <= reach[obstacle.ray][:, None], angle, -np.inf)
        angle = np.where(np.isnan(angle), -np.inf, angle)
        for column in range(angle.shape[1]):
            best.take(obstacle.ray, angle[:, column], obstacle.distance_m[:, column], obstacle.top_m[:, column], number)
    band = np.argmax(best.angle, axis=0)
    rays = np.arange(offset.size)
    result = (best.angle[band, rays], best.distance[band, rays], best.top[band, rays], best.what[band, rays])
    return Skyline(
        antenna_amsl_m=antenna_amsl_m,
        k=k,
        bearing_deg=bearing_deg,
        offset_deg=offset,
        elevation_deg=result[0],
        distance_m=result[1],
        reach_m=reach,
        wanted_reach_m=wanted,
        layers=tuple(
            SkylineLayer(name=name, elevation_deg=best.angle[i], distance_m=best.distance[i])
            for i, (name, _) in enumerate(BANDS)
        ),
        landmarks=_landmarks(bearing, *result, obstacles),
        notes=_notes(reach, wanted),
    )


def _first_look(cell_m: float, reach_m: float) -> Floats:
    half = 0.5 * cell_m
    even = np.arange(half, half / _GROWTH + half, half)
    even = even[even < reach_m]
    grown = int(max(0.0, np.log(reach_m / even[-1]) / np.log1p(_GROWTH)))
    return np.unique(np.concatenate((even, even[-1] * (1.0 + _GROWTH) ** np.arange(1, grown + 1), [reach_m])))


class _Best:
    """The highest angle found so far in each band on each ray; `what` is -1 ground, -2 trees, else an obstacle's number."""

    def __init__(self, bands: int, rays: int) -> None:
        self.angle = np.full((bands, rays), -np.inf)
        self.distance = np.full((bands, rays), np.nan)
        self.top = np.full((bands, rays), np.nan)
        self.what = np.full((bands, rays), -1, dtype=np.int64)

    def take(
        self,
        ray: NDArray[np.intp],
        angle: Floats,
        distance: Floats,
        top: Floats,
        what: NDArray[np.int64] | int,
    ) -> None:
        """Keep what is higher; each ray at most once."""
        band = np.searchsorted([end for _, end in BANDS], distance, side="left")
        higher = angle > self.angle[band, ray]
        at = (band[higher], ray[higher])
        self.angle[at], self.distance[at], self.top[at] = angle[higher], distance[higher], top[higher]
        self.what[at] = np.broadcast_to(what, angle.shape)[higher]


def _look(
    fan: Fan, bearing: Floats, distance: Floats, part: slice, best: _Best, *, antenna_amsl_m: float, k: float
) -> Floats:
    """A first look along some rays, then closer and closer at the highest places; returns how far the rasters reach."""
    found = fan.sample(bearing[:, None], distance[None, :])
    lost = np.logical_or.accumulate(~np.isfinite(found.ground_m), axis=1)
    ends = np.where(lost.any(axis=1), distance[np.maximum(lost.argmax(axis=1) - 1, 0)], distance[-1])
    angle = elevation_deg(distance_m=distance, from_amsl_m=antenna_amsl_m, to_amsl_m=found.surface_m, k=k)
    angle = np.where(lost, -np.inf, angle)
    rays = np.arange(part.start, part.stop)
    step = np.gradient(distance)
    start_m = 0.0
    for _, end_m in BANDS:
        inside = np.flatnonzero((distance > start_m) & (distance <= end_m))
        low_m, start_m = start_m, end_m
        if inside.size < 2:
            continue
        here = angle[:, inside]
        rising = np.full(here.shape, -np.inf)
        padded = np.pad(here, ((0, 0), (1, 1)), constant_values=-np.inf)
        peak = (here >= padded[:, :-2]) & (here >= padded[:, 2:])
        rising[peak] = here[peak]
        count = min(_CANDIDATES, inside.size)
        chosen = inside[np.argpartition(rising, -count, axis=1)[:, -count:]]
        centre, width = distance[chosen], step[chosen]
        for _ in range(2):
            spread = np.linspace(-1.0, 1.0, 2 * _PARTS + 1)
            at = np.clip(centre[..., None] + spread * width[..., None], low_m + 1e-6, np.minimum(end_m, distance[-1]))
            at = np.minimum(at, ends[:, None, None]).reshape(rays.size, -1)
            at = np.maximum(at, 0.05)
            closer = fan.sample(bearing[:, None], at)
            seen = elevation_deg(distance_m=at, from_amsl_m=antenna_amsl_m, to_amsl_m=closer.surface_m, k=k)
            seen = np.where(np.isfinite(seen), seen, -np.inf)
            top = seen.argmax(axis=1)
            row = np.arange(rays.size)
            what = np.where(closer.is_tree[row, top], -2, -1)
            best.take(rays, seen[row, top], at[row, top], closer.surface_m[row, top], what)
            # which of the candidates it was tells how wide the next look is
            width = np.take_along_axis(width, (top // spread.size)[:, None], axis=1) / _PARTS
            centre = at[row, top][:, None]
    return np.asarray(ends)


def _landmarks(
    bearing: Floats,
    angle: Floats,
    distance: Floats,
    top: Floats,
    what: NDArray[np.int64],
    obstacles: list[FanObstacle],
) -> tuple[Landmark, ...]:
    """The most prominent summits, from left to right."""
    finite = np.isfinite(angle)
    if not finite.any():
        return ()
    line = np.where(finite, angle, angle[finite].min())
    # Half of the time that the commands take to load went into this import; few of them draw a horizon.
    from scipy.signal import find_peaks

    peaks, facts = find_peaks(line, prominence=_PROMINENCE_DEG)
    chosen: list[int] = []
    for at in peaks[np.argsort(-facts["prominences"], kind="stable")].tolist():
        if finite[at] and all(abs(bearing[at] - bearing[other]) >= _APART_DEG for other in chosen):
            chosen.append(at)
        if len(chosen) == _LANDMARKS:
            break
    return tuple(
        Landmark(
            bearing_deg=float(bearing[at] % 360.0),
            elevation_deg=float(angle[at]),
            distance_m=float(distance[at]),
            top_amsl_m=float(top[at]),
            what=obstacles[int(what[at])].name if what[at] >= 0 else "trees" if what[at] == -2 else "hill",
        )
        for at in sorted(chosen)
    )


def _notes(reach: Floats, wanted: float) -> tuple[str, ...]:
    notes = [
        "Hanging wires, ships, cranes and survey rows are not drawn; the building that carries the antenna is left out."
    ]
    short = reach < wanted - 1.0
    if short.any():
        notes.append(
            f"The rasters end before {wanted / 1000.0:.0f} km on {100.0 * float(short.mean()):.0f} % of the rays, the first at "
            f"{float(reach.min()) / 1000.0:.1f} km: what stands beyond is not drawn."
        )
    return tuple(notes)
