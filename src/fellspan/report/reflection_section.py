"""The reflections of one link on its page: sentences, curves of level against height, and the figures. Computes nothing."""

from dataclasses import dataclass

from markupsafe import Markup

from fellspan.design.reflection_result import ReflectionResult, SpecularPoint
from fellspan.planning.plan import LinkPlan
from fellspan.report import wording
from fellspan.report.lobing_drawing import CURVE_CLASS, draw_lobing, k_words, lobing_words


@dataclass(frozen=True, slots=True, kw_only=True)
class LobingView:
    """The drawing of one end and the same in words."""

    markup: Markup
    caption: str
    close: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class ReflectionSection:
    """What the link page shows: `key` names the curves in the order of their dashes, `rows` hold a figure for each k."""

    sentences: tuple[str, ...]
    views: tuple[LobingView, ...]
    key: tuple[tuple[str, str], ...]
    heads: tuple[str, ...]
    rows: tuple[tuple[str, tuple[str, ...]], ...]
    notes: tuple[str, ...]
    sources: tuple[str, ...]


def reflection_section(link: LinkPlan) -> ReflectionSection | None:
    """The section of a link; None where reflections were not worked out."""
    found = link.reflections
    if found is None:
        return None
    firsts = _first_of_each_k(found)
    return ReflectionSection(
        sentences=found.sentences,
        views=tuple(_views(link, found)),
        key=_key(found),
        heads=tuple(_head(point) for point in firsts),
        rows=_rows(firsts, link.result.distance_m) if firsts else (),
        notes=found.notes if firsts else (),
        sources=found.sources,
    )


def _first_of_each_k(found: ReflectionResult) -> list[SpecularPoint]:
    firsts: dict[str, SpecularPoint] = {}
    for point in found.points:
        firsts.setdefault(point.name, point)
    return list(firsts.values())


def _views(link: LinkPlan, found: ReflectionResult) -> list[LobingView]:
    heights = {item.end: item for item in found.heights}
    return [
        LobingView(
            markup=Markup(
                draw_lobing(
                    lobing,
                    uid=f"lobing-{lobing.end}",
                    heights=heights.get(lobing.end),
                    name=link.result.a if lobing.end == "a" else link.result.b,
                )
            ),
            caption=f"Level against height at {lobing.end.upper()}. {lobing_words(lobing, heights.get(lobing.end))}",
        )
        for lobing in found.lobing
    ]


def _key(found: ReflectionResult) -> tuple[tuple[str, str], ...]:
    """Letters are left to the words: the first of each pair is what the curve is for."""
    if not found.lobing:
        return ()
    ordered = sorted(found.lobing[0].curves, key=lambda curve: CURVE_CLASS[curve.name])
    return tuple((k_words(curve), "") for curve in ordered)


def _head(point: SpecularPoint) -> str:
    return "k infinite" if point.k is None else f"{point.name} k, {wording.k_factor(point.k)}"


def _rows(points: list[SpecularPoint], length_m: float) -> tuple[tuple[str, tuple[str, ...]], ...]:
    def km(at_m: float) -> str:
        return wording.kilometres(at_m, length_m=length_m)

    def fade(point: SpecularPoint) -> str:
        if point.shaded_at_m is not None:
            return f"none: shaded at {km(point.shaded_at_m)} km"
        return "the rays can cancel" if point.fade_db is None else f"{wording.number(point.fade_db)} dB"

    return (
        ("Mirrored at", tuple(f"{km(one.at_m)} km from A, by {one.surface}" for one in points)),
        ("Stretch that reflects", tuple(f"{km(one.from_m)} to {km(one.to_m)} km" for one in points)),
        ("Grazing angle", tuple(f"{wording.number(one.grazing_mrad, 2)} mrad" for one in points)),
        (
            "Path difference",
            tuple(f"{wording.number(one.path_difference_wavelengths, 2)} wavelengths" for one in points),
        ),
        ("Distance to a null", tuple(f"{wording.number(one.from_null_wavelengths, 2)} wavelengths" for one in points)),
        (
            "Amplitude of the mirrored ray",
            tuple(f"{wording.number(one.amplitude, 2)} of the direct one" for one in points),
        ),
        ("of it material, curve of the Earth", tuple(_pair(one.coefficient, one.divergence) for one in points)),
        ("of it roughness, partial surface", tuple(_pair(one.roughness_factor, one.partial_factor) for one in points)),
        (
            "Held back by the antennas, A and B",
            tuple(
                f"{wording.number(one.discrimination_a_db)} and {wording.number(one.discrimination_b_db)} dB"
                for one in points
            ),
        ),
        ("Deepest fade", tuple(fade(one) for one in points)),
        (
            "Level as planned, over the direct ray alone",
            tuple(
                "–" if one.shaded_at_m is not None else f"{wording.number(one.level_db, sign=True)} dB"
                for one in points
            ),
        ),
    )


def _pair(first: float, second: float) -> str:
    return f"{wording.number(first, 2)}, {wording.number(second, 2)}"
