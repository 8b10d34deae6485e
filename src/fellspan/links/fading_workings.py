"""Workings of weather and outage: how rain, multipath, low k, thresholds and availabilities of a direction came about.

Explains figures that `fading` and `receivers` worked out; computes none.
"""

from fellspan.links.fading import Fading, Receiver
from fellspan.links.radio import Radio
from fellspan.links.receivers import ASSUMED_NOISE_FIGURE_DB, UNNAMED
from fellspan.links.signal_result import DirectionResult, ModulationResult, Shares, Working, WorkingInput
from fellspan.propagation import minutes_per_year, out_of_range

MULTIPATH_KEYS = {
    "P.530-19": "p530-19-multipath",
    "P.530-17 detailed": "p530-17-multipath-detailed",
    "P.530-17 quick": "p530-17-multipath-quick",
}


def _given(label: str, value: float | str | None, unit: str = "") -> WorkingInput:
    return WorkingInput(label=label, value=value, unit=unit)


def _of(name: str) -> str:
    return "" if name == UNNAMED else f" of {name}"


def threshold_workings(
    radio: Radio,
    results: tuple[ModulationResult, ...],
    *,
    own_noise: float | None,
    heard: float | None,
    worse: float,
) -> list[Working]:
    """Noise, its rise by what is heard, thresholds and margins."""
    found = []
    if own_noise is not None and radio.bandwidth_hz is not None:
        assumed = radio.noise_figure_db is None
        figure = ASSUMED_NOISE_FIGURE_DB if radio.noise_figure_db is None else radio.noise_figure_db
        found.append(
            Working(
                key="noise",
                label="noise of the receiver in its channel",
                value=own_noise,
                unit="dBm",
                formula="10 log(k T B) + noise figure",
                inputs=(_given("channel width", radio.bandwidth_hz / 1e6, "MHz"), _given("noise figure", figure, "dB")),
                source_key="thermal-noise",
                note="noise figure assumed, common practice, no source" if assumed else "",
            )
        )
    if heard is not None:
        found.append(
            Working(
                key="threshold_degradation",
                label="rise of every threshold by the noise floor at the site",
                value=worse,
                unit="dB",
                formula="10 log(1 + I / N)",
                inputs=(_given("heard in the channel", heard, "dBm"), _given("own noise", own_noise, "dBm")),
                source_key="threshold-degradation",
                note="" if own_noise is not None else "not counted: no channel width is stated",
            )
        )
    rows = {row.name: row for row in radio.modulations}
    for result in results:
        row = rows.get(result.name)
        from_noise = row is not None and row.threshold_dbm is None
        inputs = [_given("noise", own_noise, "dBm")] if from_noise else []
        if from_noise and row is not None:
            inputs += [
                _given("signal-to-noise ratio", row.snr_db, "dB"),
                _given("implementation loss", radio.implementation_loss_db, "dB"),
            ]
        found += [
            Working(
                key=f"threshold:{result.name}",
                label=f"threshold{_of(result.name)}",
                value=result.threshold_dbm,
                unit="dBm",
                formula=("noise + ratio + implementation loss" if from_noise else "as stated")
                + " + rise by noise floor",
                inputs=(*inputs, _given("rise by noise floor", worse, "dB")),
                source_key="thermal-noise" if from_noise else "",
            ),
            Working(
                key=f"margin:{result.name}",
                label=f"margin{_of(result.name)}",
                value=result.margin_db,
                unit="dB",
                formula="level - threshold",
                inputs=(
                    _given("level at its power", result.received_dbm, "dBm"),
                    _given("threshold", result.threshold_dbm, "dBm"),
                ),
            ),
        ]
    return found


def fading_workings(fading: Fading) -> list[Working]:
    """Rain at 0.01 %, occurrence of multipath, spread of the gradient."""
    path = fading.geometry
    frequency = _given("frequency", fading.frequency_hz / 1e9, "GHz")
    length = _given("path length", path.length_m / 1000.0, "km")
    heights = (_given("antenna A", path.a_amsl_m, "m"), _given("antenna B", path.b_amsl_m, "m"))
    rain = fading.rain
    found = [
        Working(
            key="rain_001",
            label="rain loss exceeded for 0.01 % of the year",
            value=fading.rain_001_db,
            unit="dB",
            formula=f"k R^alpha d r, edition P.530-{rain.edition}",
            inputs=(
                _given("rain rate at 0.01 %", rain.rate_mm_h, "mm/h"),
                length,
                frequency,
                _given("tilt of the field from horizontal", rain.tilt_deg, "degrees"),
            ),
            source_key=f"p530-{rain.edition}-rain",
            note="; ".join(part for part in (rain.provenance, *rain.breaches) if part),
        ),
        Working(
            key="multipath_occurrence",
            label="occurrence of multipath in the worst month",
            value=fading.occurrence_percent,
            unit="%",
            formula="none up to 5 km"
            if fading.edition is None or path.length_m <= 5000.0
            else f"p0 of {fading.edition}",
            inputs=(length, frequency, *heights, *fading.multipath_inputs),
            source_key="" if fading.edition is None else MULTIPATH_KEYS[fading.edition],
            note="; ".join(fading.multipath_breaches),
        ),
        Working(
            key="gradient_spread",
            label="diffraction with the gradient at 99.9 % of the worst month",
            value=float(fading.tail_loss_db),
            unit="dB",
            formula="delta-Bullington (and trees) at 1/k of that gradient, between worked-out values",
            inputs=(
                _given("median gradient", fading.spread.median, "N/km"),
                _given("99.9 % of the year", fading.spread.year, "N/km"),
                _given("99.9 % of the worst month", fading.spread.worst_month, "N/km"),
            ),
            source_key="gradient-normal-law",
        ),
    ]
    if fading.wet_radomes_db:
        found.append(
            Working(
                key="radomes_wet",
                label="wet radomes of both ends",
                value=fading.wet_radomes_db,
                unit="dB",
                formula="as stated; taken off the margin while it rains",
                note="if they use up the whole margin, the link is down from the first rain on, not always: our own rule",
            )
        )
    return found


def _month_breaches(percent: float) -> tuple[str, ...]:
    return out_of_range("p530-19-worst-month", worst_month_percent=percent)


def both_ways_workings(
    *,
    directions: tuple[DirectionResult, DirectionResult],
    year: Shares,
    worst_month: Shares,
    common: bool,
) -> tuple[Working, ...]:
    """Availability of the wanted modulation both ways at once; `common` where both directions use one frequency."""
    multipath = (
        "the larger multipath (one frequency)" if common else "1 - (1 - pa)(1 - pb) of multipath (two frequencies)"
    )
    there, back = (one.availability_percent for one in directions)
    found = []
    for key, label, shares, ends in (
        ("availability_both_ways", "average year", year, (there.year, back.year)),
        (
            "availability_worst_month_both_ways",
            "average worst month",
            worst_month,
            (there.worst_month, back.worst_month),
        ),
    ):
        out = None if shares.total is None or key != "availability_both_ways" else float(minutes_per_year(shares.total))
        found.append(
            Working(
                key=key,
                label=f"availability both ways at once, {label}",
                value=None if shares.total is None else 100.0 - shares.total,
                unit="%",
                formula=f"100 - (larger rain + {multipath} + larger low k)",
                inputs=(
                    _given("A to B", ends[0], "%"),
                    _given("B to A", ends[1], "%"),
                    _given("rain", shares.rain, "%"),
                    _given("multipath", shares.multipath, "%"),
                    _given("low k", shares.diffraction, "%"),
                    *(() if out is None else (_given("outage", out, "minutes a year"),)),
                ),
                source_key="outage-rules",
                note="level short without any fading" if shares.dominant == "level" else "",
            )
        )
    return tuple(found)


def outage_workings(results: tuple[ModulationResult, ...], *, fading: Fading, receiver: Receiver) -> list[Working]:
    """Outage of each modulation by cause, and its availability."""
    found = []
    older = fading.edition not in (None, "P.530-19")
    for index, result in enumerate(results):
        year, worst = result.year, result.worst_month
        if year is None or worst is None:
            continue
        margin = _given("margin", result.margin_db, "dB")
        extra = []
        if receiver.width_hz[index] > 0.0:
            extra.append(_given("signature width", float(receiver.width_hz[index]) / 1e6, "MHz"))
            extra.append(_given("signature depth", float(receiver.depth_db[index]), "dB"))
        if receiver.second is not None:
            extra.append(_given("spacing of two antennas", receiver.second.spacing_m, "m"))
        if receiver.cross is not None:
            extra.append(_given("cross-polar discrimination", float(receiver.cross.discrimination_db), "dB"))
        breaches = "" if not year.rain else "; ".join(out_of_range("p530-19-rain-percent", percent=year.rain))
        name = result.name
        found += [
            Working(
                key=f"rain_outage:{name}",
                label=f"outage{_of(name)} by rain, average year",
                value=year.rain,
                unit="%",
                formula=f"p at which the rain loss is the margin, equation (34), reading {fading.rain_reading}",
                inputs=(
                    margin,
                    _given("rain loss at 0.01 %", fading.rain_001_db, "dB"),
                    _given("wet radomes", fading.wet_radomes_db, "dB"),
                ),
                source_key="p530-19-rain-percent",
                note=breaches,
            ),
            Working(
                key=f"multipath_outage:{name}",
                label=f"outage{_of(name)} by multipath, worst month",
                value=worst.multipath,
                unit="%",
                formula="flat + selective + cross-polar, less what a second antenna saves",
                inputs=(margin, _given("occurrence", fading.occurrence_percent, "%"), *extra),
                source_key="p530-19-space-diversity" if receiver.second is not None else "p530-19-clear-air-outage",
            ),
            Working(
                key=f"multipath_outage_year:{name}",
                label=f"outage{_of(name)} by multipath, average year",
                value=year.multipath,
                unit="%",
                formula="worst month by 10^(-DeltaG / 10)"
                if older
                else "worst month by p = Q p_year, Q = 2.85 p_year^-0.13",
                inputs=(_given("worst month", worst.multipath, "%"),),
                source_key="p2001-6-worst-month" if older else "p530-19-worst-month",
                note="" if older or not worst.multipath else "; ".join(_month_breaches(worst.multipath)),
            ),
            Working(
                key=f"rain_outage_worst_month:{name}",
                label=f"outage{_of(name)} by rain, worst month",
                value=worst.rain,
                unit="%",
                formula="Q p_year, Q = 2.85 p_year^-0.13, at most 12",
                inputs=(_given("average year", year.rain, "%"),),
                source_key="p530-19-worst-month",
                note="" if not worst.rain else "; ".join(_month_breaches(worst.rain)),
            ),
            Working(
                key=f"diffraction_outage:{name}",
                label=f"outage{_of(name)} by low k, average year",
                value=year.diffraction,
                unit="%",
                formula="share of time for which diffraction costs more than the margin and what the level counts already",
                inputs=(margin, _given("diffraction and trees in the level", fading.loss_in_level_db, "dB")),
                source_key="gradient-normal-law",
            ),
            Working(
                key=f"diffraction_outage_worst_month:{name}",
                label=f"outage{_of(name)} by low k, worst month",
                value=worst.diffraction,
                unit="%",
                formula="the same, gradient at 99.9 % of the worst month; at least the year, at most 12 times it",
                inputs=(
                    margin,
                    _given("99.9 % of the worst month", fading.spread.worst_month, "N/km"),
                    _given("average year", year.diffraction, "%"),
                ),
                source_key="gradient-normal-law",
            ),
            Working(
                key=f"availability:{name}",
                label=f"availability{_of(name)}, average year",
                value=result.availability_percent.year,
                unit="%",
                formula="100 - (rain + multipath + low k)",
                inputs=(
                    _given("rain", year.rain, "%"),
                    _given("multipath", year.multipath, "%"),
                    _given("low k", year.diffraction, "%"),
                    _given(
                        "outage",
                        None if year.total is None else float(minutes_per_year(year.total)),
                        "minutes a year",
                    ),
                ),
                source_key="p530-19-sum-of-outages",
                note="level short without any fading" if year.dominant == "level" else "",
            ),
            Working(
                key=f"availability_worst_month:{name}",
                label=f"availability{_of(name)}, average worst month",
                value=result.availability_percent.worst_month,
                unit="%",
                formula="100 - (rain + multipath + low k)",
                inputs=(
                    _given("rain", worst.rain, "%"),
                    _given("multipath", worst.multipath, "%"),
                    _given("low k", worst.diffraction, "%"),
                ),
                source_key="p530-19-sum-of-outages",
            ),
        ]
    return found
