"""The terminal page of `fellspan equip`: the decision, the ranked table, what the first ones ask of mast and aim, cautions.

Shows what design found and computes nothing.
"""

from typing import Final

from fellspan.cli import figures
from fellspan.cli.layout import WIDTH, Ink, columns_of, cut, labelled, printable, table, wrapped
from fellspan.design.equip_result import EquipResult, EquipRow
from fellspan.design.equip_words import capital, down_db, pair_words, up_db

_WIDTHS: Final = (2, 26, 6, 6, 6, 8, 5, 6, 6)
_RIGHT: Final = (0, 2, 3, 4, 5, 6, 7, 8)
_HEADS: Final = ("", "Antenna", "dBm", "margin", "spare", "avail %", "kg", "wind N", "reach")
TOLD: Final = 3
"""So many of the first are told about in full."""


def equip_lines(result: EquipResult, *, ink: Ink) -> list[str]:
    """The comparison as lines without line ends."""
    facts = f"{figures.distance(result.distance_m)} at {figures.frequency(result.frequency_hz)}"
    name = cut(printable(result.link), WIDTH - len(facts) - 2)
    lines = [f"{ink.emphasise(name)}{' ' * (WIDTH - columns_of(name) - len(facts))}{facts}"]
    tone = "bad" if result.best is None else "good" if result.path_verdict in (None, "clear") else "doubt"
    lines += [ink.emphasise(line, tone) for line in wrapped(capital(result.decision))]
    if result.changes:
        lines += wrapped(result.changes, first="  ")
    lines += ["", ink.emphasise(table(_HEADS, (), widths=_WIDTHS, right=_RIGHT)[0])]
    lines += table(_HEADS, [_cells(row, result) for row in result.rows], widths=_WIDTHS, right=_RIGHT)[1:]
    lines += wrapped(
        "Level and margin at the worse end in clear air; spare: what is left over margin and availability asked, below 0 "
        "what is missing; wind: force from the front, ~ where the drag coefficient is no more than common practice; reach in "
        "km over a free path; * meets what is asked.",
        first="  ",
    )
    lines += wrapped(result.policy, first="  ")
    for row in result.rows[:TOLD]:
        lines += ["", ink.emphasise(printable(f"{row.rank}. {pair_words(row, result.rows)}")), *_details(row)]
    lines.append("")
    for text in result.passed_over:
        lines += wrapped(f"Not compared: {text}", first="  ")
    lines += [line for text in result.assumptions for line in wrapped(text, first="  - ", rest="    ")]
    return [*lines, "", *(line for text in result.cautions for line in wrapped(text, first="  ! ", rest="    "))]


def _cells(row: EquipRow, result: EquipResult) -> tuple[str, ...]:
    level = _least(row.received_dbm.at_a, row.received_dbm.at_b)
    margin = _least(row.margin_db.at_a, row.margin_db.at_b)
    reach = row.reach
    return (
        f"{row.rank}",
        ("* " if row.meets else "  ") + pair_words(row, result.rows),
        figures.decibels(level, ""),
        figures.decibels(margin, ""),
        "-" if row.spare_db is None else down_db(row.spare_db) if row.spare_db >= 0.0 else f"-{up_db(-row.spare_db)}",
        _availability(row.availability_percent.year),
        "-" if row.mass_kg is None else f"{row.mass_kg:.3g}",
        "-" if row.wind is None else f"{row.wind.force_n:.0f}" + ("" if row.wind.confirmed else "~"),
        "-" if reach is None else reach_words(reach.distance_m, reach.limited_by),
    )


def reach_words(distance_m: float | None, limited_by: str) -> str:
    """Kilometres, rounded down."""
    if distance_m is None:
        return "-" if limited_by == "not computed" else "<0.1"
    kilometres = distance_m / 1000.0
    text = f"{int(kilometres * 10.0) / 10.0:.1f}" if kilometres < 100.0 else f"{int(kilometres)}"
    return f">{text}" if limited_by == "beyond" else text


def _availability(value: float | None) -> str:
    """Rounded down; never 100."""
    if value is None:
        return "-"
    return (
        f"{int(min(value, 99.9999) * 1e4 + 1e-6) / 1e4:.4f}" if value >= 99.0 else f"{int(value * 100.0) / 100.0:.2f}"
    )


def _least(one: float | None, other: float | None) -> float | None:
    return None if one is None or other is None else min(one, other)


def _details(row: EquipRow) -> list[str]:
    lines: list[str] = []
    if row.power_dbm is not None:
        rule = (
            ""
            if row.highest_setting_dbm is None
            else f"; highest setting under the rule {row.highest_setting_dbm:.1f} dBm"
        )
        lowered = f", lowered by {row.lowered_db:.1f} dB for the rule" if row.lowered_db > 0.0 else ""
        lines += labelled("Power", f"{row.power_dbm:.1f} dBm{lowered}{rule}")
    if row.throughput_mean_bps is not None:
        lines += labelled("Throughput", f"{row.throughput_mean_bps / 1e6:.0f} Mbit/s on average over the year")
    if row.minutes_per_year is not None:
        lines += labelled("Out", f"{row.minutes_per_year:.3g} minutes a year, both directions counted")
    lines += labelled("Beam", _beam_words(row))
    if row.far_field_m is not None:
        lines += labelled("Far field", f"from {row.far_field_m:.1f} m on")
    if row.frontal_area_m2 is not None and row.mass_kg is not None:
        lines += labelled(
            "Size",
            f"{row.width_m:g} x {row.height_m:g} m, {row.frontal_area_m2:g} m2 from the front, {row.mass_kg:g} kg",
        )
    wind = row.wind
    if wind is not None:
        mark = "" if wind.confirmed else "~"
        lines += labelled(
            "Wind",
            f"{wind.force_n:.0f}{mark} N at {wind.speed_m_s:.3g} m/s, {wind.moment_nm:.0f}{mark} N m about a support "
            f"{wind.arm_m:g} m below; drag coefficient {wind.drag_coefficient:g}, {wind.drag_source}",
        )
    if row.reach is not None and row.reach.distance_m is not None:
        lines += labelled(
            "Reach",
            f"{reach_words(row.reach.distance_m, row.reach.limited_by)} km; {_limit_words(row.reach.limited_by)}",
        )
    return lines


def _limit_words(limited_by: str) -> str:
    return {
        "beyond": "nothing farther was tried",
        "timing": "the radio's timing allows no more",
        "margin": "then the margin asked is used up",
    }.get(limited_by, f"then {limited_by} takes what the target allows")


def _beam_words(row: EquipRow) -> str:
    gain = "gain unknown" if row.peak_gain_dbi is None else f"{row.peak_gain_dbi:.1f} dBi"
    widths = [
        f"{value:.1f} deg {word}"
        for value, word in ((row.azimuth_width_deg, "wide"), (row.elevation_width_deg, "high"))
        if value is not None
    ]
    parts = [f"{gain}{', ' if widths else ''}{' and '.join(widths)}"]
    if row.off_aim_db is not None:
        parts.append(f"{row.off_aim_deg:g} deg off aim costs {row.off_aim_db:.1f} dB at each end")
    if row.sway_mean_db is not None and row.sway_p999_db is not None:
        parts.append(
            f"sway {row.sway_mean_db:.1f} dB on average, counted, and {row.sway_p999_db:.1f} dB or more for 0.1 % of the time"
        )
    return "; ".join(parts)
