"""Heights in plain sentences, the decision first. Reads results and computes nothing."""

import math
from collections.abc import Sequence
from typing import Final

from fellspan.design.heights_result import HeightKind, HeightOption, Pair
from fellspan.links.ends import EndLevel
from fellspan.links.result import EndResult
from fellspan.links.safety import RAISING, safety_lines
from fellspan.links.verdicts import USUAL_MAST_M

LOW_M: Final = 2.0
"""Below this height above what they stand on, people, vehicles, grass and snow get in the way (common practice, no source)."""


def base(end: EndResult | EndLevel) -> str:
    """What the heights at one end are counted from."""
    return "ground" if end.roof_m is None else f"roof, {end.roof_m:.1f} m above ground"


def metres(value: float) -> str:
    """A height without needless digits."""
    return f"{value:.2f}".rstrip("0").rstrip(".") + " m"


def decision(planned: Pair, options: Sequence[HeightOption], *, holds: bool, confidence: float, likely: float) -> str:
    """What to build, in one or two sentences."""
    asked = f"{100.0 * confidence:g} %"
    builds = {option.kind: option.build for option in options}
    now = f"{metres(planned.a_m)} at A and {metres(planned.b_m)} at B"
    usual = {kind: pair if pair and max(pair.a_m, pair.b_m) <= USUAL_MAST_M else None for kind, pair in builds.items()}
    ways = _ways(usual) or _ways(builds)
    beyond = bool(ways) and not any(usual.values())
    if holds:
        least = builds.get("least total")
        less = least is not None and least.a_m + least.b_m < planned.a_m + planned.b_m - 0.5
        spare = (
            f" The least in all that would do: {metres(least.a_m)} at A and {metres(least.b_m)} at B."
            if least and less
            else ""
        )
        return f"High enough as planned: {now} meet every criterion with {_percent(likely)} confidence ({asked} asked).{spare}"
    if not ways:
        return (
            f"Not high enough as planned ({now}), and no height within the limits gives {asked} confidence: look for another "
            "site or a relay."
        )
    if beyond:
        return (
            f"Not high enough as planned ({now}), and usual masts are not either. {asked} confidence would take "
            f"{', or '.join(ways)}: look for another site or a relay."
        )
    return f"Not high enough as planned ({now}; {_percent(likely)} confidence). With {asked} confidence: {', or '.join(ways)}."


def _ways(builds: dict[HeightKind, Pair | None]) -> list[str]:
    ways = []
    a, b, equal, least = (builds.get(kind) for kind in ("a alone", "b alone", "equal", "least total"))
    if a is not None:
        ways.append(f"{metres(a.a_m)} at A with B as planned")
    if b is not None:
        ways.append(f"{metres(b.b_m)} at B with A as planned")
    if equal is not None:
        ways.append(f"{metres(equal.a_m)} at both")
    if not ways and least is not None:
        ways.append(f"{metres(least.a_m)} at A and {metres(least.b_m)} at B")
    return ways


def checked(options: Sequence[HeightOption], confidence: float) -> str:
    """How the heights were checked."""
    if not any(option.build for option in options):
        return "No height within the limits works, so there was none to check."
    return (
        "Every pair to build was put through the clearance engine again and is clear there, with the rules that apply at those "
        f"heights; every criterion holds at once in at least {100.0 * confidence:g} % of the draws."
    )


def cautions(planned: Pair, options: Sequence[HeightOption], *, growth_years: float) -> tuple[str, ...]:
    """What a person must know before building to these heights."""
    builds = [option.build for option in options if option.build is not None]
    found = [RAISING, *safety_lines(("structure and wind", "aviation"))]
    if any(max(pair.a_m, pair.b_m) > USUAL_MAST_M for pair in builds):
        found.insert(
            0, f"More than {USUAL_MAST_M:g} m of mast is beyond what is usual: look for another site or a relay first."
        )
    if any(min(pair.a_m, pair.b_m) < LOW_M for pair in builds):
        found.append(f"Under {LOW_M:g} m, people, vehicles, grass and snow get in the way and no raster shows them.")
    if growth_years > 0.0:
        found.append(
            f"Trees were grown by {growth_years:g} years where their growth is stated; others keep their height."
        )
    else:
        found.append("Trees were not grown: leave room, or ask for heights some years ahead.")
    return tuple(found)


def _percent(likely: float) -> str:
    """Rounded down: what falls short of the confidence asked must not read as if it reached it."""
    if likely < 0.001:
        return "under 0.1 %"
    return "over 99.9 %" if likely > 0.999 else f"{math.floor(1000.0 * likely + 1e-6) / 10.0:g} %"
