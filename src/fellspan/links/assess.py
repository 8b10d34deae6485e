"""Assess one link: profile, levels, criteria, losses, verdict -> LinkResult. The engine's front door.

Puts the pieces of this room together and holds no formula itself; knows nothing of study files, pages or the command line.
"""

import datetime as dt
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING, Final

import numpy as np

from fellspan.errors import LinkError, MagneticModelError
from fellspan.geodesy import geodesic, magnetic
from fellspan.links import verdicts
from fellspan.links.antenna_gains import antenna_cautions, antennas_of, polarization_loss_db
from fellspan.links.assess_settings import AssessSettings
from fellspan.links.budget import tilt_deg
from fellspan.links.cautions import cautions
from fellspan.links.doubts import with_doubts
from fellspan.links.ends import EndLevel
from fellspan.links.evaluate import extra_for_confidence, governing_row
from fellspan.links.laid import Laid, stood
from fellspan.links.levels import PathLevels
from fellspan.links.minima import worst_windows
from fellspan.links.own_building import Standing
from fellspan.links.radiated import exposure_pair, power_cautions, power_checks
from fellspan.links.result import EndResult, Ends, ExtraHeight, LinkResult
from fellspan.links.signal import signal_of
from fellspan.links.signal_verdict import judged
from fellspan.links.signal_words import signal_sentences
from fellspan.links.site import Link
from fellspan.terrain.profile import PathProfile
from fellspan.vocabulary import COVER_KINDS, PathVerdict

if TYPE_CHECKING:
    from fellspan.terrain.terrain import Terrain

__all__ = (
    "REFINE_PARTS",
    "SAME_PLACE_M",
    "AssessSettings",
    "Assessment",
    "assess",
    "assess_in_full",
    "assess_profile",
    "path_verdict_of",
    "stood",
    "trees_in_zone",
)
SAME_PLACE_M: Final = 0.5
_TREE: Final = COVER_KINDS.index("tree")
REFINE_PARTS: Final = 16
"""The worst minima are looked at again at this part of the finest cell."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Assessment:
    """A result with the arrays it was worked out from; `profile` has the same samples as `levels`.

    `raising` is the height that makes the verdict 'clear' as far as height can: criteria at the confidence asked, doubts gone.
    """

    result: LinkResult
    profile: PathProfile
    levels: PathLevels
    raising: ExtraHeight


_DEFAULTS: Final = AssessSettings()


def assess(link: Link, *, terrain: "Terrain", settings: AssessSettings = _DEFAULTS) -> LinkResult:
    """Decide on one link over `terrain`; see `assess_in_full`."""
    return assess_in_full(link, terrain=terrain, settings=settings).result


def assess_in_full(link: Link, *, terrain: "Terrain", settings: AssessSettings = _DEFAULTS) -> Assessment:
    """Decide on one link: profile at the default step, the worst minima looked at again at a sixteenth of the cell.

    Raises
    ------
    LinkError
        Both sites are the same place, an antenna is below ground, or a roof is unknown.
    TerrainError
        The terrain has no data on part of the path, or its heights have another datum than the site's.
    """
    distance_m = geodesic.inverse(link.a.position, link.b.position).distance_m
    if distance_m < SAME_PLACE_M:
        raise LinkError(
            f"link '{link.name}': '{link.a.name}' and '{link.b.name}' are the same place ({distance_m:.2f} m apart)",
            "give the two ends different coordinates",
        )
    coarse = terrain.profile(a=link.a.position, b=link.b.position, step_m=settings.step_m, name=link.name)
    windows = worst_windows(Laid.out(link, coarse, settings).levels)
    fine = terrain.refine(coarse, windows, step_m=coarse.cell_m / REFINE_PARTS) if windows else coarse
    return assess_profile(link, fine, settings)


def assess_profile(link: Link, profile: PathProfile, settings: AssessSettings = _DEFAULTS) -> Assessment:
    """Decide on one link over a profile as it is, without looking closer anywhere."""
    laid = Laid.out(link, profile, settings)
    profile, stands, levels = laid.profile, laid.stands, laid.levels
    judged_path = laid.judged(link, settings)
    results, confidence, doubts = judged_path.results, judged_path.confidence, judged_path.doubts
    governing, verdict = governing_row(results), judged_path.verdict
    basis = verdicts.basis_of(profile, stands, levels, row=governing)
    a_amsl_m, b_amsl_m = laid.a.antenna_amsl_m, laid.b.antenna_amsl_m
    length_m, k = profile.length_m, settings.median_k
    way = geodesic.inverse(link.a.position, link.b.position)
    bearings = way.bearing_ab_deg, way.bearing_ba_deg
    tilts = (
        tilt_deg(distance_m=length_m, from_amsl_m=a_amsl_m, to_amsl_m=b_amsl_m, k=k),
        tilt_deg(distance_m=length_m, from_amsl_m=b_amsl_m, to_amsl_m=a_amsl_m, k=k),
    )
    antennas = antennas_of(link, bearings_deg=bearings, tilts_deg=tilts)
    polarization_db = polarization_loss_db(link, bearings_deg=bearings, tilts_deg=tilts)
    signal = signal_of(
        link,
        profile,
        stands,
        a_amsl_m=a_amsl_m,
        b_amsl_m=b_amsl_m,
        median_k=k,
        antennas=antennas,
        polarization_db=polarization_db,
        bearings_deg=bearings,
        tilts_deg=tilts,
        weather=settings.weather,
    )
    raising = with_doubts(extra_for_confidence(levels, laid.errors_m, confidence=settings.confidence), doubts)
    sentences = verdicts.reasons(
        verdict=verdict,
        basis=basis,
        results=results,
        governing=governing,
        sight=judged_path.sight,
        raising=raising,
        confidence=confidence,
        confidence_asked=settings.confidence,
        ignored=stands.ignored,
        doubts=doubts,
        not_held=verdicts.not_held(profile),
    )
    trees = trees_in_zone(stands, levels)
    wanted_db = link.wanted_margin_db
    signal_verdict, why = judged(signal.margin_db, wanted_db=wanted_db, trees=trees, holds=signal.holds)
    said = signal_sentences(
        link, signal.result, received_dbm=signal.received_dbm, margin_db=signal.margin_db, trees=trees
    )
    power = power_checks(link)
    end_a, model, caution_a = _end_result(laid.a, way.bearing_ab_deg, settings.date)
    end_b, _, caution_b = _end_result(laid.b, way.bearing_ba_deg, settings.date)
    result = LinkResult(
        name=link.name,
        a=link.a.name,
        b=link.b.name,
        verdict=verdict,
        signal_verdict=signal_verdict,
        basis=basis,
        confidence=confidence,
        confidence_asked=settings.confidence,
        reasons=(*sentences, *said),
        cautions=cautions(
            link,
            profile,
            (laid.a, laid.b),
            preset=None if settings.criteria else settings.preset,
            median_k=k,
            raises=verdict != "clear",
            trees=signal.result.trees if trees else None,
            no_errors=not profile.sigma_m.any(),
            magnetic=(caution_a, caution_b),
            beside=judged_path.beside,
            antennas=(
                *antenna_cautions(link, antennas, distance_m=length_m, polarization_db=polarization_db),
                *signal.cautions,
                *power_cautions(power),
            ),
        ),
        distance_m=length_m,
        bearing_ab_deg=bearings[0],
        bearing_ba_deg=bearings[1],
        tilt_ab_deg=tilts[0],
        tilt_ba_deg=tilts[1],
        frequency_hz=link.radio.frequency_hz,
        polarization=link.radio.polarization,
        median_k=k,
        ends=Ends(a=end_a, b=end_b),
        clearance=results,
        governing=governing,
        ignored=stands.ignored,
        losses_db=signal.losses,
        received_dbm=signal.received_dbm,
        margin_db=signal.margin_db,
        wanted_margin_db=wanted_db,
        magnetic_model=model,
        step_m=profile.step_m,
        sources=profile.sources,
        vertical_datum=profile.vertical_datum,
        antennas=antennas,
        modulation=signal.modulation,
        availability_percent=signal.result.availability_percent,
        signal=replace(signal.result, verdict_reason=why),
        power=power,
        exposure=exposure_pair(link, rule=settings.exposure_rule),
    )
    return Assessment(result=result, profile=profile, levels=levels, raising=raising)


def path_verdict_of(link: Link, profile: PathProfile, settings: AssessSettings = _DEFAULTS) -> PathVerdict:
    """The verdict on the path alone, the one that `assess_profile` gives with all the rest."""
    return Laid.out(link, profile, settings).judged(link, settings).verdict


def trees_in_zone(stands: Standing, levels: PathLevels) -> bool:
    """Whether trees reach into what any criterion requires to be free: the signal verdict is then marginal at most."""
    return bool(np.any((stands.cover_kind == _TREE) & np.any(levels.available_m < levels.need_m, axis=0)))


def _end_result(level: EndLevel, bearing_deg: float, date: dt.date | None) -> tuple[EndResult, str | None, str | None]:
    site = level.site
    declination, doubt = None, None
    if date is not None:
        try:
            declination = magnetic.declination(site.position, date)
            doubt = None if declination.caution is None else f"'{site.name}' is {declination.caution}."
        except MagneticModelError as error:
            # A compass bearing is a convenience; the link is decided without it.
            doubt = f"No magnetic bearings: {'; '.join((error.what, *error.details))}."
    east = None if declination is None else declination.declination_deg
    return (
        EndResult(
            site=site.name,
            latitude_deg=site.position.latitude_deg,
            longitude_deg=site.position.longitude_deg,
            ground_m=level.ground_m,
            roof_m=level.roof_m,
            antenna_amsl_m=level.antenna_amsl_m,
            antenna_agl_m=level.antenna_agl_m,
            height_as_given=level.height_as_given,
            magnetic_bearing_deg=None if east is None else (bearing_deg - east) % 360.0,
            declination_deg=east,
        ),
        None if declination is None else declination.model,
        doubt,
    )
