"""The antennas of one link on its page: both ends in both planes as mounted, where patterns are known. Computes nothing."""

from dataclasses import dataclass

from fellspan.antennas.mounting import turn_for
from fellspan.antennas.pattern import Pattern, Plane
from fellspan.links.result import AntennaResult
from fellspan.planning.plan import LinkPlan
from fellspan.report.plane_views import PlaneView, plane_views
from fellspan.report.polar_drawing import Curve, curve_of

OFF_FROM_DEG = 0.5
"""From here on the direction of the other end is marked beside the boresight."""


@dataclass(frozen=True, slots=True, kw_only=True)
class AntennaSection:
    """What the link page shows: `ends` holds letter and name of each curve, `planes` azimuth and elevation."""

    ends: tuple[tuple[str, str], ...]
    planes: tuple[PlaneView, ...]
    sources: tuple[str, ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class _End:
    letters: str
    name: str
    pattern: Pattern
    result: AntennaResult
    turned: bool


def antenna_section(link: LinkPlan) -> AntennaSection | None:
    """The section of a link; None where neither end has a pattern. Ends with the same antenna share a curve."""
    ends = _ends(link)
    if not ends:
        return None
    drawn: dict[Plane, list[Curve]] = {
        plane: [_curve(end, plane) for end in ends] for plane in ("horizontal", "vertical")
    }
    return AntennaSection(
        ends=tuple((end.letters, end.name) for end in ends),
        planes=plane_views(drawn, uid="antennas"),
        sources=tuple(dict.fromkeys(f"{end.name}: {end.pattern.source}" for end in ends)),
    )


def _ends(link: LinkPlan) -> list[_End]:
    found: list[_End] = []
    results = link.result.antennas
    if results is None:
        return found
    for letter, antenna, result in (("A", link.link.antenna_a, results.a), ("B", link.link.antenna_b, results.b)):
        pattern = antenna.pattern
        if pattern is None:
            continue
        turned = abs(turn_for(pattern, result.polarization)) == 90.0
        end = _End(letters=letter, name=antenna.name, pattern=pattern, result=result, turned=turned)
        first = found[0] if found else None
        # Two curves in one place would only hide each other.
        if first is not None and first.pattern is pattern and first.turned == turned and not (_off(first) or _off(end)):
            found[0] = _End(letters="A and B", name=first.name, pattern=pattern, result=first.result, turned=turned)
        else:
            found.append(end)
    return found


def _off(end: _End) -> bool:
    return max(abs(end.result.azimuth_off_deg), abs(end.result.elevation_off_deg)) >= OFF_FROM_DEG


def _curve(end: _End, plane: Plane) -> Curve:
    plain = curve_of(end.pattern, plane, turned=end.turned)
    off = end.result.azimuth_off_deg if plane == "horizontal" else end.result.elevation_off_deg
    return curve_of(
        end.pattern,
        plane,
        name=f"{end.letters}, {end.name}",
        turned=end.turned,
        other_end_deg=off + plain.facts.peak_deg if abs(off) >= OFF_FROM_DEG else None,
    )
