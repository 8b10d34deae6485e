"""What to verify on the ground before anyone builds, ranked: the list that turns a desk study into a surveyed plan.

For each point the highest top that every criterion still accepts there, so that a person with a staff or a tape can decide on
the spot. Reads levels and computes no clearance of its own.
"""

import math
from collections.abc import Iterator
from dataclasses import dataclass, replace
from typing import Final

import numpy as np
from numpy.typing import NDArray

from fellspan.links.causes import cover_words
from fellspan.links.clearance import TOLERANCE_M
from fellspan.links.doubts import zone_edges_m
from fellspan.links.levels import PathLevels
from fellspan.links.own_building import NEAR_M
from fellspan.links.result import LinkResult
from fellspan.links.verdicts import UNLISTED_M
from fellspan.terrain.profile import MEASURED_TOP, PathProfile

Floats = NDArray[np.float64]

SAME_PLACE_M: Final = 5.0
"""Points nearer to each other than this are one walk."""
MOST_UNLISTED: Final = 8
"""Places where something that no data list could reach the zone: the closest few, far enough apart to be worth the walk."""
APART_SHARE, APART_M = 0.04, 100.0
HOPELESS_SIGMAS: Final = 3.0
"""Where the data reach this many standard errors too high already, what they may lack there decides nothing (our own rule)."""
MEASURED_WORDS: Final = ("no", "ground", "ground and top")
"""What was surveyed, by the codes of `PathProfile.measured`."""


@dataclass(frozen=True, slots=True, kw_only=True)
class SurveyPoint:
    """One point to verify; levels in m above sea level.

    `highest_top_m` is the highest top that every criterion still accepts there, `spare_m` how far the top known now stays
    under it (negative where it is too high already); both None at the sites. `rank` counts from 1 within the link: what nobody
    has measured comes first, that which most easily turns the verdict ahead; the sites are last. `label` is for views.
    """

    link: str
    rank: int
    verify: str
    from_a_m: float
    latitude_deg: float
    longitude_deg: float
    stands_there: str
    ground_m: float
    top_m: float
    highest_top_m: float | None
    spare_m: float | None
    sigma_m: float
    measured: str
    label: str = ""


def label_of(number: int, rank: int) -> str:
    """What a point is called everywhere: `L02-05` is the fifth of the second link."""
    return f"L{number:02d}-{rank:02d}"


def survey_list(result: LinkResult, profile: PathProfile, levels: PathLevels) -> tuple[SurveyPoint, ...]:
    """The points of one link, ranked; `profile` has the same samples as `levels`."""
    spare = (levels.available_m - levels.need_m).min(axis=0)
    listed = (*_listed(result), *_unlisted(profile, levels, spare))
    points = [_point(result, profile, levels, spare, *item) for item in listed]
    joined: list[SurveyPoint] = []
    for point in sorted(points, key=_urgency):
        twin = next((i for i, kept in enumerate(joined) if abs(kept.from_a_m - point.from_a_m) < SAME_PLACE_M), None)
        if twin is None:
            joined.append(point)
        elif point.verify not in joined[twin].verify:
            joined[twin] = replace(joined[twin], verify=f"{joined[twin].verify}; {point.verify}")
    joined = sorted((*joined, *_beside(result, profile, levels)), key=_urgency)
    sites = (_site(result, profile, end) for end in ("A", "B"))
    return tuple(replace(point, rank=rank) for rank, point in enumerate((*joined, *sites), start=1))


def _urgency(point: SurveyPoint) -> tuple[bool, float, float]:
    """Measured tops last; then by spare height in standard errors, where a decimetre is the best that a survey does."""
    return (
        point.measured == MEASURED_WORDS[MEASURED_TOP],
        (point.spare_m or 0.0) / max(point.sigma_m, 0.1),
        point.from_a_m,
    )


def _listed(result: LinkResult) -> Iterator[tuple[float, str, str]]:
    """What the criteria found: governing points and obstructions, as (from A in m, what to verify, what stands there)."""
    for criterion in result.clearance:
        yield criterion.worst_at_m, f"governing point, {criterion.criterion}", criterion.cause
        for item in criterion.obstructions:
            yield item.worst_at_m, f"obstruction, {criterion.criterion}", item.cause


def _unlisted(profile: PathProfile, levels: PathLevels, spare: Floats) -> Iterator[tuple[float, str, str]]:
    """Where a tree or building that no data list would reach the required zone and nobody has measured, closest first."""
    distance = levels.distance_m
    open_to = (spare < UNLISTED_M) & (profile.measured != MEASURED_TOP)
    open_to &= spare > -HOPELESS_SIGMAS * np.maximum(profile.sigma_m, 0.1)
    open_to &= np.minimum(distance, distance[-1] - distance) > NEAR_M  # nearer is the site itself
    apart_m = max(APART_SHARE * profile.length_m, APART_M)
    taken: list[float] = []
    for index in np.flatnonzero(open_to)[np.argsort(spare[open_to], kind="stable")].tolist():
        at_m = float(distance[index])
        if any(abs(at_m - other) < apart_m for other in taken):
            continue
        taken.append(at_m)
        cover = float(profile.cover_m[index])
        here = cover_words(int(profile.cover_kind[index]), cover) if cover > 0.0 else "bare in the data"
        yield at_m, "nothing that the data lack stands here", here
        if len(taken) == MOST_UNLISTED:
            return


def _point(
    result: LinkResult,
    profile: PathProfile,
    levels: PathLevels,
    spare: Floats,
    at_m: float,
    verify: str,
    stands_there: str,
) -> SurveyPoint:
    index = int(np.argmin(np.abs(levels.distance_m - at_m)))
    top = float(levels.surface_m[index])
    return SurveyPoint(
        link=result.name,
        rank=0,
        verify=verify,
        from_a_m=float(levels.distance_m[index]),
        latitude_deg=float(profile.latitude_deg[index]),
        longitude_deg=float(profile.longitude_deg[index]),
        stands_there=stands_there,
        ground_m=float(profile.ground_m[index]),
        top_m=top,
        highest_top_m=top + float(spare[index]),
        spare_m=float(spare[index]),
        sigma_m=float(profile.sigma_m[index]),
        measured=MEASURED_WORDS[int(profile.measured[index])],
    )


def _beside(result: LinkResult, profile: PathProfile, levels: PathLevels) -> Iterator[SurveyPoint]:
    """What stands beside the path inside the required zone; it is not on the path, so it is no one walk with what is.

    Where its top is not known, `top_m` is that of the path there and `spare_m` None.
    """
    rows = [(item.k or result.median_k, item.required_fraction) for item in result.clearance]
    for item in profile.beside:
        if not 0.0 < item.at_m < profile.length_m:
            continue
        highest = min(zone_edges_m(item, levels, rows, frequency_hz=result.frequency_hz), default=math.inf)
        known = math.isfinite(item.top_amsl_m)
        if not math.isfinite(highest) or (known and item.top_amsl_m - highest <= TOLERANCE_M):
            continue
        index = int(np.argmin(np.abs(levels.distance_m - item.at_m)))
        yield SurveyPoint(
            link=result.name,
            rank=0,
            verify=f"place and height of {item.name}, {item.offset_m:.1f} m beside the path",
            from_a_m=item.at_m,
            latitude_deg=float(np.interp(item.at_m, profile.distance_m, profile.latitude_deg)),
            longitude_deg=float(np.interp(item.at_m, profile.distance_m, profile.longitude_deg)),
            stands_there=f"{item.name}, beside the path" + ("" if known else ", its top not known"),
            ground_m=float(profile.ground_m[index]),
            top_m=item.top_amsl_m if known else float(levels.surface_m[index]),
            highest_top_m=highest,
            spare_m=highest - item.top_amsl_m if known else None,
            sigma_m=float(profile.sigma_m[index]),
            measured=MEASURED_WORDS[0],
        )


def _site(result: LinkResult, profile: PathProfile, letter: str) -> SurveyPoint:
    end, index = (result.ends.a, 0) if letter == "A" else (result.ends.b, -1)
    return SurveyPoint(
        link=result.name,
        rank=0,
        verify=f"position, ground and antenna height of end {letter}",
        from_a_m=float(profile.distance_m[index]),
        latitude_deg=end.latitude_deg,
        longitude_deg=end.longitude_deg,
        stands_there=f"site {end.site}",
        ground_m=end.ground_m,
        top_m=end.antenna_amsl_m,
        highest_top_m=None,
        spare_m=None,
        sigma_m=float(profile.sigma_m[index]),
        measured=MEASURED_WORDS[int(profile.measured[index])],
    )
