"""The sentences of a comparison of equipment: decision, what would change it, cautions, assumptions. Computes nothing."""

from collections.abc import Sequence
from typing import Final

from fellspan.climate.figures import ClimateFigures
from fellspan.design.equip_result import EquipRow, EquipSettings
from fellspan.design.reach import ASSUMED
from fellspan.design.wind import WORST_ANGLE
from fellspan.links.safety import safety_lines
from fellspan.links.signal_path import SignalPath
from fellspan.links.site import Link
from fellspan.links.tenths import down_tenth, up_tenth
from fellspan.vocabulary import PathVerdict

IN_WEATHER: Final = {
    "rain": "in rain",
    "multipath": "in multipath fading",
    "diffraction": "when the air bends the beam down",
    "level": "in clear air already",
}


def target_words(link: Link) -> str:
    """`99.99 % of the year and a margin of 10 dB`."""
    margin = f"a margin of {link.wanted_margin_db:g} dB"
    target = link.target_availability_percent
    return margin if target is None else f"{target:g} % of the year and {margin}"


def pair_words(row: EquipRow, rows: Sequence[EquipRow]) -> str:
    """The antenna, with its radio where several are compared."""
    several = len({one.radio for one in rows}) > 1
    return f"{row.antenna} with {row.radio}" if several else row.antenna


def missing_words(row: EquipRow) -> str:
    """`falls 4.1 dB short in rain`."""
    if row.spare_db is None:
        return "cannot be held against the target"
    if row.spare_db >= 0.0:
        return "is held back by the radio's timing or a channel that a site cannot use"
    short = f"falls {up_db(-row.spare_db)} dB short"
    if row.short_of == "margin":
        return f"{short} of the margin"
    return f"{short} {IN_WEATHER.get(row.cause or '', 'of the target')}"


def decision_of(link: Link, rows: Sequence[EquipRow], *, path_verdict: PathVerdict | None) -> str:
    """One sentence: which, why, and how the runner-up fares."""
    first, target = rows[0], target_words(link)
    lead = (
        ""
        if path_verdict in (None, "clear")
        else f"The path is {path_verdict}, which no antenna mends; on level alone: "
    )
    if first.lowered_db > 0.0:
        lead += f"with the power lowered by {first.lowered_db:.1f} dB to what the power rule allows, "
    if not first.meets:
        if first.spare_db is None:
            return f"{lead}none of {len(rows)} can be held against {target}."
        nearest = f"nearest is the {pair_words(first, rows)}, which {missing_words(first)}"
        return f"{lead}none of {len(rows)} meets {target}; {nearest}."
    spare = "" if first.spare_db is None else f", with {down_db(first.spare_db)} dB to spare"
    smaller = runner_up(rows)
    known = first.frontal_area_m2 is not None
    what = "the smallest that meets" if known and len(rows) > 1 else "meets"
    text = f"{lead}the {pair_words(first, rows)}: {what} {target}{spare}"
    if smaller is not None:
        text += f"; the {pair_words(smaller, rows)} {missing_words(smaller)}"
    return f"{text}."


def runner_up(rows: Sequence[EquipRow]) -> EquipRow | None:
    """The one that comes nearest among those that fall short and would be chosen before the winner; else the nearest of all."""
    failing = [row for row in rows if not row.meets and row.spare_db is not None]
    if not rows[0].meets or not failing:
        return None
    area = rows[0].frontal_area_m2
    smaller = [
        row for row in failing if area is not None and row.frontal_area_m2 is not None and row.frontal_area_m2 <= area
    ]
    return (smaller or failing)[0]


def changes_of(rows: Sequence[EquipRow]) -> str:
    """What would change the decision, in one sentence."""
    first = rows[0]
    if not first.meets:
        if first.spare_db is None or first.spare_db >= 0.0:
            return ""
        return (
            f"With {up_db(-first.spare_db)} dB more ({_ways(first)}shorter feeder, more robust modulation, lower target) "
            f"the {pair_words(first, rows)} would do."
        )
    parts = []
    smaller = runner_up(rows)
    if smaller is not None and smaller.spare_db is not None and smaller.spare_db < 0.0 and _is_smaller(smaller, first):
        parts.append(
            f"with {up_db(-smaller.spare_db)} dB more ({_ways(smaller)}shorter feeder, more robust modulation, lower target) "
            f"the {pair_words(smaller, rows)} would do"
        )
    if first.spare_db is not None:
        stronger = next((row for row in rows[1:] if row.meets and (row.spare_db or 0.0) > first.spare_db), None)
        lost = f"more than {down_db(first.spare_db)} dB lost (longer feeder, wrong aim, growing trees)"
        parts.append(
            f"{lost} and " + (f"it takes the {pair_words(stronger, rows)}" if stronger else "none of these is left")
        )
    text = "; ".join(parts)
    return f"{text[:1].upper()}{text[1:]}." if text else ""


def _ways(row: EquipRow) -> str:
    """More power is no way out where the rule has just taken it away."""
    return "" if row.lowered_db > 0.0 else "power, "


def cautions_of(
    link: Link, rows: Sequence[EquipRow], figures: ClimateFigures, *, trees: bool, distance_m: float
) -> tuple[str, ...]:
    """Doubts about the comparison, then what people must see to before anything is hung."""
    found: list[str] = []
    if trees:
        found.append(
            "Trees reach into the zone that must be free: what they take changes, and the signal is marginal at most."
        )
    if link.target_availability_percent is not None and all(row.availability_percent.year is None for row in rows):
        found.append("Availability is not computed: " + ("; ".join(figures.notes[:2]) or "climate figures are missing"))
    for row in rows[:3]:
        if row.lowered_db > 0.0 and row.power_dbm is not None:
            found.append(
                f"{pair_words(row, rows)}: power is lowered by {row.lowered_db:.1f} dB to {row.power_dbm:.1f} dBm, "
                "the most that the rule leaves it."
            )
        if row.far_field_m is not None and row.far_field_m > distance_m:
            found.append(
                f"{pair_words(row, rows)}: the link is shorter than its far-field distance of {row.far_field_m:.0f} m; "
                "its gain there is less than stated."
            )
    if link.power_rule is not None:
        found.append(rows[0].rule or "")
        found.append("The rule is a reading of its text and no legal advice: confirm with your regulator.")
    if any(row.wind is not None for row in rows):
        doubtful = any(row.wind is not None and not row.wind.confirmed for row in rows)
        found.append(
            WORST_ANGLE
            + (" Drag coefficients marked ~ were not seen in a source: not to build by." if doubtful else "")
        )
    found += safety_lines(("structure and wind", "climbing", "radio exposure", "licensed practice", "local codes"))
    return tuple(dict.fromkeys(one for one in found if one))


def assumptions_of(settings: EquipSettings, rows: Sequence[EquipRow], path: SignalPath) -> tuple[str, ...]:
    """What the figures rest on."""
    both = {
        "both": "The same antenna hangs at both ends.",
        "a": "Only the antenna at A is replaced.",
        "b": "Only the antenna at B is replaced.",
    }[settings.end]
    found = [both, "Lines, radomes, sway and second antennas stay as the link states them."]
    if any(row.mass_kg is not None for row in rows):
        found.append(
            "Sizes and masses are typical of what is sold, no maker's figures: take those before anything is hung."
        )
    wind = next((row.wind for row in rows if row.wind is not None), None)
    if wind is not None:
        found.append(f"Wind {wind.speed_m_s:g} m/s, moment about a support {wind.arm_m:g} m below the antenna.")
    if settings.reach:
        found.append(ASSUMED)
    rain = path.figures.rain_rate_001_mm_h
    if rain is not None:
        found.append(f"Rain of {rain.value:.4g} mm/h for 0.01 % of the year ({rain.provenance}).")
    return tuple(found)


def capital(sentence: str) -> str:
    """A decision as it begins a line."""
    return sentence[:1].upper() + sentence[1:]


def up_db(value: float) -> str:
    """A shortfall to a tenth of a decibel, never too small."""
    return f"{up_tenth(value):.1f}"


def down_db(value: float) -> str:
    """What is to spare, to a tenth of a decibel, never too much."""
    return f"{down_tenth(value):.1f}"


def _is_smaller(one: EquipRow, other: EquipRow) -> bool:
    areas = one.frontal_area_m2, other.frontal_area_m2
    return areas[0] is not None and areas[1] is not None and areas[0] <= areas[1]
