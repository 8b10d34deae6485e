"""One pair by the very functions that plan one link: for what is rare on a path, and as the measure of the arrays.

Makes the Link that a study would state, asks `links` and `design`, and writes one row. Always right, not fast.
"""

import math

import numpy as np

from fellspan.design.answers import drawn_confidence
from fellspan.errors import FellspanError, TerrainGapError
from fellspan.geodesy.position import Position
from fellspan.links.assess import Assessment, AssessSettings, assess_in_full
from fellspan.links.result import LinkResult
from fellspan.links.site import Antenna, Link, Site
from fellspan.screening.columns import Columns
from fellspan.screening.pairs import BASES, HEIGHT_REFERENCES, PATH_VERDICTS, SIGNAL_VERDICTS, Candidates, SiteColumns
from fellspan.screening.signal_ends import best_sector
from fellspan.terrain.terrain import Terrain


def site_of(sites: SiteColumns, index: int) -> Site:
    """A row of the columns as a site; a LinkError or CoordinateError where it cannot be one."""
    roof = float(sites.roof_m[index])
    return Site(
        name=sites.name[index],
        position=Position(
            latitude_deg=float(sites.latitude_deg[index]), longitude_deg=float(sites.longitude_deg[index])
        ),
        height_m=float(sites.height_m[index]),
        height_reference=HEIGHT_REFERENCES[int(sites.height_reference[index])],
        roof_m=None if math.isnan(roof) else roof,
    )


def name_of(candidates: Candidates, hub: int, place: int) -> str:
    """What the link of a pair is called; survey rows that go by a link's name go by this one."""
    return f"{candidates.hubs.name[hub]} - {candidates.places.name[place]}"


def link_of(candidates: Candidates, hub: int, sector: int, place: int) -> Link:
    """The link of a pair as a study would state it: A the hub with one of its sectors, B the place."""
    return _link(candidates, hub, candidates.sectors[sector].antenna, place)


def _link(candidates: Candidates, hub: int, antenna: Antenna, place: int) -> Link:
    return Link(
        name=name_of(candidates, hub, place),
        a=site_of(candidates.hubs, hub),
        b=site_of(candidates.places, place),
        radio=candidates.radio,
        antenna_a=antenna,
        antenna_b=candidates.place_antenna,
        wanted_margin_db=candidates.wanted_margin_db,
        target_availability_percent=candidates.target_availability_percent,
        power_rule=candidates.power_rule,
    )


def sectors_of(candidates: Candidates, hub: int) -> tuple[int, ...]:
    """The sectors of a hub, in their order."""
    return tuple(number for number, sector in enumerate(candidates.sectors) if sector.hub == hub)


def screen_single(candidates: Candidates, columns: Columns, row: int, *, terrain: Terrain) -> None:
    """Fill one row of `columns` as planning would; a gap and a refusal are its status."""
    hub, place = int(columns.hub[row]), int(columns.place[row])
    settings = candidates.settings
    try:
        sectors = sectors_of(candidates, hub)
        link = link_of(candidates, hub, sectors[0], place)
        assessment = assess_in_full(link, terrain=terrain, settings=settings)
        chosen = sectors[0]
        if len(sectors) > 1:
            result = assessment.result
            chosen = int(
                best_sector(
                    candidates,
                    hub=np.array([hub]),
                    bearing_deg=np.array([result.bearing_ab_deg]),
                    tilt_deg=np.array([result.tilt_ab_deg]),
                )[0]
            )
            if chosen != sectors[0]:
                link = link_of(candidates, hub, chosen, place)
                assessment = assess_in_full(link, terrain=terrain, settings=settings)
    except TerrainGapError as error:
        _gap(candidates, columns, row, terrain=terrain, error=error)
        return
    except FellspanError as error:
        columns.refuse(row, error.what)
        return
    columns.sector[row] = chosen
    _write(columns, row, assessment.result)
    raising = assessment.raising.b
    columns.extra_for_confidence_m[row] = math.inf if raising is None else raising
    if assessment.result.verdict == "clear":
        with_draws(columns, row, link, assessment, settings)


def draw_single(candidates: Candidates, columns: Columns, row: int, *, terrain: Terrain) -> None:
    """Let draws decide on a row that is filled and clear; planning has the last word where it cannot even assess it."""
    try:
        link = link_of(candidates, int(columns.hub[row]), int(columns.sector[row]), int(columns.place[row]))
        assessment = assess_in_full(link, terrain=terrain, settings=candidates.settings)
        with_draws(columns, row, link, assessment, candidates.settings)
    except FellspanError:
        # A path along the very edge of a raster lies on it or off it by a micrometre.
        screen_single(candidates, columns, row, terrain=terrain)


def with_draws(columns: Columns, row: int, link: Link, assessment: Assessment, settings: AssessSettings) -> None:
    """The lesser of both confidences, as planning takes it, and the verdict that it allows."""
    sure = min(assessment.result.confidence, drawn_confidence(link, assessment, settings))
    columns.confidence[row] = sure
    if sure < settings.confidence:
        columns.verdict[row] = PATH_VERDICTS.index("marginal")


def _gap(candidates: Candidates, columns: Columns, row: int, *, terrain: Terrain, error: TerrainGapError) -> None:
    link = link_of(candidates, int(columns.hub[row]), 0, int(columns.place[row]))
    profile = terrain.profiles(
        [(link.a.position, link.b.position)], step_m=candidates.settings.step_m, names=[link.name]
    )[0]
    if not profile.gaps:
        # So narrow that only the closer look met it.
        columns.gap(row, math.nan, math.nan)
        columns.reason[row] = error.what
        return
    columns.gap(row, profile.gaps[0].from_m, profile.gaps[0].to_m)


def _write(columns: Columns, row: int, result: LinkResult) -> None:
    governing = result.clearance[result.governing]
    columns.distance_m[row] = result.distance_m
    columns.bearing_deg[row] = result.bearing_ab_deg
    columns.verdict[row] = PATH_VERDICTS.index(result.verdict)
    columns.basis[row] = BASES.index(result.basis)
    columns.confidence[row] = result.confidence
    columns.governing[row] = result.governing
    columns.worst_fraction[row] = _or_nan(governing.worst_fraction)
    columns.worst_at_m[row] = governing.worst_at_m
    columns.extra_at_place_m[row] = max(
        math.inf if one.extra_height_m.b is None else one.extra_height_m.b for one in result.clearance
    )
    columns.diffraction_db[row] = result.losses_db.diffraction
    columns.received_at_hub_dbm[row] = _or_nan(result.received_dbm.at_a)
    columns.received_at_place_dbm[row] = _or_nan(result.received_dbm.at_b)
    columns.margin_at_hub_db[row] = _or_nan(result.margin_db.at_a)
    columns.margin_at_place_db[row] = _or_nan(result.margin_db.at_b)
    if result.signal_verdict is not None:
        columns.signal_verdict[row] = SIGNAL_VERDICTS.index(result.signal_verdict)
    columns.availability_percent[row] = _or_nan(result.availability_percent.year)


def _or_nan(value: float | None) -> float:
    return np.nan if value is None else value
