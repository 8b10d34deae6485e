"""Reflections on a link: where the ray is mirrored at each k of interest, what that does to the level, and what avoids it.

Takes an assessed link and its profile; reads no file and draws nothing. One reflection at a time: where several arrive, each
is judged alone.
"""

import math
from dataclasses import dataclass, replace
from typing import Final

import numpy as np
from numpy.typing import NDArray

from fellspan.design.reflection_heights import lobing_at, null_free_heights, span_wavelengths
from fellspan.design.reflection_rays import GROUND, WATER, Rays, Traced, rays_of
from fellspan.design.reflection_result import (
    MATTERS_FROM_DB,
    End,
    KName,
    ReflectionResult,
    Spacing,
    SpecularPoint,
)
from fellspan.design.reflection_surfaces import Surface, Water, flat_surfaces, water_mask, water_surfaces
from fellspan.design.reflection_words import reflection_sentences
from fellspan.links.criteria import worst_month_k
from fellspan.links.levels import PathLevels
from fellspan.links.result import LinkResult
from fellspan.links.site import Link
from fellspan.propagation import (
    deepest_fade_db,
    frequency_separation_hz,
    inverse_k,
    pitch_of_minima_m,
    reflecting_zone_width_m,
    smooth_up_to_m,
    source,
    wavelength_m,
)
from fellspan.propagation.constants import EARTH_RADIUS_M
from fellspan.terrain.profile import PathProfile

__all__ = ["Water", "find_reflections"]

FAINT: Final = 0.05
"""A mirrored ray weaker than this moves the level by less than half a decibel and is not listed (our own rule)."""
_KEYS: Final = (
    "p530-19-reflection-point",
    "p530-19-reflection",
    "p530-19-reflecting-surface",
    "p530-19-reflection-antennas",
    "p530-19-reflection-spacing",
)
_NOTHING: Final = Water()
_ENDS: Final[tuple[End, End]] = ("a", "b")


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class _Found:
    """A point, and the surface and rays it came from."""

    point: SpecularPoint
    surface: Surface
    ray: Traced


def find_reflections(
    link: Link, *, result: LinkResult, profile: PathProfile, levels: PathLevels, water: Water = _NOTHING
) -> ReflectionResult:
    """What smooth water or ground does to a link.

    Parameters
    ----------
    link, result, profile, levels
        As assessed; `profile` has the same samples as `levels`.
    water
        Water levels, where the study states them.

    Returns
    -------
    reflections
        For k exceeded 99.9 % of the worst month, the median k and k infinite the strongest mirrored ray, then the others;
        curves and heights only where a fade of 3 dB can come of it.

    Notes
    -----
    Source keys: p530-19-reflection-point, p530-19-reflecting-surface, p530-19-reflection-antennas, two-ray-sphere.
    """
    rays, notes = rays_of(link, result)
    mask = water_mask(profile, water)
    waters = water_surfaces(profile, mask, water)
    by_k: list[list[_Found]] = []
    for name, k in _ks_of_interest(result):
        ends = {"a_amsl_m": rays.planned_a_m, "b_amsl_m": rays.planned_b_m}
        surfaces = [*waters, *flat_surfaces(profile, mask, frequency_hz=rays.frequency_hz, k=k, **ends)]
        found = [_found(rays, surface, name, k, profile, levels) for surface in surfaces]
        kept = [item for item in found if item is not None and item.point.amplitude >= FAINT]
        kept.sort(key=lambda item: (item.point.shaded_at_m is not None, -item.point.amplitude))
        by_k.append(kept)
    firsts = [found[0] for found in by_k if found]
    arriving = [item for item in firsts if item.point.shaded_at_m is None]
    main = max(arriving, key=lambda item: item.point.amplitude, default=None)
    described = ReflectionResult(
        matters=any((item.point.fade_db or math.inf) >= MATTERS_FROM_DB for item in arriving),
        sentences=(),
        points=tuple(item.point for item in (*firsts, *(item for found in by_k for item in found[1:]))),
        surface_material=None if main is None else (WATER if main.surface.kind == "water" else GROUND),
        polarization=rays.polarization,
        water_low_m=water.low_m,
        water_high_m=water.high_m,
        span_wavelengths=None,
        lobing=(),
        heights=(),
        spacing=None,
        notes=(*notes, *_horizon_notes(arriving, rays)),
        sources=tuple(source(key).reference for key in _KEYS),
    )
    if main is not None and described.matters:
        described = _with_remedies(described, main, arriving, rays, result, levels, water)
    return replace(described, sentences=reflection_sentences(described, result))


def _ks_of_interest(result: LinkResult) -> tuple[tuple[KName, float], ...]:
    return (
        ("worst month", worst_month_k(result.distance_m)),
        ("median", result.median_k),
        ("infinite", math.inf),
    )


def _found(
    rays: Rays, surface: Surface, name: KName, k: float, profile: PathProfile, levels: PathLevels
) -> _Found | None:
    ray = rays.trace(surface, k=k)
    at = float(ray.at_m)
    amplitude = float(ray.amplitude)
    if not (math.isfinite(at) and math.isfinite(amplitude)):
        return None
    start, stop = surface.edges_m(float(ray.from_m), float(ray.to_m))
    fade = float(deepest_fade_db(amplitude))
    turns = float(ray.wavelengths)
    point = SpecularPoint(
        name=name,
        k=k if math.isfinite(k) else None,
        surface=surface.kind,
        at_m=at,
        latitude_deg=float(np.interp(at, profile.distance_m, profile.latitude_deg)),
        longitude_deg=_longitude(at, profile),
        from_m=start,
        to_m=stop,
        zone_length_m=float(ray.zone_m),
        zone_width_m=float(reflecting_zone_width_m(rays.distance_m, frequency_hz=rays.frequency_hz)),
        level_m=surface.level_m(at),
        slope_mrad=1000.0 * surface.slope,
        height_a_m=float(ray.height_a_m),
        height_b_m=float(ray.height_b_m),
        grazing_mrad=1000.0 * float(ray.grazing_rad),
        path_difference_wavelengths=turns,
        from_null_wavelengths=abs(turns - round(turns)),
        coefficient=float(ray.coefficient),
        divergence=float(ray.divergence),
        roughness_m=surface.roughness_m,
        smooth_up_to_m=float(smooth_up_to_m(float(ray.grazing_rad), frequency_hz=rays.frequency_hz)),
        roughness_factor=float(ray.rough),
        partial_factor=float(ray.partial),
        discrimination_a_db=float(ray.lost_a_db) + 0.0,
        discrimination_b_db=float(ray.lost_b_db) + 0.0,
        amplitude=amplitude,
        shaded_at_m=_shaded_at_m(rays, surface, ray, k, levels),
        fade_db=fade if math.isfinite(fade) else None,
        gain_db=20.0 * math.log10(1.0 + amplitude),
        level_db=float(ray.level_db),
    )
    return _Found(point=point, surface=surface, ray=ray)


def _near_horizon(point: SpecularPoint, rays: Rays) -> bool:
    """Whether the ray grazes so closely that it can no longer be drawn as a line: below (wavelength / (2 pi k a))^(1/3)."""
    if point.k is None or point.k < 0.0:
        return False
    around = 2.0 * math.pi * point.k * EARTH_RADIUS_M
    return bool(point.grazing_mrad < 1000.0 * (float(wavelength_m(rays.frequency_hz)) / around) ** (1.0 / 3.0))


def _horizon_notes(arriving: list[_Found], rays: Rays) -> tuple[str, ...]:
    near = [item.point.name for item in arriving if _near_horizon(item.point, rays)]
    if not near:
        return ()
    words = (
        f"At the {' and the '.join(near)} k the ray grazes the surface so closely that diffraction takes over: its level there "
        "is doubtful, and heights are judged without that k."
    )
    return (words,)


def _longitude(at_m: float, profile: PathProfile) -> float:
    across = float(np.interp(at_m, profile.distance_m, np.unwrap(profile.longitude_deg, period=360.0)))
    return (across + 180.0) % 360.0 - 180.0


def _shaded_at_m(rays: Rays, surface: Surface, ray: Traced, k: float, levels: PathLevels) -> float | None:
    """Where terrain cuts a leg of the mirrored ray, the deepest cut; None where both legs are free.

    The zone that reflects is left out: what stands in it is counted as not reflecting.
    """
    x = levels.distance_m
    curve = float(inverse_k(k)) / EARTH_RADIUS_M
    bulge = 0.5 * curve * x * (rays.distance_m - x)
    at = float(ray.at_m)
    foot = surface.level_m(at) + 0.5 * curve * at * (rays.distance_m - at)
    leg_a = rays.planned_a_m + (foot - rays.planned_a_m) * x / at
    leg_b = rays.planned_b_m + (foot - rays.planned_b_m) * (rays.distance_m - x) / (rays.distance_m - at)
    above = levels.surface_m + bulge - np.where(x <= at, leg_a, leg_b)
    outside: NDArray[np.bool_] = (x < float(ray.from_m)) | (x > float(ray.to_m))
    inner = outside & (x > 0.0) & (x < x[-1])
    if not inner.any() or float(above[inner].max()) <= 0.0:
        return None
    return float(x[inner][int(np.argmax(above[inner]))])


def _with_remedies(
    described: ReflectionResult,
    main: _Found,
    arriving: list[_Found],
    rays: Rays,
    result: LinkResult,
    levels: PathLevels,
    water: Water,
) -> ReflectionResult:
    surfaces = {item.point.name: item.surface for item in arriving}
    ks = _ks_of_interest(result)
    median = rays.trace(surfaces.get("median", main.surface), k=result.median_k)
    tangents = float(median.tangent_a_m), float(median.tangent_b_m)
    spacing = None
    if all(math.isfinite(value) and value > 0.0 for value in tangents):
        pitch_a, pitch_b = (
            float(pitch_of_minima_m(rays.distance_m, other_tangent_m=other, frequency_hz=rays.frequency_hz))
            for other in (tangents[1], tangents[0])
        )
        apart = frequency_separation_hz(rays.distance_m, tangent_a_m=tangents[0], tangent_b_m=tangents[1])
        spacing = Spacing(pitch_a_m=pitch_a, pitch_b_m=pitch_b, frequency_hz=float(apart))
    clear = [item for item in arriving if not _near_horizon(item.point, rays)] or arriving
    inverse = [0.0 if item.point.k is None else 1.0 / item.point.k for item in clear]
    rises: tuple[float, ...] = (0.0,)
    tidal = main.surface.kind == "water" and main.surface.level_a_m == water.level_m
    if tidal and water.low_m is not None and water.high_m is not None:
        rises = (water.low_m - main.surface.level_a_m, 0.0, water.high_m - main.surface.level_a_m)
    pitches = (None, None) if spacing is None else (spacing.pitch_a_m, spacing.pitch_b_m)
    return replace(
        described,
        span_wavelengths=span_wavelengths(rays, main.surface, inverse_k=inverse, rises_m=rises),
        lobing=tuple(
            lobing_at(end, rays, result, [(name, k, surfaces.get(name)) for name, k in ks], pitch_m=pitch)
            for end, pitch in zip(_ENDS, pitches, strict=True)
        ),
        heights=tuple(
            null_free_heights(end, rays, result, levels, main.surface, inverse_k=inverse, rises_m=rises)
            for end in _ENDS
        ),
        spacing=spacing,
    )
