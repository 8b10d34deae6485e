"""The horizon sketches of one link on its page, one from each end. Computes nothing."""

from dataclasses import dataclass
from typing import Literal

from markupsafe import Markup

from fellspan.links.result import LinkResult
from fellspan.links.skyline import Skyline
from fellspan.planning.plan import LinkPlan
from fellspan.report.horizon_drawing import Target, draw_horizon, horizon_words

EndLetter = Literal["A", "B"]


@dataclass(frozen=True, slots=True, kw_only=True)
class HorizonView:
    """One sketch: heading, drawing, the same in words, and what the drawing leaves out."""

    heading: str
    site: str
    markup: Markup
    caption: str
    notes: tuple[str, ...]


def horizon_section(link: LinkPlan) -> tuple[HorizonView, ...]:
    """Both views; empty where no skylines were worked out."""
    if link.horizons is None:
        return ()
    ends = link.result.ends
    views = []
    both: tuple[tuple[EndLetter, Skyline, str], ...] = (
        ("A", link.horizons.a, ends.a.site),
        ("B", link.horizons.b, ends.b.site),
    )
    for letter, seen, site in both:
        target = target_of(link.result, letter)
        title = f"The horizon from {letter}, {site}"
        views.append(
            HorizonView(
                heading=f"From {letter}",
                site=site,
                markup=Markup(draw_horizon(seen, target, uid=f"horizon-{letter.lower()}", title=title)),
                caption=horizon_words(seen, target),
                notes=seen.notes,
            )
        )
    return tuple(views)


def target_of(result: LinkResult, letter: EndLetter) -> Target:
    """The other end as it is seen from one."""
    at_a = letter == "A"
    here, there = (result.ends.a, result.ends.b) if at_a else (result.ends.b, result.ends.a)
    tilt = result.tilt_ab_deg if at_a else result.tilt_ba_deg
    bearing = result.bearing_ab_deg if at_a else result.bearing_ba_deg
    antenna = None if result.antennas is None else result.antennas.a if at_a else result.antennas.b
    return Target(
        name=there.site,
        tilt_deg=tilt,
        distance_m=result.distance_m,
        hidden_by=hidden_by(result),
        declination_deg=here.declination_deg,
        width_deg=(None, None) if antenna is None else (antenna.azimuth_width_deg, antenna.elevation_width_deg),
        boresight_deg=(bearing, tilt) if antenna is None else (antenna.bearing_deg, antenna.tilt_deg),
    )


def hidden_by(result: LinkResult) -> str | None:
    """What cuts the sight line at the median k, as the verdict has it; None where it is free."""
    if result.verdict != "obstructed":
        return None
    cuts = [cut for item in result.clearance for cut in item.obstructions if cut.cuts_sight]
    if not cuts:
        return "the land between"
    worst = max(cuts, key=lambda cut: cut.shortfall_m)
    return worst.cause or "ground"
