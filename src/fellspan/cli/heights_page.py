"""The terminal page of `fellspan heights`: the decision, a table of what would do, what governs, how sure it is.

Shows what design found and computes nothing.
"""

from typing import Final

from fellspan.cli import figures
from fellspan.cli.layout import WIDTH, Ink, columns_of, cut, labelled, printable, table, wrapped
from fellspan.design.confidence import ConfidenceResult, HeightsAt
from fellspan.design.heights_result import HEIGHT_WORDS, HeightOption, HeightsResult, Pair
from fellspan.planning.plan import LinkPlan

_WIDTHS: Final = (26, 8, 8, 8, 8, 8)
_RIGHT: Final = (1, 2, 3, 4, 5)


def heights_lines(plan: LinkPlan, *, ink: Ink) -> list[str]:
    """One link as lines without line ends."""
    heights, confidence = plan.heights, plan.confidence
    if heights is None or confidence is None:
        return []
    result = plan.result
    facts = f"{figures.distance(result.distance_m)} at {figures.frequency(result.frequency_hz)}"
    name = cut(printable(result.name), WIDTH - len(facts) - 2)
    lines = [f"{ink.emphasise(name)}{' ' * (WIDTH - columns_of(name) - len(facts))}{facts}"]
    first, *rest = wrapped(heights.decision, first="")
    lines += [ink.emphasise(first, "good" if heights.planned_holds else "bad"), *rest, ""]
    lines += _table(heights)
    lines += ["", *_governing(heights), "", *_confidence(confidence)]
    lines += ["", *labelled("Counted from", f"A: {heights.base_a}; B: {heights.base_b}")]
    lines += labelled("Checked", heights.checked)
    return [*lines, "", *(line for text in heights.cautions for line in wrapped(text, first="  ! ", rest="    "))]


def _table(heights: HeightsResult) -> list[str]:
    """What would do: exact on the heights in the data, and to build."""
    costs = any(option.cost is not None for option in heights.options)
    heads = ("Heights, m", "A exact", "B exact", "A build", "B build", "cost" if costs else "likely")
    rows = [_row("as planned", heights.planned, None, "")]
    for option in heights.options:
        last = "" if option.cost is None else f"{option.cost:.0f}"
        if not costs:
            last = "-" if option.probability is None else figures.percent(option.probability)
        rows.append(_row(HEIGHT_WORDS[option.kind], option.raw, option.build, last))
    lines = ["  " + line for line in table(heads, rows, widths=_WIDTHS, right=_RIGHT)]
    for note in dict.fromkeys(option.note for option in heights.options if option.note):
        whose = "; ".join(HEIGHT_WORDS[option.kind] for option in heights.options if option.note == note)
        lines += wrapped(f"{whose}: {note}.", first="  * ", rest="    ")
    step = f"{heights.step_m:g}"
    lines += wrapped(
        f"Exact: on the heights in the data. Build: with {100.0 * heights.confidence:g} % confidence, up to whole steps of "
        f"{step} m.",
        first="  ",
    )
    return lines


def _row(words: str, raw: Pair | None, build: Pair | None, last: str) -> tuple[str, ...]:
    exact = ("-", "-") if raw is None else (f"{raw.a_m:.2f}", f"{raw.b_m:.2f}")
    made = ("-", "-") if build is None else (f"{build.a_m:.6g}", f"{build.b_m:.6g}")
    return (words, *exact, *(("", "") if words == "as planned" else made), last)


def _governing(heights: HeightsResult) -> list[str]:
    lines: list[str] = []
    seen: list[str] = []
    for option in heights.options:
        if option.governs is None:
            continue
        words = _governs(option)
        if words in seen:
            continue
        seen.append(words)
        lines += labelled("Governs", f"{HEIGHT_WORDS[option.kind]}: {words}")
        lines += labelled("A metre more", "; ".join(_more(option)))
    return lines


def _governs(option: HeightOption) -> str:
    touch = option.governs
    assert touch is not None
    return (
        f"{touch.cause}, {figures.distance(touch.at_m)} from A, under {touch.criterion} (k {figures.earth_factor(touch.k)}); "
        f"raster error {touch.sigma_m:.1f} m, sampling {_small(touch.sampling_m)}"
    )


def _more(option: HeightOption) -> list[str]:
    parts = []
    for item in option.more:
        share = "" if item.fraction is None else f", {item.fraction:.2f} of the zone"
        parts.append(
            f"at {item.end} buys {item.spare_m:.2f} m{share}; tightest then: {item.next_cause}, "
            f"{figures.distance(item.next_at_m)} from A"
        )
    return parts


def _confidence(confidence: ConfidenceResult) -> list[str]:
    each = ", ".join(f"{item.criterion} {figures.percent(item.probability)}" for item in confidence.criteria)
    lines = labelled("As planned", f"every criterion holds with {figures.percent(confidence.all_hold)} ({each})")
    for stated in confidence.heights:
        lines += labelled(f"For {100.0 * stated.confidence:g} %", _change(stated))
    return lines


def _change(stated: HeightsAt) -> str:
    ends = (("A alone", stated.a_m), ("B alone", stated.b_m), ("both alike", stated.both_m))
    return ", ".join(f"{word} {'cannot' if value is None else f'{value:+.1f} m'}" for word, value in ends)


def _small(value_m: float) -> str:
    return f"{value_m:.2f} m" if value_m >= 0.05 else "under 0.05 m"
