"""Which stretches of a profile can mirror a ray: water that the study states, else ground that is flat enough.

Each surface is a plane that follows the curve of the Earth. Knows nothing of antennas, polarization or levels received.
"""

from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

from fellspan.design.reflection_result import SurfaceKind
from fellspan.propagation import inverse_k, smooth_up_to_m, wavelength_m
from fellspan.propagation.constants import EARTH_RADIUS_M
from fellspan.terrain.profile import PathProfile
from fellspan.terrain.water_outlines import WaterOutlines

Floats = NDArray[np.float64]

SEA: Final = "sea level"
WATER_WITHIN_M: Final = 0.5
"""Ground as near as this to the stated water level is water (our own rule)."""
OPEN_BELOW_M: Final = 0.5
"""Ground with less cover than this can reflect (our own rule)."""
LEAST_SAMPLES: Final = 8
"""Flatness is judged over this many regular steps at least (our own rule)."""
MOST_PLANES: Final = 3
SAME_LEVEL_M: Final = 0.1
ZONE_PARTS: Final = (1.0, 0.5, 0.25)
"""Of the half-length of the Fresnel zone on the ground, over which flatness is judged (our own rule)."""
STRAY_WINDOW, STRAYS_BELOW = 21, 0.75


@dataclass(frozen=True, slots=True, kw_only=True)
class Water:
    """Water as the study states it: usual, lowest and highest level, m above sea level, and outlines of open water."""

    level_m: float | None = None
    low_m: float | None = None
    high_m: float | None = None
    outlines: WaterOutlines | None = None


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Surface:
    """A reflecting plane: `level_a_m` where it is prolonged to A, m above sea level, and `slope` toward B.

    `reflecting_m`, shape (n,), is the length that reflects between A and each sample at `distance_m`.
    """

    kind: SurfaceKind
    level_a_m: float
    slope: float
    roughness_m: float
    distance_m: Floats
    reflecting_m: Floats

    def level_m(self, at_m: float) -> float:
        """Level of the plane at a distance from A, m above sea level."""
        return self.level_a_m + self.slope * at_m

    def reflecting_between_m(self, from_m: Floats, to_m: Floats) -> Floats:
        """Length that reflects between two distances, m; NaN passes through."""
        return np.interp(to_m, self.distance_m, self.reflecting_m) - np.interp(
            from_m, self.distance_m, self.reflecting_m
        )

    def edges_m(self, from_m: float, to_m: float) -> tuple[float, float]:
        """First and last place between two distances where it reflects."""
        grown = np.interp([from_m, to_m], self.distance_m, self.reflecting_m)
        inside = (self.reflecting_m > grown[0]) & (self.reflecting_m < grown[1])
        places = self.distance_m[inside]
        if places.size == 0:
            return from_m, to_m
        first, last = int(np.argmax(inside)), inside.size - 1 - int(np.argmax(inside[::-1]))
        start = self.distance_m[first - 1] if first else places[0]
        stop = self.distance_m[min(last + 1, inside.size - 1)]
        return max(from_m, float(start)), min(to_m, float(stop))


def water_mask(profile: PathProfile, water: Water) -> NDArray[np.bool_]:
    """Samples that are open water: within an outline, filled in as sea, or ground at the stated level; shape (n,)."""
    mask = np.zeros(profile.distance_m.shape, dtype=np.bool_)
    if water.outlines is not None:
        mask |= water.outlines.inside(profile.latitude_deg, profile.longitude_deg)
    if SEA in profile.sources:
        mask |= profile.source == profile.sources.index(SEA)
    if water.level_m is not None:
        mask |= np.abs(profile.ground_m - water.level_m) <= WATER_WITHIN_M
    return np.asarray(mask & (profile.cover_m < OPEN_BELOW_M))


def water_surfaces(profile: PathProfile, mask: NDArray[np.bool_], water: Water) -> list[Surface]:
    """The waters of the path, taken as calm, one for each level: what lies at the stated one, then lakes above it or below.

    The level of a water is the median of the ground along it, unless that is within 0.5 m of the stated level.
    """
    levels: list[tuple[float, NDArray[np.bool_]]] = []
    edges = np.flatnonzero(np.diff(np.concatenate(([False], mask, [False])).astype(np.int8)))
    for first, after in zip(edges[::2].tolist(), edges[1::2].tolist(), strict=True):
        level = float(np.median(profile.ground_m[first:after]))
        if water.level_m is not None and abs(level - water.level_m) <= WATER_WITHIN_M:
            level = water.level_m
        same = next((one for known, one in levels if abs(known - level) <= SAME_LEVEL_M), None)
        if same is None:
            same = np.zeros(mask.shape, dtype=np.bool_)
            levels.append((level, same))
        same[first:after] = True
    return [
        _surface("water", profile, one, level_a_m=level, slope=0.0, roughness_m=0.0)
        for level, one in levels
        if int(one.sum()) > 1
    ]


def flat_surfaces(
    profile: PathProfile,
    water: NDArray[np.bool_],
    *,
    a_amsl_m: float,
    b_amsl_m: float,
    frequency_hz: float,
    k: float,
) -> list[Surface]:
    """Flat ground in the place and at the slope that mirrors the ray at this k.

    A line is fitted to the ground over the Fresnel zone around each sample, then over parts of the zone; where angles in and
    out are the same, and what is left over is below Rayleigh's criterion, the line is a mirror. The wider ones come first.
    """
    x, length = profile.distance_m, profile.length_m
    curve = float(inverse_k(k)) / EARTH_RADIUS_M
    from_b = length - x
    inner = (x > 0.0) & (from_b > 0.0)
    bulge = 0.5 * curve * x * from_b
    open_ground = (profile.cover_m < OPEN_BELOW_M) & ~water
    with np.errstate(divide="ignore", invalid="ignore"):
        mean = 0.5 * ((a_amsl_m - profile.ground_m - bulge) / x + (b_amsl_m - profile.ground_m - bulge) / from_b)
        zone = np.sqrt(float(wavelength_m(frequency_hz)) * x * from_b / length) / mean
    zone = np.where(mean > 0.0, zone, length)
    found: list[tuple[float, Surface]] = []
    for part in ZONE_PARTS:
        half = np.clip(part * zone, 0.5 * LEAST_SAMPLES * profile.step_m, 0.25 * length)
        fitted, slope, rest = _fits(x, profile.ground_m, half)
        tilt = slope + 0.5 * curve * (length - 2.0 * x)
        with np.errstate(divide="ignore", invalid="ignore"):
            angle_a = (a_amsl_m - fitted - bulge) / x + tilt
            angle_b = (b_amsl_m - fitted - bulge) / from_b - tilt
            smooth = np.asarray(smooth_up_to_m(np.maximum(0.5 * (angle_a + angle_b), 1e-9), frequency_hz=frequency_hz))
        unlike = angle_a - angle_b
        usable = inner & open_ground & (angle_a > 0.0) & (angle_b > 0.0) & (rest < smooth)
        for at in np.flatnonzero(usable[:-1] & usable[1:] & (unlike[:-1] * unlike[1:] <= 0.0)).tolist():
            place = float(x[at])
            if any(abs(place - other) < float(zone[at]) for other, _ in found):
                continue
            level = float(fitted[at] - slope[at] * x[at])
            near = np.abs(profile.ground_m - level - slope[at] * x) <= max(3.0 * float(rest[at]), float(smooth[at]))
            plane = _surface(
                "flat ground",
                profile,
                _run_around(at, open_ground & near),
                level_a_m=level,
                slope=float(slope[at]),
                roughness_m=float(rest[at]),
            )
            found.append((place, plane))
            if len(found) == MOST_PLANES:
                return [plane for _, plane in found]
    return [plane for _, plane in found]


def _run_around(at: int, near: NDArray[np.bool_]) -> NDArray[np.bool_]:
    """The samples that lie on a plane without a break around one of them; a few strays do not break it."""
    share = np.convolve(near, np.ones(STRAY_WINDOW), mode="same") / STRAY_WINDOW
    steady = share >= STRAYS_BELOW
    steady[at] = True
    breaks = np.flatnonzero(~steady)
    after = int(np.searchsorted(breaks, at))
    first = int(breaks[after - 1]) + 1 if after else 0
    last = int(breaks[after]) if after < breaks.size else near.size
    run = np.zeros(near.shape, dtype=np.bool_)
    run[first:last] = near[first:last]
    return run


def _surface(
    kind: SurfaceKind,
    profile: PathProfile,
    mask: NDArray[np.bool_],
    *,
    level_a_m: float,
    slope: float,
    roughness_m: float,
) -> Surface:
    steps = np.diff(profile.distance_m) * 0.5 * (mask[1:].astype(np.float64) + mask[:-1])
    return Surface(
        kind=kind,
        level_a_m=level_a_m,
        slope=slope,
        roughness_m=roughness_m,
        distance_m=profile.distance_m,
        reflecting_m=np.concatenate(([0.0], np.cumsum(steps))),
    )


def _fits(x: Floats, z: Floats, half: Floats) -> tuple[Floats, Floats, Floats]:
    """For each sample a line fitted within `half` of it: its level there, its slope, what is left over (standard deviation).

    Running sums weighed by the spacing of the samples, so that places sampled more closely do not count more.
    """
    weight = np.gradient(x)
    across, up = x - x.mean(), z - z.mean()
    first, last = np.searchsorted(x, x - half, side="left"), np.searchsorted(x, x + half, side="right")

    def total(values: Floats) -> Floats:
        sums = np.concatenate(([0.0], np.cumsum(weight * values)))
        return np.asarray(sums[last] - sums[first])

    mass = total(np.ones_like(x))
    mean_x, mean_z = total(across) / mass, total(up) / mass
    var_x = total(across**2) / mass - mean_x**2
    both = total(across * up) / mass - mean_x * mean_z
    slope = np.divide(both, var_x, out=np.zeros_like(both), where=var_x > 0.0)
    rest = np.sqrt(np.maximum(total(up**2) / mass - mean_z**2 - slope * both, 0.0))
    return np.asarray(mean_z + slope * (across - mean_x) + z.mean()), slope, np.asarray(rest)
