"""Both planes of one or several antennas, each with its polar diagram and, where a beam is a needle, the same unrolled."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

from markupsafe import Markup

from fellspan.antennas.pattern import Plane
from fellspan.report.beam_drawing import draw_beam, is_narrow
from fellspan.report.polar_drawing import PLANE_WORD, Curve, curve_words, draw_polar

PLANES: tuple[Plane, Plane] = ("horizontal", "vertical")


@dataclass(frozen=True, slots=True, kw_only=True)
class PlaneView:
    """One plane: `word` is 'azimuth' or 'elevation', `close` is empty where no beam is narrow; the caption says it in words."""

    word: str
    markup: Markup
    close: Markup
    caption: str


def plane_views(
    drawn: Mapping[Plane, Sequence[Curve]], *, uid: str, fields: Mapping[str, str] | None = None
) -> tuple[PlaneView, ...]:
    """Views of the planes in `drawn`; `uid` is unique within the page, `fields` puts words behind the name of a plane."""
    needles = any(is_narrow(curve) for curves in drawn.values() for curve in curves)
    views = []
    for plane, curves in drawn.items():
        word = PLANE_WORD[plane]
        words = " ".join(curve_words(curve) for curve in curves)
        views.append(
            PlaneView(
                word=word,
                markup=Markup(draw_polar(curves, uid=f"{uid}-{word}")),
                close=Markup(draw_beam(curves, uid=f"{uid}-{word}-close") if needles else ""),
                caption=f"{word.capitalize()} plane{(fields or {}).get(word, '')}. {words}",
            )
        )
    return tuple(views)
