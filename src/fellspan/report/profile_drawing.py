"""The path profile: a long section of one link as inline SVG, drawn from the levels that planning worked out.

Levels carry the Earth bulge of the governing criterion's k, so that the sight line is straight. Computes nothing of physics.
"""

from fellspan.links.result import EndResult
from fellspan.links.words import state_of
from fellspan.planning.plan import LinkPlan
from fellspan.report import profile_band, profile_parts
from fellspan.report.section import FULL, Sheet, prepare
from fellspan.report.svg import el, num, text
from fellspan.report.wording import (
    BASIS_WORD,
    STATE_WORD,
    criterion_words,
    distance,
    frequency,
    governing_words,
    headline,
    metres,
)

__all__ = ["draw_profile", "exaggeration_words", "profile_text"]


def _plot_top(sheet: Sheet, lanes: int) -> float:
    return sheet.line_height * (4.5 + lanes) + 6.0


def draw_profile(plan: LinkPlan, *, uid: str, sheet: Sheet = FULL) -> str:
    """SVG markup of the path profile of `plan`; `uid` makes its ids unique on a page (ASCII letters, digits, hyphens)."""
    named = profile_band.choose_names(plan, sheet)
    lanes = max((item.spot.lane + 1 for item in named), default=0)
    section = prepare(plan, sheet, plot_top=_plot_top(sheet, lanes))
    ends = plan.result.ends
    callout_y = sheet.line_height * 2.25
    bottom = section.y.from_px
    band, band_end = profile_band.band(section, top=bottom + 8.0)
    key, height = profile_band.key(section, uid, top=band_end + 2.0)
    clip = el(
        "clipPath",
        el("rect", x=sheet.left, y=section.y.to_px, width=sheet.right - sheet.left, height=bottom - section.y.to_px),
        id=f"{uid}-plot",
    )
    return el(
        "svg",
        el("title", text(f"Path profile of {plan.result.name}"), id=f"{uid}-title"),
        el("desc", text(profile_text(plan)), id=f"{uid}-desc"),
        profile_parts.patterns(uid),
        clip,
        profile_band.axes(section),
        el("g", profile_parts.ground(section, uid), profile_parts.cover(section, uid), class_="land"),
        el("g", profile_parts.doubt(section, uid), clip_path=f"url(#{uid}-plot)"),
        el("g", profile_parts.zone(section), clip_path=f"url(#{uid}-plot)", class_="zone"),
        el("g", profile_parts.obstructed(section), class_="cuts"),
        band,
        profile_parts.mast(section, ends.a, at_b=False),
        profile_parts.mast(section, ends.b, at_b=True),
        profile_band.obstacle_names(section, named, lanes_bottom=section.y.to_px - 4.0),
        profile_parts.governing(section, callout_y=callout_y),
        profile_band.heading(section, ends.a, at_b=False),
        profile_band.heading(section, ends.b, at_b=True),
        key,
        class_=f"path-profile {sheet.name} {state_of(plan.result)}",
        viewBox=f"0 0 {num(sheet.width)} {num(height)}",
        role="img",
        aria_labelledby=f"{uid}-title {uid}-desc",
        font_size=num(sheet.font),
        data_length_m=repr(plan.profile.length_m),
        data_left=num(sheet.left),
        data_right=num(sheet.right),
        data_axis=num(sheet.axis_width),
        data_top=num(section.y.to_px),
        data_bottom=num(bottom),
        data_low_m=repr(section.y.from_value),
        data_high_m=repr(section.y.to_value),
        data_callout=num(callout_y),
    )


def exaggeration_words(plan: LinkPlan, *, sheet: Sheet = FULL) -> str:
    """Vertical exaggeration of the drawing, for the title block."""
    factor = prepare(plan, sheet, plot_top=0.0).exaggeration
    return (
        f"heights drawn {factor:.0f} times too tall" if factor >= 10.0 else f"heights drawn {factor:.1f} times too tall"
    )


def profile_text(plan: LinkPlan) -> str:
    """The drawing in words, for people who cannot see it."""
    result = plan.result
    criterion = result.clearance[result.governing]
    ends = result.ends
    where = f"At {distance(criterion.worst_at_m)} from A ({criterion.cause or 'ground'})"
    words = [
        f"{STATE_WORD[state_of(result)]}, {BASIS_WORD[result.basis]}. {headline(result)}",
        f"From A, {_end_words(ends.a)}, to B, {_end_words(ends.b)}: {distance(result.distance_m)}",
        f"Frequency {frequency(result.frequency_hz)}. Governing criterion: {criterion_words(criterion)}",
        f"{where}: {governing_words(criterion, result.distance_m)}",
    ]
    if plan.confidence is not None:
        band = plan.confidence.band
        index = min(range(len(band.distance_m)), key=lambda at: abs(band.distance_m[at] - criterion.worst_at_m))
        words.append(
            f"The clearance there is known to ±{metres(band.middle_m[index] - band.low_m[index])} in 90 % of cases"
        )
    for item in criterion.obstructions:
        what = "cuts the sight line" if item.cuts_sight else "reaches into the required zone"
        words.append(f"{item.cause} {what} from {distance(item.from_m)} to {distance(item.to_m)}.")
    return " ".join(word if word.endswith(".") else f"{word}." for word in words)


def _end_words(end: EndResult) -> str:
    return (
        f"{end.site}, antenna {metres(end.antenna_agl_m)} above ground and {metres(end.antenna_amsl_m)} above sea level"
    )
