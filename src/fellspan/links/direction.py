"""One direction of a link: budget, thresholds, margins, outages and throughput, each with its working.

Joins the budget, the receiver and the fading; knows no verdicts and no sentences.
"""

import math
from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from fellspan.links.budget import Term, eirp_dbm, level_dbm, line_loss_db, line_terms
from fellspan.links.fading import Fading, Receiver
from fellspan.links.fading_workings import fading_workings, outage_workings, threshold_workings
from fellspan.links.radio import Modulation, Radio
from fellspan.links.receivers import (
    UNNAMED,
    degradation_db,
    heard_dbm,
    noise_dbm,
    receiver_of,
    row_power_dbm,
    row_threshold_dbm,
    rows_of,
    wanted_index,
)
from fellspan.links.signal_result import (
    NOT_COMPUTED,
    DirectionResult,
    ModulationResult,
    Periods,
    Shares,
    Working,
    WorkingInput,
)
from fellspan.links.site import Antenna, Site
from fellspan.propagation import Outage, minutes_per_year

Floats = NDArray[np.float64]
NEAR_DB = 3.0
"""A target that this much more margin would meet is nearly met."""
LEVEL = "level"
"""Dominant cause where the level is short even without any fading."""


@dataclass(frozen=True, slots=True, kw_only=True)
class End:
    """One end of a direction: who it is, what it gives toward the other end, and where that lies."""

    site: Site
    antenna: Antenna
    gain_dbi: float | None
    bearing_deg: float


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Direction:
    """One direction worked out: its result, and the outage of the wanted row for joining both ways."""

    result: DirectionResult
    terms: tuple[Term, ...]
    year: Outage | None
    worst_month: Outage | None
    nearly: Callable[[], float | None]
    """Availability of the year with `NEAR_DB` more margin, %; worked out when asked."""


def direction_of(
    radio: Radio,
    transmit: End,
    receive: End,
    *,
    name: str,
    frequency_hz: float,
    path: tuple[Term, ...],
    fading: Fading,
    discrimination_db: float,
    workings: bool = True,
) -> Direction:
    """Work out one direction; `path` holds the terms between the two antennas. Comparing many, leave `workings` out."""
    rows = rows_of(radio)
    wanted = wanted_index(radio, rows)
    power = row_power_dbm(radio, None if wanted is None else rows[wanted])
    terms = (
        _power_term(radio, power),
        *line_terms(
            transmit.antenna,
            gain_dbi=transmit.gain_dbi,
            frequency_hz=frequency_hz,
            transmits=True,
            site=transmit.site.name,
        ),
        *path,
        *line_terms(
            receive.antenna,
            gain_dbi=receive.gain_dbi,
            frequency_hz=frequency_hz,
            transmits=False,
            site=receive.site.name,
        ),
    )
    level = level_dbm(terms)
    own_noise = noise_dbm(radio)
    heard = heard_dbm(receive.site, radio, frequency_hz=frequency_hz, bearing_deg=receive.bearing_deg)
    worse = degradation_db(heard, own_noise)
    powers = [row_power_dbm(radio, row) for row in rows]
    levels = [_level(level, power, one) for one in powers]
    thresholds = [row_threshold_dbm(radio, row) + worse for row in rows]
    receiver = receiver_of(
        radio,
        rows,
        receive.antenna,
        discrimination_db=discrimination_db,
        gain_dbi=receive.gain_dbi,
        line_loss_db=line_loss_db(receive.antenna, frequency_hz=frequency_hz),
    )
    margins = [None if one is None else one - threshold for one, threshold in zip(levels, thresholds, strict=True)]
    outage = _outages(fading, receiver, margins)
    results = tuple(
        _modulation(radio, row, index, powers[index], thresholds[index], levels[index], margins[index], outage)
        for index, row in enumerate(rows)
    )
    carried, mean = _throughput(results)
    if carried is not None:
        results = tuple(replace(result, carried_percent=share) for result, share in zip(results, carried, strict=True))
    chosen = None if wanted is None else results[wanted]
    year = chosen.year.total if chosen is not None and chosen.year is not None else None
    written = () if not workings else _workings(
        radio, terms, level=level, results=results, wanted=wanted, fading=fading, receiver=receiver,
        own_noise=own_noise, heard=heard, worse=worse, mean=mean, frequency_hz=frequency_hz,
    )  # fmt: skip
    picked = None if outage is None or wanted is None else (_pick(outage[0], wanted), _pick(outage[1], wanted))
    return Direction(
        result=DirectionResult(
            direction=name,
            transmitter=transmit.site.name,
            receiver=receive.site.name,
            frequency_hz=frequency_hz,
            power_dbm=power,
            eirp_dbm=eirp_dbm(terms),
            received_dbm=level,
            noise_dbm=own_noise,
            threshold_degradation_db=worse,
            wanted=None if chosen is None or chosen.name == UNNAMED else chosen.name,
            threshold_dbm=None if chosen is None else chosen.threshold_dbm,
            margin_db=None if chosen is None else chosen.margin_db,
            rain_001_db=fading.rain_001_db,
            multipath_occurrence_percent=fading.occurrence_percent,
            modulations=results,
            throughput_mean_bps=mean,
            availability_percent=NOT_COMPUTED if chosen is None else chosen.availability_percent,
            minutes_per_year=None if year is None else float(minutes_per_year(year)),
            dominant_cause=None if chosen is None or chosen.year is None else chosen.year.dominant,
            workings=written,
        ),
        terms=terms,
        year=None if picked is None else picked[0],
        worst_month=None if picked is None else picked[1],
        nearly=lambda: _nearly_percent(fading, receiver, margins, wanted),
    )


def _power_term(radio: Radio, power: float | None) -> Term:
    each = radio.power_per_chain_dbm
    inputs: tuple[WorkingInput, ...] = ()
    if each is not None:
        inputs = (
            WorkingInput(label="power of each chain", value=each, unit="dBm"),
            WorkingInput(label="chains", value=float(radio.chains), unit=""),
        )
    note = f"full power; the radio can lower it by {radio.power_control_db:g} dB" if radio.power_control_db else ""
    return Term(
        key="power",
        label="transmit power of all chains",
        value=power,
        sign=1,
        unit="dBm",
        formula="as stated" if each is None else "power of each chain + 10 log(chains)",
        inputs=inputs,
        note=note,
    )


def _level(level: float | None, power: float | None, row_power: float | None) -> float | None:
    """Level of a row that is sent with another power than the wanted one."""
    if level is None or power is None or row_power is None:
        return None
    return level + (row_power - power)


def _outages(fading: Fading, receiver: Receiver, margins: list[float | None]) -> tuple[Outage, Outage] | None:
    known = [margin for margin in margins if margin is not None]
    if not margins or len(known) < len(margins):
        return None
    return fading.outage(np.array(known, dtype=np.float64), receiver)


def _nearly_percent(
    fading: Fading, receiver: Receiver, margins: list[float | None], wanted: int | None
) -> float | None:
    if wanted is None or margins[wanted] is None:
        return None
    more = [None if margin is None else margin + NEAR_DB for margin in margins]
    outage = _outages(fading, receiver, more)
    if outage is None:
        return None
    margin = more[wanted]
    assert margin is not None
    total = shares_of(_pick(outage[0], wanted), margin_db=margin).total
    return None if total is None else 100.0 - total


def _pick(outage: Outage, index: int) -> Outage:
    """The outage of one row out of many."""
    return Outage(
        rain_percent=np.atleast_1d(outage.rain_percent)[index],
        multipath_percent=np.atleast_1d(outage.multipath_percent)[index],
        diffraction_percent=np.atleast_1d(outage.diffraction_percent)[index],
        total_percent=np.atleast_1d(outage.total_percent)[index],
        dominant=str(np.atleast_1d(outage.dominant)[index]),
    )


def shares_of(outage: Outage, *, margin_db: float) -> Shares:
    """An outage of one row as plain numbers; where the level is short without any fading, it is down all the time."""
    if margin_db < 0.0:
        return Shares(rain=None, multipath=None, diffraction=None, total=100.0, dominant=LEVEL)
    total = _number(outage.total_percent)
    return Shares(
        rain=_number(outage.rain_percent),
        multipath=_number(outage.multipath_percent),
        diffraction=_number(outage.diffraction_percent),
        total=total,
        dominant=None if total is None else str(outage.dominant),
    )


def _number(value: object) -> float | None:
    number = float(np.asarray(value))
    return number if math.isfinite(number) else None


def _modulation(
    radio: Radio,
    row: Modulation,
    index: int,
    power: float | None,
    threshold: float,
    level: float | None,
    margin: float | None,
    outage: tuple[Outage, Outage] | None,
) -> ModulationResult:
    year = worst = None
    available = NOT_COMPUTED
    if outage is not None and margin is not None:
        year, worst = (shares_of(_pick(one, index), margin_db=margin) for one in outage)
        available = Periods(
            year=None if year.total is None else 100.0 - year.total,
            worst_month=None if worst.total is None else 100.0 - worst.total,
        )
    return ModulationResult(
        name=row.name,
        power_dbm=power,
        threshold_dbm=threshold,
        received_dbm=level,
        margin_db=margin,
        throughput_bps=None if row.throughput_bps is None else row.throughput_bps * radio.usable_share,
        year=year,
        worst_month=worst,
        availability_percent=available,
    )


def _throughput(results: tuple[ModulationResult, ...]) -> tuple[list[float] | None, float | None]:
    """Share of the year of each row, % as the fastest that gets through, and the mean rate over the year, bit/s."""
    rates = [result.throughput_bps for result in results]
    shares = [result.availability_percent.year for result in results]
    if not results or any(share is None for share in shares):
        return None, None
    known = [share for share in shares if share is not None]
    if any(rate is None for rate in rates):
        return None, None
    speed = [rate for rate in rates if rate is not None]
    carried = [0.0] * len(known)
    taken = 0.0
    for index in sorted(range(len(known)), key=lambda one: -speed[one]):
        carried[index] = max(known[index] - taken, 0.0)
        taken = max(taken, known[index])
    mean = sum(share / 100.0 * rate for share, rate in zip(carried, speed, strict=True))
    return carried, mean


def _workings(
    radio: Radio,
    terms: tuple[Term, ...],
    *,
    level: float | None,
    results: tuple[ModulationResult, ...],
    wanted: int | None,
    fading: Fading,
    receiver: Receiver,
    own_noise: float | None,
    heard: float | None,
    worse: float,
    mean: float | None,
    frequency_hz: float,
) -> tuple[Working, ...]:
    found = [term.working() for term in terms]
    eirp = eirp_dbm(terms)
    found += [
        Working(
            key="eirp",
            label="power radiated toward the receiver",
            value=eirp,
            unit="dBm",
            formula="power - branching - feeder + gain toward the receiver",
            inputs=tuple(WorkingInput(label=term.label, value=term.signed, unit="dB") for term in terms[:4]),
        ),
        Working(
            key="received",
            label="level received in clear air at the median k",
            value=level,
            unit="dBm",
            formula="sum of all terms above",
            inputs=tuple(WorkingInput(label=term.label, value=term.signed, unit="dB") for term in terms),
        ),
        *threshold_workings(radio, results, own_noise=own_noise, heard=heard, worse=worse),
        *fading_workings(fading),
        *outage_workings(results, fading=fading, receiver=receiver),
    ]
    if mean is not None:
        found.append(
            Working(
                key="throughput",
                label="mean throughput over the year",
                value=mean,
                unit="bit/s",
                formula="sum over modulations of (share of the year as the fastest that gets through x rate for users)",
                inputs=tuple(
                    WorkingInput(label=f"{result.name}, share", value=result.carried_percent, unit="%")
                    for result in results
                ),
                note="modulations are taken as nested: where a faster one gets through, so does a slower one",
            )
        )
    return tuple(found)
