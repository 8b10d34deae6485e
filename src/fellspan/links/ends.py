"""From a site and a profile to the level of its antenna above sea level; refuses what cannot be, doubts what is unlikely.

Knows the height references of `Site` and the datum rule; knows nothing of rays, zones or verdicts.
"""

import math
from dataclasses import dataclass
from typing import Final

import numpy as np

from fellspan.errors import LinkError, VerticalDatumError
from fellspan.links.own_building import ERRORS, NEAR_M, NEAR_SHARE, EndName, own_outlines, own_top_m, standing
from fellspan.links.site import Site
from fellspan.links.uncertainty import bare_error_m
from fellspan.terrain.profile import PathProfile
from fellspan.terrain.units import datum_key, is_ellipsoidal
from fellspan.vocabulary import COVER_KINDS

ROOF_FROM_M: Final = 2.0
"""Cover of unknown kind at a site counts as its roof from this height above ground (common practice, no source)."""
OUTLIER_SIGMAS: Final = 3.0
"""A measured ground level this many standard errors off the raster draws a caution (common practice, no source)."""
ROOF_DOUBT_M: Final = 1.0
"""A typed roof this far off the outline's height draws a caution, m (common practice, no source)."""
TALL_ROOF_M: Final = 60.0
"""A typed roof above this height where the data hold no building draws a caution, m (common practice, no source)."""


@dataclass(frozen=True, slots=True, kw_only=True)
class EndLevel:
    """Levels at one end: m above sea level; `roof_m` and `antenna_agl_m` above ground."""

    end: EndName
    site: Site
    ground_m: float
    roof_m: float | None
    antenna_amsl_m: float
    height_as_given: str
    cautions: tuple[str, ...]
    error_m: float = 0.0
    """Standard error of `antenna_amsl_m`, m: that of the raster under it, 0 where its level was measured."""
    doubts: tuple[str, ...] = ()
    """Clauses that hold the verdict at 'marginal': a typed roof far above what the data hold there."""

    @property
    def antenna_agl_m(self) -> float:
        """Antenna height above the ground at the site, m."""
        return self.antenna_amsl_m - self.ground_m


def end_level(site: Site, profile: PathProfile, *, end: EndName) -> EndLevel:
    """Level of the antenna of `site` at one end of `profile`.

    Raises
    ------
    VerticalDatumError
        The site names a vertical datum other than the terrain's, or gives a height above sea level without naming one while
        the terrain's heights are above an ellipsoid.
    LinkError
        The antenna is above a roof that neither the site nor the data gives, or it is below ground.
    """
    _check_datum(site, profile)
    cautions: list[str] = []
    index = 0 if end == "A" else -1
    raster_ground = float(profile.ground_m[index])
    ground = raster_ground if site.ground_amsl_m is None else site.ground_amsl_m
    if site.ground_amsl_m is not None:
        off, sigma = site.ground_amsl_m - raster_ground, float(profile.sigma_m[index])
        if abs(off) > max(OUTLIER_SIGMAS * sigma, 0.1) and profile.ground_is_bare:
            cautions.append(
                f"Ground at '{site.name}' is given as {site.ground_amsl_m:.1f} m, the raster says {raster_ground:.1f} m "
                f"(standard error {sigma:.1f} m): check the position and the vertical datum."
            )
    roof: float | None = None
    doubts: tuple[str, ...] = ()
    if site.height_reference == "sea":
        antenna = site.height_m
        given = f"{site.height_m:g} m above sea level"
    elif site.height_reference == "ground":
        antenna = ground + site.height_m
        given = f"{site.height_m:g} m above ground"
        if not profile.ground_is_bare and site.ground_amsl_m is None:
            cautions.append(
                f"'{site.name}' stands on a surface raster, which may hold a roof or a tree top there: "
                f"{raster_ground:.1f} m was taken as ground."
            )
    else:
        ground, roof, roof_cautions = _roof(site, profile, end=end, ground=ground)
        cautions += roof_cautions
        if site.roof_m is not None and profile.ground_is_bare:
            doubts, tall = _roof_above_data(site, profile, end=end)
            cautions += tall
        antenna = ground + roof + site.height_m
        given = f"{site.height_m:g} m above the roof ({roof:.1f} m above ground)"
    if site.ground_amsl_m is not None or site.height_reference == "sea":
        cautions += _unnamed_datum(site, profile)
    if not math.isfinite(antenna) or antenna < ground - 1e-9:
        raise LinkError(
            f"site '{site.name}': antenna at {antenna:.1f} m above sea level is below the ground there, {ground:.1f} m",
            "give a higher level, measure it from the ground instead, or state the measured ground level of the site",
        )
    cautions += _below_what_is_left_out(site, profile, end=end, above_ground_m=antenna - ground)
    return EndLevel(
        end=end,
        site=site,
        ground_m=ground,
        roof_m=roof,
        antenna_amsl_m=antenna,
        height_as_given=given,
        cautions=tuple(cautions),
        error_m=_error_m(site, profile, index),
        doubts=doubts,
    )


def _error_m(site: Site, profile: PathProfile, index: int) -> float:
    """Standard error of the antenna's level: of the raster where that was counted from, 0 where it was measured."""
    if site.height_reference == "sea":
        return 0.0
    if site.height_reference == "roof" and (
        site.roof_m is None or (not profile.ground_is_bare and site.ground_amsl_m is None)
    ):
        return float(profile.sigma_m[index])
    return 0.0 if site.ground_amsl_m is not None else bare_error_m(profile, index)


def _roof(site: Site, profile: PathProfile, *, end: EndName, ground: float) -> tuple[float, float, list[str]]:
    """Ground m above sea level, roof height above it, and cautions, for an antenna measured from a roof."""
    index = 0 if end == "A" else -1
    raster_ground = float(profile.ground_m[index])
    if not profile.ground_is_bare and site.ground_amsl_m is None:
        caution = (
            f"The roof of '{site.name}' was read from a surface raster, {raster_ground:.1f} m above sea level: check on "
            "site that the roof, not the yard beside it, stands there."
        )
        roof = site.roof_m or 0.0
        return raster_ground - roof, roof, [caution]
    outlines = own_outlines(profile, end)
    # A level top counts at the antenna's own ground: on a slope the outline's greatest height stands elsewhere.
    outline_m = max(float(own_top_m(profile, end)[index]) - raster_ground, 0.0) if outlines else 0.0
    if site.roof_m is not None:
        return ground, site.roof_m, _roof_doubts(site, profile, outlines, outline_m)
    if outlines:
        return ground, outline_m, []
    cover, kind = float(profile.cover_m[index]), COVER_KINDS[int(profile.cover_kind[index])]
    if not profile.ground_is_bare:
        return ground, max(raster_ground - ground, 0.0), []
    if kind == "building" and cover > 0.0:
        return ground, cover, []
    if kind == "other" and cover >= ROOF_FROM_M:
        return (
            ground,
            cover,
            [f"What stands at '{site.name}', {cover:.1f} m above ground, was taken as its roof: check it."],
        )
    raise no_roof(site.name)


def no_roof(site_name: str) -> LinkError:
    """The error of an antenna above a roof that neither its site nor the data give."""
    return LinkError(
        f"site '{site_name}': the antenna is measured from the roof, but the data hold no building at that spot",
        "state the roof height above ground, or measure the antenna height from the ground",
    )


def _roof_doubts(site: Site, profile: PathProfile, outlines: tuple[int, ...], outline_m: float) -> list[str]:
    """A caution where the typed roof is not that of the outline it stands in."""
    assert site.roof_m is not None
    if not outlines or abs(site.roof_m - outline_m) <= ROOF_DOUBT_M:
        return []
    names = " and ".join(dict.fromkeys(profile.obstacles[index].name for index in outlines))
    doubt = (
        f"The roof of '{site.name}' is given as {site.roof_m:g} m above ground, the outline there ({names}) is "
        f"{outline_m:.1f} m high: check which part of the building the antenna stands on."
    )
    return [doubt]


def _roof_above_data(site: Site, profile: PathProfile, *, end: EndName) -> tuple[tuple[str, ...], list[str]]:
    """A doubt where the typed roof stands above the building in the data, a caution where it is tall and they hold none.

    Without an outline the highest building (or unknown) cover where the antenna may stand counts; bare data say nothing.
    """
    assert site.roof_m is not None
    index = 0 if end == "A" else -1
    if own_outlines(profile, end):
        held = max(float(own_top_m(profile, end)[index] - profile.ground_m[index]), 0.0)
    else:
        from_end = profile.distance_m if end == "A" else profile.length_m - profile.distance_m
        houses = np.isin(profile.cover_kind, (COVER_KINDS.index("building"), COVER_KINDS.index("other")))
        houses &= (from_end <= min(NEAR_M, NEAR_SHARE * profile.length_m)) & (profile.cover_m >= ROOF_FROM_M)
        held = float(profile.cover_m[houses].max(initial=0.0))
    given = f"{site.roof_m:g} m above ground"
    if held <= 0.0:
        if site.roof_m <= TALL_ROOF_M:
            return (), []
        unheard = f"The roof of '{site.name}' is given as {given}, and the data hold no building there: "
        return (), [unheard + "check the height and its unit."]
    if site.roof_m - held <= ROOF_DOUBT_M + ERRORS * float(profile.sigma_m[index]):
        return (), []
    return (
        f"the roof of '{site.name}' is given as {given}, and what stands there in the data is {held:.1f} m high",
    ), []


def _below_what_is_left_out(site: Site, profile: PathProfile, *, end: EndName, above_ground_m: float) -> list[str]:
    """A caution where the antenna is lower than the building or trees at its own spot, which do not count against it."""
    return [
        f"The antenna of '{site.name}', {above_ground_m:.1f} m above ground, is {item.height_m - above_ground_m:.1f} m below "
        f"the top of what stands at its own spot ({item.what}), which was left out: check on site that it is not in the way."
        for item in standing(profile).ignored
        if item.end == end and item.height_m > above_ground_m
    ]


def roof_edge_cautions(level: EndLevel, profile: PathProfile) -> list[str]:
    """Doubts about the typed roof edge and parapet of one end."""
    site, end = level.site, level.end
    if site.roof_edge_m is None or level.roof_m is None:
        return []
    cautions = []
    parapet = site.parapet_m or 0.0
    below = parapet - site.height_m
    if below >= 0.0:
        cautions.append(
            f"The antenna of '{site.name}' is {below:.1f} m below the top of its own parapet ({parapet:g} m above the roof), "
            f"{site.roof_edge_m:g} m in front of it: raise it or move it to the edge."
            if parapet > 0.0
            else f"The antenna of '{site.name}' lies on its own roof, {site.roof_edge_m:g} m from the edge: raise it."
        )
    spans = [item for item in standing(profile).ignored if item.end == end] if own_outlines(profile, end) else []
    for span in spans:
        reach = span.to_m if end == "A" else profile.length_m - span.from_m
        if abs(reach - site.roof_edge_m) > 3.0:
            cautions.append(
                f"The roof edge of '{site.name}' is given at {site.roof_edge_m:g} m, but the outline in the data ends at "
                f"{reach:.1f} m: check the position or the distance."
            )
    return cautions


def _check_datum(site: Site, profile: PathProfile) -> None:
    if profile.vertical_datum is None:
        return
    if site.vertical_datum is None:
        above_sea = site.height_reference == "sea" or site.ground_amsl_m is not None
        if above_sea and is_ellipsoidal(profile.vertical_datum):
            raise VerticalDatumError(
                f"site '{site.name}' gives a height above sea level, the terrain's are above an ellipsoid "
                f"('{profile.vertical_datum}')",
                "the two differ by tens of metres: convert the rasters to heights above sea level,",
                "or state the vertical datum of the site, or give its height above ground or roof",
            )
        return
    if datum_key(site.vertical_datum) != datum_key(profile.vertical_datum):
        raise VerticalDatumError(
            f"site '{site.name}' gives heights above '{site.vertical_datum}', the terrain above '{profile.vertical_datum}'",
            "heights of different vertical datums are not mixed: convert the height of the site,",
            "or give it above ground or roof",
        )


def _unnamed_datum(site: Site, profile: PathProfile) -> list[str]:
    if site.vertical_datum is not None and profile.vertical_datum is not None:
        return []
    whose = f"'{site.name}'" if site.vertical_datum is None else "the terrain"
    return [f"The vertical datum of {whose} is not stated: its heights above sea level were taken to share one datum."]
