"""A planned link with one thing as it was built, or as it may have slipped: other heights, places, antennas, lines.

Makes links and asks the engine what their levels are; judges nothing.
"""

from collections.abc import Iterator
from dataclasses import replace

from fellspan.antennas.catalogue import load_catalogue
from fellspan.design.acceptance_built import PLACE_M
from fellspan.design.acceptance_gear import QUARTER_TURN
from fellspan.design.acceptance_hypotheses import ENDS, Change, OtherAntenna, label
from fellspan.design.as_built import AsBuilt, BuiltEnd, EndLetter
from fellspan.errors import FellspanError
from fellspan.geodesy import geodesic
from fellspan.links.antenna_gains import polarization_loss_db
from fellspan.links.assess import Assessment, AssessSettings, assess_in_full, assess_profile
from fellspan.links.budget import line_loss_db
from fellspan.links.criteria import worst_month_k
from fellspan.links.result import AntennaResult, LinkResult
from fellspan.links.site import Aim, Antenna, Link, Site
from fellspan.planning.inputs import Study
from fellspan.planning.plan import LinkPlan
from fellspan.terrain.terrain import Terrain
from fellspan.vocabulary import MountedPolarization

FOOT: float = 0.3048
NEAREST: int = 4
"""So many antennas of the same kind are thought of as put up by mistake."""


def site_as_built(site: Site, built: BuiltEnd) -> Site:
    """The site with height, roof, ground and place as measured; the place only where it is told from the plan's."""
    reference = built.height_reference or site.height_reference
    on_roof = reference == "roof"
    place = site.position
    if built.position is not None and geodesic.inverse(place, built.position).distance_m > PLACE_M:
        place = built.position
    return replace(
        site,
        position=place,
        height_m=site.height_m if built.height_m is None else built.height_m,
        height_reference=reference,
        roof_m=site.roof_m if built.roof_m is None else built.roof_m,
        ground_amsl_m=site.ground_amsl_m if built.ground_amsl_m is None else built.ground_amsl_m,
        roof_edge_m=site.roof_edge_m if on_roof else None,
        parapet_m=site.parapet_m if on_roof else None,
    )


def placed_as_built(link: Link, built: AsBuilt) -> Link:
    """The link with both antennas where they were measured, and all else as planned."""
    return replace(link, a=site_as_built(link.a, built.a), b=site_as_built(link.b, built.b))


def assessed(link: Link, terrain: Terrain, settings: AssessSettings) -> Assessment | FellspanError:
    """The link worked out, or why it cannot be."""
    try:
        return assess_in_full(link, terrain=terrain, settings=settings)
    except FellspanError as error:
        return error


def change_of(words: str, result: LinkResult, planned: LinkResult) -> Change | None:
    """What another result changes of the planned levels; None where either has none."""
    new, old = result.received_dbm, planned.received_dbm
    if new.at_a is None or new.at_b is None or old.at_a is None or old.at_b is None:
        return None
    return Change(words=words, a_db=new.at_a - old.at_a, b_db=new.at_b - old.at_b)


def low_k_change(planned: LinkPlan, settings: AssessSettings) -> tuple[Change | None, float]:
    """The link at the k that is exceeded 99.9 % of the worst month, and that k; antennas stay aimed as at the median."""
    k = worst_month_k(planned.result.distance_m)
    if k >= settings.median_k:
        return None, k
    low = assess_profile(planned.link, planned.profile, replace(settings, median_k=k)).result
    return change_of(f"at k {k:.2f}", low, planned.result), k


def lower_changes(planned: LinkPlan, built: AsBuilt, terrain: Terrain, settings: AssessSettings) -> tuple[Change, ...]:
    """The link with an antenna lower by a slip that is often made; ends whose height was measured are left alone."""
    found = []
    for words, link in _slips(planned, built):
        outcome = assessed(link, terrain, settings)
        change = None if isinstance(outcome, FellspanError) else change_of(words, outcome.result, planned.result)
        if change is not None:
            found.append(change)
    return tuple(found)


def _slips(planned: LinkPlan, built: AsBuilt) -> Iterator[tuple[str, Link]]:
    link = planned.link
    for end in ENDS:
        if built.end(end).height_m is not None:
            continue
        site = link.a if end == "a" else link.b
        place = planned.result.ends.a if end == "a" else planned.result.ends.b
        if site.height_reference == "roof":
            yield (
                f"with the antenna at {label(end)} {site.height_m:.1f} m above ground, not above the roof",
                _with_site(link, end, _on_ground(site, site.height_m)),
            )
        height = place.antenna_agl_m
        yield (
            f"with the height at {label(end)} in feet taken for metres ({height * FOOT:.1f} m above ground)",
            _with_site(link, end, _on_ground(site, height * FOOT)),
        )
        for down in (2.0, 5.0):
            if height > down + 1.0:
                yield (
                    f"with the antenna at {label(end)} {down:g} m lower",
                    _with_site(link, end, _on_ground(site, height - down)),
                )


def _on_ground(site: Site, height_m: float) -> Site:
    return replace(site, height_m=height_m, height_reference="ground", roof_m=None, roof_edge_m=None, parapet_m=None)


def _with_site(link: Link, end: EndLetter, site: Site) -> Link:
    return replace(link, a=site) if end == "a" else replace(link, b=site)


def with_antenna(link: Link, end: EndLetter, antenna: Antenna) -> Link:
    """The link with another antenna at one end."""
    return replace(link, antenna_a=antenna) if end == "a" else replace(link, antenna_b=antenna)


def crossed_change(planned: LinkPlan) -> Change | None:
    """One antenna turned a quarter turn about its boresight; None where an antenna carries both polarizations."""
    result, link = planned.result, planned.link
    hung = result.antennas
    if hung is None or "dual" in (hung.a.polarization, hung.b.polarization):
        return None
    loss = _polarization_db(link, result, turned=QUARTER_TURN[hung.a.polarization])
    now = result.losses_db.polarization or 0.0
    return None if loss is None else Change(words="a quarter turn", a_db=now - loss, b_db=now - loss)


def _polarization_db(link: Link, result: LinkResult, *, turned: MountedPolarization) -> float | None:
    hung = result.antennas
    if hung is None:
        return None
    return polarization_loss_db(
        with_polarization(link, "a", hung.a, turned),
        bearings_deg=(result.bearing_ab_deg, result.bearing_ba_deg),
        tilts_deg=(result.tilt_ab_deg, result.tilt_ba_deg),
    )


def with_polarization(link: Link, end: EndLetter, hung: AntennaResult, turned: MountedPolarization) -> Link:
    """The link with the antenna at one end turned about its boresight, its aim as planned."""
    antenna = link.antenna_a if end == "a" else link.antenna_b
    aim = Aim(bearing_deg=hung.bearing_deg, tilt_deg=hung.tilt_deg, polarization=turned)
    return with_antenna(link, end, replace(antenna, mounting=aim))


def named_antenna(study: Study, link: Link, text: str) -> Antenna | None:
    """The antenna of the study, else of the catalogue, whose name stands in what the crew wrote; None where none does."""
    words = " ".join(text.casefold().split())
    own = {antenna.name: antenna for one in study.links for antenna in (one.antenna_a, one.antenna_b)}
    hz = link.radio.frequency_hz
    for name in sorted(own, key=len, reverse=True):
        if " ".join(name.casefold().split()) in words:
            return own[name]
    found = [one for one in load_catalogue(study.antenna_catalogue).covering(hz) if one.name.casefold() in words]
    if not found:
        return None
    best = max(found, key=lambda one: len(one.name))
    return Antenna(name=best.name, pattern=best.pattern(hz))


def other_antennas(study: Study, planned: LinkPlan) -> tuple[OtherAntenna, ...]:
    """Antennas of the same kind that lie nearest in gain to the one planned, at each end."""
    hz = planned.link.radio.frequency_hz
    found: list[OtherAntenna] = []
    covering = load_catalogue(study.antenna_catalogue).covering(hz)
    for end in ENDS:
        antenna = planned.link.antenna_a if end == "a" else planned.link.antenna_b
        if antenna.pattern is None or antenna.pattern.kind not in {one.kind for one in covering}:
            continue
        gains = [
            OtherAntenna(name=one.name, end=end, gain_db=one.pattern(hz).peak_gain_dbi - antenna.pattern.peak_gain_dbi)
            for one in covering
            if one.kind == antenna.pattern.kind
        ]
        near = sorted((one for one in gains if abs(one.gain_db) >= 1.0), key=lambda one: abs(one.gain_db))
        found += near[:NEAREST]
    return tuple(found)


def stated_line(link: Link, built: AsBuilt) -> tuple[Link, float]:
    """The link with its feeders as the crew measured them, and what the level loses by it, dB."""
    lost = 0.0
    for end in ENDS:
        stated = built.end(end).feeder_loss_db
        if stated is None:
            continue
        antenna = link.antenna_a if end == "a" else link.antenna_b
        lost += stated - line_loss_db(antenna, frequency_hz=link.radio.frequency_hz)
        link = with_antenna(link, end, replace(antenna, feeder_loss_db=stated, feeder=None))
    return link, lost
