"""The signal engine: both directions of a link from its path, its ends and the climate -> SignalResult, losses, levels.

Joins the pieces of this room and the climate; knows no terrain files, no study files and no pages.
"""

from dataclasses import dataclass

from fellspan.climate.figures import ClimateFigures, Figure, MultipathEdition
from fellspan.links.budget import line_loss_db, pointing_db
from fellspan.links.direction import Direction, shares_of
from fellspan.links.fading import Fading, Geometry
from fellspan.links.fading_workings import both_ways_workings
from fellspan.links.own_building import Standing
from fellspan.links.path_loss import PathLoss
from fellspan.links.result import AntennasResult, AtEnds, Losses
from fellspan.links.signal_path import SignalPath, Weather, both_directions, has_margin, path_of
from fellspan.links.signal_result import (
    NOT_COMPUTED,
    ClimateUsed,
    Editions,
    Periods,
    Shares,
    SignalResult,
    Working,
)
from fellspan.links.signal_verdict import Hold, at_most_of, holds_of, worse_of
from fellspan.links.signal_words import notes_of, signal_cautions
from fellspan.links.site import Link
from fellspan.propagation import minutes_per_year, two_way_outage
from fellspan.terrain.profile import PathProfile

__all__ = ["Signal", "at_most_of", "both_ways", "signal_of", "worse_of"]


@dataclass(frozen=True, slots=True, kw_only=True)
class Signal:
    """What the engine hands to `assess`.

    `holds` says what verdict target, timing and channels leave; empty where they say nothing.
    """

    result: SignalResult
    losses: Losses
    received_dbm: AtEnds
    margin_db: AtEnds
    modulation: str | None
    holds: tuple[Hold, ...]
    cautions: tuple[str, ...]


def signal_of(
    link: Link,
    profile: PathProfile,
    standing: Standing,
    *,
    a_amsl_m: float,
    b_amsl_m: float,
    median_k: float,
    antennas: AntennasResult,
    polarization_db: float | None,
    bearings_deg: tuple[float, float],
    tilts_deg: tuple[float, float],
    weather: Weather,
    path: SignalPath | None = None,
    workings: bool = True,
) -> Signal:
    """Work out both directions of a link.

    Parameters
    ----------
    link, profile, standing
        The link, its profile, and what stands along it with the own buildings taken out.
    a_amsl_m, b_amsl_m
        Antenna levels, m above sea level.
    median_k
        Effective Earth radius factor of the level in clear air.
    antennas, polarization_db, bearings_deg, tilts_deg
        What each antenna gives toward the other end, the loss by polarizations that differ, and where the other end lies.
    weather
        Climate as given, and how rain is worked out. Maps are asked only where a margin is known.
    path
        What `path_of` made of the same link earlier, with whatever antennas: saves working it out again.
    workings
        False leaves them empty, for callers that compare many candidates.
    """
    if path is None:
        path = path_of(
            link,
            profile,
            standing,
            a_amsl_m=a_amsl_m,
            b_amsl_m=b_amsl_m,
            median_k=median_k,
            weather=weather,
            maps=has_margin(link, antennas),
        )
    fadings, (there, back) = both_directions(
        link,
        path,
        antennas=antennas,
        polarization_db=polarization_db,
        bearings_deg=bearings_deg,
        tilts_deg=tilts_deg,
        weather=weather,
        workings=workings,
    )
    figures, geometry, losses, transmit_hz = path.figures, path.geometry, path.losses, link.radio.transmit_hz
    result = _result(link, figures, there, back, fadings=fadings, geometry=geometry, weather=weather, workings=workings)
    return Signal(
        result=result,
        losses=_losses(link, losses[transmit_hz[0]], fadings[0], polarization_db=polarization_db),
        received_dbm=AtEnds(at_a=back.result.received_dbm, at_b=there.result.received_dbm),
        margin_db=AtEnds(at_a=back.result.margin_db, at_b=there.result.margin_db),
        modulation=there.result.wanted,
        holds=holds_of(link, there, back, length_m=geometry.length_m),
        cautions=signal_cautions(link, profile, result, fadings=fadings),
    )


def _losses(link: Link, loss: PathLoss, fading: Fading, *, polarization_db: float | None) -> Losses:
    ends = link.antenna_a, link.antenna_b
    pointing = [pointing_db(antenna) for antenna in ends]
    return Losses(
        free_space=loss.free_space_db,
        diffraction=loss.diffraction_db,
        polarization=polarization_db,
        vegetation=loss.vegetation_db,
        gases=loss.gases_db,
        feeders=sum(line_loss_db(antenna, frequency_hz=loss.frequency_hz) for antenna in ends),
        branching=sum(antenna.branching_loss_db for antenna in ends),
        pointing=None if None in pointing else sum(one for one in pointing if one is not None),
        rain_001=fading.rain_001_db,
        radomes_wet=fading.wet_radomes_db,
        radomes_iced=sum(antenna.radome_iced_db for antenna in ends),
    )


def _result(
    link: Link,
    figures: ClimateFigures,
    there: Direction,
    back: Direction,
    *,
    fadings: tuple[Fading, ...],
    geometry: Geometry,
    weather: Weather,
    workings: bool,
) -> SignalResult:
    periods, minutes, cause = both_ways(there, back, common=link.radio.shares_frequency)
    target = link.target_availability_percent
    shares = [one.result.availability_percent.year for one in (there, back)]
    met = None
    if target is not None and None not in shares:
        met = all(share is not None and share >= target for share in shares)
    has_rain = fadings[0].rain_001_db is not None
    edition = figures.multipath_edition
    return SignalResult(
        a_to_b=there.result,
        b_to_a=back.result,
        availability_percent=periods,
        minutes_per_year=minutes,
        dominant_cause=cause,
        target_availability_percent=target,
        target_met=met,
        editions=Editions(
            diffraction="P.526-16",
            gases="P.676-12",
            rain=f"P.530-{weather.rain_edition}" if has_rain else None,
            rain_reading=weather.rain_reading if has_rain else None,
            multipath=edition,
            worst_month=_worst_month_edition(edition, has_rain=has_rain),
        ),
        climate=_climate_used(figures),
        trees=fadings[0].loss.trees,
        notes=notes_of(link, figures, (there.result, back.result), fadings=fadings, geometry=geometry),
        workings=_workings(there, back, common=link.radio.shares_frequency) if workings else (),
    )


def _worst_month_edition(multipath: MultipathEdition | None, *, has_rain: bool) -> str | None:
    """Rain goes by P.530-19 whatever multipath goes by."""
    if multipath is None or multipath == "P.530-19":
        return None if multipath is None and not has_rain else "P.530-19"
    return "P.2001-6 for multipath, P.530-19 for rain" if has_rain else "P.2001-6"


def both_ways(there: Direction, back: Direction, *, common: bool) -> tuple[Periods, float | None, str | None]:
    """Availability, minutes out a year and dominant cause of both directions at once; `common` where they share a frequency."""
    joined = _joined(there, back, common=common)
    if joined is None:
        return NOT_COMPUTED, None, None
    year, worst = joined
    return (
        Periods(
            year=None if year.total is None else 100.0 - year.total,
            worst_month=None if worst.total is None else 100.0 - worst.total,
        ),
        None if year.total is None else float(minutes_per_year(year.total)),
        year.dominant,
    )


def _joined(there: Direction, back: Direction, *, common: bool) -> tuple[Shares, Shares] | None:
    """Outage of both directions at once, of the year and of the worst month; None without a margin."""
    margins = there.result.margin_db, back.result.margin_db
    if there.year is None or back.year is None or margins[0] is None or margins[1] is None:
        return None
    assert there.worst_month is not None
    assert back.worst_month is not None
    least = min(margins[0], margins[1])
    return (
        shares_of(two_way_outage(there.year, back.year, common_multipath=common), margin_db=least),
        shares_of(two_way_outage(there.worst_month, back.worst_month, common_multipath=common), margin_db=least),
    )


def _workings(there: Direction, back: Direction, *, common: bool) -> tuple[Working, ...]:
    joined = _joined(there, back, common=common)
    if joined is None:
        return ()
    return both_ways_workings(
        directions=(there.result, back.result), year=joined[0], worst_month=joined[1], common=common
    )


def _climate_used(figures: ClimateFigures) -> tuple[ClimateUsed, ...]:
    names = (
        "rain_rate_001_mm_h",
        "dn1_n_per_km",
        "dn75",
        "log_k",
        "terrain_roughness_m",
        "gradient_median_n_per_km",
        "gradient_tail_n_per_km",
        "temperature_k",
        "total_pressure_hpa",
        "dry_pressure_hpa",
        "vapour_g_m3",
        "rain_height_m",
    )
    found: list[tuple[str, Figure | None]] = [(name, getattr(figures, name)) for name in names]
    return tuple(
        ClimateUsed(
            key=name,
            value=figure.value,
            unit=figure.unit,
            provenance=figure.provenance,
            source_key=figure.source_key,
        )
        for name, figure in found
        if figure is not None
    )
