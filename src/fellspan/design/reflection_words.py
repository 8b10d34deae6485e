"""The reflections of a link in plain sentences, the decisive one first. Works nothing out."""

from typing import Final

from fellspan.design.reflection_result import NullFreeHeights, ReflectionResult, SpecularPoint
from fellspan.links.result import LinkResult

_K_WORDS: Final = {"worst month": "at the worst-month k", "median": "at the median k", "infinite": "at k infinite"}
_SURFACE: Final = {"water": "The water", "flat ground": "Flat ground"}
_OF: Final = {"water": "the water", "flat ground": "flat ground"}
MOST_SEPARATION: Final = 0.1
"""Frequencies further apart than this share of the carrier are no remedy (our own figure)."""


def reflection_sentences(found: ReflectionResult, result: LinkResult) -> tuple[str, ...]:
    """Where, how much, which heights avoid it, and what else helps; one sentence where nothing reflects."""
    arriving = [point for point in found.points if point.shaded_at_m is None]
    if not arriving:
        return tuple(_shaded(found.points)) or (_NOTHING,)
    said = [_where(arriving)]
    if not found.matters:
        deepest = max(point.fade_db or 0.0 for point in arriving)
        return (*said, f"It fades the link by {deepest:.1f} dB at most.", *_shaded(found.points))
    said += [_how_much(arriving), *_heights(found, result), *_spacing(found, result), *_shaded(found.points)]
    return tuple(said)


_NOTHING: Final = (
    "No stretch of this path mirrors the ray: there is no open water on it, and no flat ground where it would."
)


def _km(at_m: float) -> str:
    return f"{at_m / 1000.0:.2f}" if at_m < 10_000.0 else f"{at_m / 1000.0:.1f}"


def _main(points: list[SpecularPoint]) -> SpecularPoint:
    return next((point for point in points if point.name == "median"), points[0])


def _where(points: list[SpecularPoint]) -> str:
    main = _main(points)
    stretch = f"between {_km(main.from_m)} and {_km(main.to_m)} km from A"
    return f"{_SURFACE[main.surface]} {stretch} mirrors the ray, {_K_WORDS[main.name]} at {_km(main.at_m)} km."


def _how_much(points: list[SpecularPoint]) -> str:
    main = _main(points)
    side = "above" if main.level_db >= 0.0 else "below"
    words = (
        f"{_K_WORDS[main.name].capitalize()} the mirrored ray arrives {main.from_null_wavelengths:.1f} wavelengths from a "
        f"null, which puts the level {abs(main.level_db):.1f} dB {side} that of the direct ray"
    )
    depths = {point.name: point.fade_db for point in reversed(points) if point.fade_db is not None}
    if not depths:
        return f"{words}; the two can cancel."
    name = max(depths, key=lambda key: depths[key])
    return f"{words}; fades reach {depths[name]:.0f} dB {_K_WORDS[name]}."


def _range_words(found: ReflectionResult) -> str:
    words = "over the range of k"
    if found.water_low_m is not None and found.water_high_m is not None:
        words += " and from low to high water"
    return words


def _heights(found: ReflectionResult, result: LinkResult) -> list[str]:
    range_words = _range_words(found)
    if any(item.change_m == 0.0 for item in found.heights):
        return [f"The heights planned keep the fade within 3 dB {range_words}."]
    able = sorted(
        (item for item in found.heights if item.change_m is not None), key=lambda item: abs(item.change_m or 0)
    )
    if able:
        return [f"{_change(able[0], result)} keeps the fade within 3 dB {range_words}."]
    words = f"No height of one antenna alone, of those that the criteria allow, keeps clear of nulls {range_words}"
    if found.span_wavelengths is not None and found.span_wavelengths >= 1.0:
        words += f", which moves the path difference by {found.span_wavelengths:.1f} wavelengths"
    return [f"{words}."]


def _change(item: NullFreeHeights, result: LinkResult) -> str:
    change = item.change_m or 0.0
    site = result.a if item.end == "a" else result.b
    return f"{abs(change):.1f} m {'higher' if change > 0.0 else 'lower'} at {item.end.upper()} ('{site}')"


def _spacing(found: ReflectionResult, result: LinkResult) -> list[str]:
    if found.spacing is None or any(item.change_m == 0.0 for item in found.heights):
        return []
    spacing = found.spacing
    at_a, at_b = 0.5 * spacing.pitch_a_m, 0.5 * spacing.pitch_b_m
    words = f"Two antennas {at_a:.1f} m apart at A, or {at_b:.1f} m at B, do not fade together"
    if spacing.frequency_hz < MOST_SEPARATION * result.frequency_hz:
        words += f", nor do two frequencies {spacing.frequency_hz / 1e6:.0f} MHz apart"
    return [f"{words}."]


def _shaded(points: tuple[SpecularPoint, ...]) -> list[str]:
    """Where terrain keeps every mirrored ray of a k away."""
    shades: dict[str, SpecularPoint] = {}
    for name in _K_WORDS:
        here = [point for point in points if point.name == name]
        if here and all(point.shaded_at_m is not None for point in here):
            shades[name] = here[0]
    if not shades:
        return []
    first = next(iter(shades.values()))
    when = " and ".join(_K_WORDS[name] for name in shades) if len(shades) < len(_K_WORDS) else "whatever k is,"
    by_what = f"what stands at {_km(first.shaded_at_m or 0.0)} km from A"
    return [
        f"{when[0].upper()}{when[1:]} {by_what} shades the reflection from {_OF[first.surface]} at {_km(first.at_m)} km."
    ]
