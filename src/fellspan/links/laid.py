"""A link laid on a profile: ends levelled, own buildings out, roof edges in, criteria chosen, levels and errors known.

The geometry that everything else is judged on; knows nothing of signals and results.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fellspan.errors import LinkError, TerrainGapError
from fellspan.links import clearance
from fellspan.links.assess_settings import AssessSettings
from fellspan.links.criteria import Criterion, criteria_for, is_extended, worst_month_k
from fellspan.links.ends import EndLevel, end_level
from fellspan.links.levels import PathLevels
from fellspan.links.own_building import Standing, standing, with_ground_at_end, with_nodes, with_roof_edge
from fellspan.links.path_judging import PathJudgement, judge_path
from fellspan.links.site import Link
from fellspan.links.uncertainty import clearance_errors_m
from fellspan.terrain.profile import PathProfile


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Laid:
    """A link laid on a profile: ends levelled, own buildings out, roof edges in, criteria chosen, levels and errors known."""

    profile: PathProfile
    stands: Standing
    a: EndLevel
    b: EndLevel
    criteria: tuple[Criterion, ...]
    levels: PathLevels
    errors_m: NDArray[np.float64]

    @classmethod
    def out(cls, link: Link, profile: PathProfile, settings: AssessSettings) -> "Laid":
        """Lay a link on a profile; errors are those of `stood`."""
        profile, stands, a, b = stood(link, profile)
        criteria = settings.criteria or _preset_criteria(link, profile, stands, settings, a=a, b=b)
        levels = clearance.path_levels(
            profile.distance_m,
            stands.surface_m,
            a_amsl_m=a.antenna_amsl_m,
            b_amsl_m=b.antenna_amsl_m,
            k=[criterion.k for criterion in criteria],
            fraction=[criterion.fraction for criterion in criteria],
            frequency_hz=link.radio.frequency_hz,
        )
        errors_m = clearance_errors_m(profile, stands, a_error_m=a.error_m, b_error_m=b.error_m)
        return cls(profile=profile, stands=stands, a=a, b=b, criteria=criteria, levels=levels, errors_m=errors_m)

    def judged(self, link: Link, settings: AssessSettings) -> PathJudgement:
        """What the path is worth: criteria, confidence, doubts, verdict."""
        return judge_path(
            self.profile, self.stands, self.levels, self.criteria, ends=(self.a, self.b), errors_m=self.errors_m,
            median_k=settings.median_k, frequency_hz=link.radio.frequency_hz, confidence_asked=settings.confidence,
        )  # fmt: skip


def stood(link: Link, profile: PathProfile) -> tuple[PathProfile, Standing, EndLevel, EndLevel]:
    """A profile as the ends of a link state it, what a ray must clear along it, and the levels of both ends.

    Raises
    ------
    LinkError
        As `assess_in_full`.
    TerrainGapError
        The profile has no data somewhere.
    """
    _refuse_gaps(link, profile)
    a, b = end_level(link.a, profile, end="A"), end_level(link.b, profile, end="B")
    if profile.distance_m.size < 3:
        profile = with_nodes(profile, (0.5 * profile.length_m,))
    for level in (a, b):
        profile = _with_end(profile, level)
    return profile, standing(profile), a, b


def _refuse_gaps(link: Link, profile: PathProfile) -> None:
    missing = ~np.isfinite(profile.surface_m)
    if profile.gaps:
        gap = profile.gaps[0]
        from_m, to_m, raster = gap.from_m, gap.to_m, gap.raster
    elif missing.any():
        from_m, to_m = (float(at) for at in profile.distance_m[missing][[0, -1]])
        raster = "the profile"
    else:
        return
    raise TerrainGapError(
        f"terrain has no data from {from_m / 1000.0:.2f} km to {to_m / 1000.0:.2f} km of '{link.name}'",
        f"raster: {raster}",
        'add a raster that covers the stretch, or set terrain.gaps = "sea" if it is open water',
    )


def _with_end(profile: PathProfile, level: EndLevel) -> PathProfile:
    """What the user measured at one end, put into the profile: its ground level, its roof edge and parapet."""
    site = level.site
    if site.ground_amsl_m is not None:
        profile = with_ground_at_end(profile, end=level.end, ground_amsl_m=site.ground_amsl_m)
    if site.roof_edge_m is None or level.roof_m is None:
        return profile
    if site.roof_edge_m >= profile.length_m:
        raise LinkError(
            f"site '{site.name}': roof edge at {site.roof_edge_m:g} m lies beyond the other end, {profile.length_m:.1f} m away",
            "give the distance from the antenna to the edge in the direction of the link",
        )
    parapet = site.parapet_m or 0.0
    top = level.ground_m + level.roof_m + parapet
    return with_roof_edge(profile, end=level.end, edge_m=site.roof_edge_m, top_amsl_m=top, parapet_m=parapet)


def _preset_criteria(
    link: Link, profile: PathProfile, stands: Standing, settings: AssessSettings, *, a: EndLevel, b: EndLevel
) -> tuple[Criterion, ...]:
    extended = True
    if settings.preset == "p530-temperate":
        levels = clearance.path_levels(
            profile.distance_m,
            stands.surface_m,
            a_amsl_m=a.antenna_amsl_m,
            b_amsl_m=b.antenna_amsl_m,
            k=[worst_month_k(profile.length_m)],
            fraction=[0.0],
            frequency_hz=link.radio.frequency_hz,
        )
        clear = levels.available_m - levels.need_m[0]
        extended = is_extended(profile.distance_m, clearance.normalised_clearance(clear, levels.fresnel_radius_m))
    return criteria_for(settings.preset, distance_m=profile.length_m, median_k=settings.median_k, extended=extended)
