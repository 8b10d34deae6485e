"""The terminal page of one link: the decision, where and by what, what clears it, levels, aiming, cautions.

Shows what assessment found and computes nothing.
"""

from collections.abc import Container, Sequence
from typing import Final

from fellspan.cli import figures
from fellspan.cli.layout import WIDTH, Ink, columns_of, cut, labelled, printable, table, wrapped
from fellspan.cli.signal_page import signal_lines
from fellspan.design.equip_words import capital
from fellspan.links import radio_words, words
from fellspan.links.result import AntennaResult, CriterionResult, EndResult, LinkResult
from fellspan.links.words import STATE_WORDS, State, state_of
from fellspan.planning.plan import LinkPlan

_TONES: Final = {
    "clear": "good", "clear-bare": "doubt", "marginal": "doubt", "obstructed": "bad", "meets": "good", "below": "bad",
}  # fmt: skip
_BASIS_WORDS: Final = {
    "surveyed": "as surveyed on the ground",
    "surface raster": "by a raster of the surface; not surveyed",
    "bare ground only": "on bare ground only: what stands on it is not all known",
}
_MOST_TO_VERIFY: Final = 3
_CRITERIA_WIDTHS: Final = (30, 8, 5, 7, 9, 7)


def state_tone(state: State) -> str:
    """The tone of emphasis for the state of a path."""
    return _TONES[state]


def link_lines(plan: LinkPlan, *, ink: Ink, told: Container[str] = ()) -> list[str]:
    """One link as lines without line ends; cautions that are `told` elsewhere on the page are left out."""
    result = plan.result
    return [
        *decision_lines(result, ink),
        *_governing(result),
        "",
        *_criteria(result),
        "",
        *signal_lines(result, ink),
        *_reflections(plan),
        *_heights(plan),
        *_equipment(plan),
        *_to_verify(plan),
        *_ends(result),
        *_cautions(result, told),
    ]


def decision_lines(result: LinkResult, ink: Ink, *, most: int | None = None) -> list[str]:
    """Name, verdict and reasons; with `most` a breach of the power rule, and whole sentences as room is."""
    facts = f"{figures.distance(result.distance_m)} at {figures.frequency(result.frequency_hz)}"
    name = cut(printable(result.name), WIDTH - len(facts) - 2)
    gap = " " * (WIDTH - columns_of(name) - len(facts))
    state = state_of(result)
    verdict, basis = STATE_WORDS[state].upper(), f", {_BASIS_WORDS[result.basis]}"
    if state == "clear-bare":
        basis = basis[basis.index(":") :]
    lines = [f"{ink.emphasise(name)}{gap}{facts}", f"{ink.emphasise(verdict, _TONES[state])}{basis}"]
    room = None if most is None else most - len(lines)
    # A breach has a line of its own on top: it must not push out what to build.
    over = "" if most is None else radio_words.breach_words(result)
    if over:
        lines += wrapped(over, first="  ! ", rest="    ")
    return lines + [line for told in _told(result.reasons, room) for line in told]


_LEAST_WEIGHT: Final = 2


def _told(reasons: Sequence[str], room: int | None) -> list[list[str]]:
    """The sentences as lines; where room is short whole ones are left out, and what the verdict line says too."""
    lines = [wrapped(reason, first="  ") for reason in reasons]
    if room is None:
        return lines
    kept: set[int] = set()
    worth = [i for i, reason in enumerate(reasons) if _is_bare(reason) or not reason.startswith("Basis:")]
    for index in sorted(worth, key=lambda index: (_weight(reasons[index], index), index)):
        if sum(len(lines[i]) for i in kept) + len(lines[index]) <= room:
            kept.add(index)
        elif _weight(reasons[index], index) == _LEAST_WEIGHT:
            break  # what follows, as a throughput without its level, says too little alone
    return [lines[index] for index in sorted(kept)]


def _weight(reason: str, index: int) -> int:
    """How far down a sentence stands when room is short: what to build and what is not known come right after the first."""
    return 0 if index == 0 else 1 if reason.startswith(("Rais", "No height")) or _is_bare(reason) else _LEAST_WEIGHT


def _is_bare(reason: str) -> bool:
    return reason.startswith("Basis: bare ground")


def _governing(result: LinkResult) -> list[str]:
    if not result.clearance:
        return []
    criterion = result.clearance[result.governing]
    at_m = criterion.worst_at_m if criterion.met else criterion.shortfall_at_m
    where = f"{figures.distance(at_m)} from A"
    if at_m == criterion.worst_at_m:
        where += f", at {figures.position(criterion.latitude_deg, criterion.longitude_deg)}"
    if criterion.met:
        return [
            "",
            *labelled("Tightest", f"{criterion.cause}: {figures.by_how_much(criterion)}"),
            *labelled("Where", where),
        ]
    return [
        "",
        *labelled("By how much", f"{figures.up(criterion.shortfall_m)} short ({criterion.criterion})"),
        *labelled("Where", where),
        *labelled("By what", criterion.cause),
    ]


def _criteria(result: LinkResult) -> list[str]:
    """All criteria in a table: part of the first zone required and found, what is missing; then what height helps."""
    rows = [_criterion_row(criterion) for criterion in result.clearance]
    heads = ("Criterion (first zone)", "k", "needs", "has", "missing", "likely")
    lines = ["  " + line for line in table(heads, rows, widths=_CRITERIA_WIDTHS, right=(1, 2, 3, 4, 5))]
    for criterion in result.clearance:
        if not criterion.met:
            lines += ["", *labelled("Extra height", figures.extra_height(criterion.extra_height_m))]
            lines += labelled("", f"for {criterion.criterion}, were all heights exact")
    return lines


def _criterion_row(criterion: CriterionResult) -> tuple[str, ...]:
    return (
        criterion.criterion,
        figures.earth_factor(criterion.k),
        f"{criterion.required_fraction:.2f}",
        "-" if criterion.worst_fraction is None else figures.zone_part(criterion.worst_fraction),
        "met" if criterion.met else figures.up(criterion.shortfall_m),
        "-" if criterion.probability is None else figures.percent(criterion.probability),
    )


def _reflections(plan: LinkPlan) -> list[str]:
    """What is mirrored on the way, where that can fade the link."""
    found = plan.reflections
    if found is None or not found.matters:
        return []
    return labelled("Reflection", " ".join(found.sentences))


def _heights(plan: LinkPlan) -> list[str]:
    """What to build, with the confidence asked and in whole mast steps; `fellspan heights` tells the rest."""
    return [] if plan.heights is None else labelled("Heights", plan.heights.decision)


def _equipment(plan: LinkPlan) -> list[str]:
    """Which antenna would serve, where that was asked; `fellspan equip` tells the rest."""
    return [] if plan.equipment is None else labelled("Equipment", capital(plan.equipment.decision))


def _to_verify(plan: LinkPlan) -> list[str]:
    """The points most worth a visit; the whole list stands in the report."""
    lines: list[str] = []
    for point in plan.survey[:_MOST_TO_VERIFY]:
        if point.highest_top_m is None:
            break
        top = f"no top above {words.down_m(point.highest_top_m):.1f} m above sea level"
        data = f"{point.top_m:.1f} m in the data, error {point.sigma_m:.1f} m, surveyed: {point.measured}"
        told = f"{figures.distance(point.from_a_m)} from A, {point.stands_there}: {top} ({data})"
        lines += labelled("" if lines else "Verify", told)
    return lines


def _ends(result: LinkResult) -> list[str]:
    lines: list[str] = []
    for label, end, bearing_deg, tilt_deg in (
        ("A", result.ends.a, result.bearing_ab_deg, result.tilt_ab_deg),
        ("B", result.ends.b, result.bearing_ba_deg, result.tilt_ba_deg),
    ):
        name = label if end.site == label else f"{label}: {end.site}"
        lines += ["", *wrapped(f"{name}, {figures.position(end.latitude_deg, end.longitude_deg)}", first="  ")]
        lines += labelled("Antenna", _antenna(end))
        lines += labelled(
            "Aim", f"{figures.bearing(bearing_deg, end.magnetic_bearing_deg)}, tilt {figures.tilt(tilt_deg)}"
        )
        if result.antennas is not None:
            lines += _gain(result.antennas.a if label == "A" else result.antennas.b)
    return lines


def _gain(antenna: AntennaResult) -> list[str]:
    """What the antenna gives toward the other end, and where it points if that is elsewhere."""
    if antenna.gain_dbi is None:
        return []
    words = f"{antenna.name}, {antenna.gain_dbi:.1f} dBi toward the other end"
    if antenna.peak_gain_dbi is not None and antenna.peak_gain_dbi - antenna.gain_dbi >= 0.05:
        words += (
            f", {antenna.peak_gain_dbi:.1f} dBi at its peak; points to {antenna.bearing_deg:05.1f} deg true, "
            f"tilt {figures.tilt(antenna.tilt_deg)}"
        )
    return labelled("Gain", words)


def _antenna(end: EndResult) -> str:
    above_ground = "" if end.height_as_given.endswith("above ground") else f": {end.antenna_agl_m:.1f} m above ground"
    sea_level = f"{end.antenna_amsl_m:.1f} m above sea level"
    return f"{end.height_as_given}{above_ground}, {sea_level}; ground at {end.ground_m:.1f} m"


def _cautions(result: LinkResult, told: Container[str]) -> list[str]:
    lines = [line for text in result.cautions if text not in told for line in wrapped(text, first="  ! ", rest="    ")]
    return ["", *lines] if lines else []
