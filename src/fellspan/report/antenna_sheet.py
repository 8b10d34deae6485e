"""What a person asks of an antenna, as rows of words: shared by the terminal and the antenna page. Works nothing out itself."""

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

from fellspan.antennas.facts import CutFacts, PatternFacts, facts_of
from fellspan.antennas.footprint import Footprint
from fellspan.antennas.pattern import Pattern
from fellspan.report import wording
from fellspan.report.polar_drawing import BACK_FROM_DEG, no_width_words


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class AntennaSheet:
    """A pattern with its facts, and what a catalogue says of the thing itself; None where it does not."""

    pattern: Pattern
    facts: PatternFacts
    size: str | None = None
    mass_kg: float | None = None
    frontal_area_m2: float | None = None
    note: str = ""
    footprint: Footprint | None = None

    @property
    def notes(self) -> tuple[str, ...]:
        """What a person must know about it."""
        return (*((self.note,) if self.note else ()), *self.pattern.notes)


def sheet_of(
    pattern: Pattern,
    *,
    size: str | None = None,
    mass_kg: float | None = None,
    frontal_area_m2: float | None = None,
    note: str = "",
    footprint: Footprint | None = None,
) -> AntennaSheet:
    """The sheet of one pattern."""
    return AntennaSheet(
        pattern=pattern,
        facts=facts_of(pattern),
        size=size,
        mass_kg=mass_kg,
        frontal_area_m2=frontal_area_m2,
        note=note,
        footprint=footprint,
    )


def apart_words(sheets: Sequence[AntennaSheet]) -> str:
    """What a reader must know of antennas that are shown at different frequencies; empty where they are not."""
    if len({round(sheet.pattern.frequency_hz) for sheet in sheets}) < 2:
        return ""
    return (
        "Each antenna is shown at a frequency of its own: gains and beams do not compare. --frequency sets one for all."
    )


def sheet_rows(sheet: AntennaSheet) -> list[tuple[str, str]]:
    """Label and words of each fact, in the order in which people ask."""
    pattern, facts = sheet.pattern, sheet.facts
    rows = [
        ("Gain", f"{wording.number(facts.peak_gain_dbi)} dBi at {wording.frequency(pattern.frequency_hz)}"),
        ("Azimuth beam", _beam(facts.azimuth, all_around=True)),
        ("Elevation beam", _beam(facts.elevation, all_around=False)),
        ("Azimuth lobe", _lobe(facts.azimuth)),
        ("Elevation lobe", _lobe(facts.elevation)),
        ("Front to back", _front_to_back(facts)),
        ("Cross-polar", _cross(facts)),
        ("Far field", f"from {_length(facts.far_field_m)} on"),
        ("Efficiency", _efficiency(pattern)),
        ("Size", sheet.size or f"{_length(pattern.size_m)}, largest dimension"),
    ]
    if sheet.mass_kg is not None:
        rows.append(("Mass", f"{sheet.mass_kg:.3g} kg, mount not included"))
    if sheet.frontal_area_m2 is not None:
        rows.append(("Frontal area", f"{sheet.frontal_area_m2:.3g} m²"))
    rows.append(("Pattern from", pattern.source))
    return rows


def _beam(facts: CutFacts, *, all_around: bool) -> str:
    if facts.half_power_deg is None or facts.half_power_from_deg is None or facts.half_power_to_deg is None:
        return no_width_words(all_around=all_around)
    digits = 2 if facts.half_power_deg < 3.0 else 1
    ends = " to ".join(
        wording.degrees(edge, digits, sign=True) for edge in (facts.half_power_from_deg, facts.half_power_to_deg)
    )
    return f"{wording.degrees(facts.half_power_deg, digits)} wide at half power, {ends}"


def _lobe(facts: CutFacts) -> str:
    if facts.side_lobe_db is None or facts.side_lobe_deg is None or facts.side_lobe_deg > BACK_FROM_DEG:
        return "no side lobe in this pattern"
    return (
        f"first side lobe {wording.number(facts.side_lobe_db)} dB, {wording.degrees(facts.side_lobe_deg)} from the peak"
    )


def _front_to_back(facts: PatternFacts) -> str:
    if facts.azimuth.half_power_deg is None:
        return "none: the same all around"
    return f"{wording.number(facts.front_to_back_db)} dB, over the highest level within 30° of straight behind"


def _cross(facts: PatternFacts) -> str:
    if facts.cross_polar_db is None:
        return "none in this pattern; a real antenna has some"
    return f"{wording.number(facts.cross_polar_db)} dB below the peak, in the middle of the beam"


def _efficiency(pattern: Pattern) -> str:
    if pattern.efficiency is None:
        return "none: an envelope that real antennas stay under"
    return f"{wording.percent(pattern.efficiency)} of the power is radiated (gain over directivity)"


def _length(value_m: float) -> str:
    return (
        f"{value_m * 1000.0:.0f} mm" if value_m < 1.0 else f"{value_m:.1f} m" if value_m < 100.0 else f"{value_m:.0f} m"
    )


def sheet_dict(sheet: AntennaSheet) -> dict[str, Any]:
    """The facts as plain values for JSON."""
    import dataclasses

    pattern, facts, shown = sheet.pattern, sheet.facts, sheet.footprint
    return {
        "name": pattern.name,
        "kind": pattern.kind,
        "frequency_hz": pattern.frequency_hz,
        "peak_gain_dbi": facts.peak_gain_dbi,
        "azimuth": dataclasses.asdict(facts.azimuth),
        "elevation": dataclasses.asdict(facts.elevation),
        "electric_plane": PLANE_OF_FIELD[pattern.electric_plane],
        "front_to_back_db": facts.front_to_back_db,
        "cross_polar_db": facts.cross_polar_db,
        "far_field_m": facts.far_field_m,
        "efficiency": pattern.efficiency,
        "size_m": pattern.size_m,
        "size": sheet.size,
        "mass_kg": sheet.mass_kg,
        "frontal_area_m2": sheet.frontal_area_m2,
        "source": pattern.source,
        "notes": list(sheet.notes),
        "footprint": None
        if shown is None
        else {
            "height_m": shown.height_m,
            "tilt_deg": shown.tilt_deg,
            "centre_m": shown.centre_m,
            "outlines": [
                {"level_db": one.level_db, "near_m": one.near_m, "far_m": one.far_m, "width_m": one.width_m}
                for one in shown.contours
            ],
        },
    }


PLANE_OF_FIELD = {"vertical": "elevation", "horizontal": "azimuth"}
"""The plane of the diagrams in which the electric field lies (the E plane); the other one is the H plane."""
