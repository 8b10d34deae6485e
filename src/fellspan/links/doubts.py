"""What holds a verdict at 'marginal' though every criterion is met: a sight line below what was left out, things beside it.

Reads levels and a profile; decides no verdict itself.
"""

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from fellspan.links import clearance
from fellspan.links.criteria import Criterion
from fellspan.links.levels import PathLevels
from fellspan.links.own_building import EndName, Standing, own_outlines
from fellspan.links.result import ExtraHeight, Ignored
from fellspan.links.words import up_m
from fellspan.terrain.profile import BesidePath, PathProfile


@dataclass(frozen=True, slots=True, kw_only=True)
class Doubt:
    """One reason against 'clear': a clause that follows 'but', and the height to add so that it falls away.

    `extra` is None where no height is known to do it.
    """

    clause: str
    extra: ExtraHeight | None


def below_left_out(
    profile: PathProfile, standing: Standing, levels: PathLevels, *, median_k: float
) -> tuple[Doubt, ...]:
    """Where the sight line at the median k passes below the own building or cover that does not block it.

    A roof that the ray must leave over its edge is the common case: the outline's far side is that edge.
    """
    bulge = clearance.bulge_m(levels.distance_m, k=median_k)
    cut = standing.left_out_m + bulge - levels.available_m
    found = []
    for item in standing.ignored:
        inside = (levels.distance_m >= item.from_m) & (levels.distance_m <= item.to_m)
        here = np.where(inside, cut, -np.inf)
        worst = int(np.argmax(here))
        if here[worst] <= clearance.TOLERANCE_M:
            continue
        found.append(
            Doubt(
                clause=_below(item, profile, cut_m=float(here[worst]), at_m=float(levels.distance_m[worst])),
                extra=_extra(here, levels.distance_m),
            )
        )
    return tuple(found)


def beside_path(
    profile: PathProfile, levels: PathLevels, criteria: Sequence[Criterion], *, median_k: float, frequency_hz: float
) -> tuple[tuple[Doubt, ...], tuple[str, ...]]:
    """Obstacles beside the path inside the part of the zone that a criterion requires, and cautions for the whole first zone.

    The zone is round: at the offset o from the path it begins sqrt(r^2 - o^2) below the ray, and r is the required fraction
    of the first zone's radius there.
    """
    doubts, cautions = [], []
    for item in profile.beside:
        if not 0.0 < item.at_m < levels.distance_m[-1]:
            continue
        rows = [(median_k, 1.0), *((criterion.k, criterion.fraction) for criterion in criteria)]
        depths = _depths_m(item, levels, rows, frequency_hz=frequency_hz)
        where = f"{item.name} stands {item.offset_m:.1f} m beside the path at {item.at_m / 1000.0:.2f} km"
        required = max(depths[1:], default=-math.inf)
        unknown = "" if math.isfinite(item.top_amsl_m) else ", its height above sea level not known"
        if required > clearance.TOLERANCE_M:
            extra = None
            if math.isfinite(required):
                three = np.array([0.0, item.at_m, levels.distance_m[-1]])
                extra = _extra(np.array([-np.inf, required, -np.inf]), three)
            doubts.append(Doubt(clause=f"{where}, inside the required part of the first zone{unknown}", extra=extra))
            cautions.append(
                f"{where}, inside the required part of the first zone{unknown}: check its place and height."
            )
        elif depths[0] > clearance.TOLERANCE_M:
            cautions.append(f"{where}, inside the first zone{unknown}: check its place and height.")
    return tuple(doubts), tuple(cautions)


def with_doubts(extra: ExtraHeight, doubts: Sequence[Doubt]) -> ExtraHeight:
    """The height that meets the criteria and takes the doubts away as well, as far as height can."""
    all_of = [extra, *(doubt.extra for doubt in doubts if doubt.extra is not None)]
    return ExtraHeight(
        a=_most([one.a for one in all_of]), b=_most([one.b for one in all_of]), both=_most([one.both for one in all_of])
    )


def _depths_m(
    item: BesidePath, levels: PathLevels, rows: Sequence[tuple[float, float]], *, frequency_hz: float
) -> list[float]:
    """How far its top reaches above the zone's lower edge at its offset, m, for each (k, fraction); infinite if unknown."""
    top = item.top_amsl_m if math.isfinite(item.top_amsl_m) else math.inf
    edges = zone_edges_m(item, levels, rows, frequency_hz=frequency_hz)
    return [top - edge if math.isfinite(edge) else -math.inf for edge in edges]


def zone_edges_m(
    item: BesidePath, levels: PathLevels, rows: Sequence[tuple[float, float]], *, frequency_hz: float
) -> list[float]:
    """Lower edge of the zone at its offset, m above sea level, for each (k, fraction); infinite where it stands outside."""
    length_m = float(levels.distance_m[-1])
    at = np.array([0.0, item.at_m, length_m])
    ray = float(np.interp(item.at_m, levels.distance_m, levels.available_m))
    radius = float(clearance.zone_radius_m(at, frequency_hz=frequency_hz)[1])
    edges = []
    for k, fraction in rows:
        half = (fraction * radius) ** 2 - item.offset_m**2
        if half <= 0.0:
            edges.append(math.inf)
        else:
            edges.append(ray - float(clearance.bulge_m(at, k=k)[1]) - math.sqrt(half))
    return edges


def _below(item: Ignored, profile: PathProfile, *, cut_m: float, at_m: float) -> str:
    end: EndName = "A" if item.end == "A" else "B"
    from_end = at_m if end == "A" else profile.length_m - at_m
    edge = item.to_m if end == "A" else profile.length_m - item.from_m
    passes = f"the sight line passes {up_m(cut_m):.1f} m below the top of {item.what}"
    if own_outlines(profile, end):
        return (
            f"{passes} {from_end:.0f} m in front of {end}, on its own building, whose roof edge lies {edge:.0f} m ahead"
        )
    return f"{passes} {from_end:.0f} m in front of {end}, left out because {end} stands there"


def _extra(shortfall_m: np.ndarray, distance_m: np.ndarray) -> ExtraHeight:
    a, b, both = (float(value) for value in clearance.extra_heights_m(shortfall_m, distance_m))
    return ExtraHeight(a=_finite(a), b=_finite(b), both=_finite(both))


def _finite(value: float) -> float | None:
    return value if math.isfinite(value) else None


def _most(heights: Sequence[float | None]) -> float | None:
    known = [height for height in heights if height is not None]
    return max(known) if len(known) == len(heights) else None
