"""The terminal's answer to `fellspan around`, in 80 columns: the decision, shares by mast and by bearing, what to check."""

from fellspan.cli.layout import Ink, labelled, printable, table, wrapped
from fellspan.geodesy.coordinates import format_position
from fellspan.planning.around import Around, Farthest, Sector
from fellspan.quantities import format_distance, format_frequency, format_height
from fellspan.report.around_page import decision, rules_words, share_words

_FIRST, _FAR = 13, 21


def around_lines(around: Around, *, ink: Ink) -> list[str]:
    """The whole page."""
    site, field = around.site, around.field
    lines = [ink.emphasise(printable(site.name))]
    tone = "bad" if around.share <= 0.0 else "doubt" if around.basis == "bare ground only" else "good"
    lines += [ink.emphasise(line, tone) for line in wrapped(ascii_only(decision(around)))]
    lines += [""]
    lines += labelled("site", f"{format_position(site.position)}")
    lines += labelled(
        "antenna",
        f"{format_height(site.height_m, site.height_reference)}, {field.antenna_amsl_m:.1f} m above sea level, "
        f"{format_frequency(field.frequency_hz)}",
    )
    if around.height_from:
        lines += labelled("height from", printable(around.height_from))
    lines += labelled("asked", "; ".join(rules_words(around)))
    lines += labelled("basis", around.basis)
    lines += labelled("cells", f"{field.shape[0]} x {field.shape[1]} of {field.cell_m:.3g} m; {_known(around)}")
    if around.farthest is not None:
        lines += labelled(
            "farthest",
            f"{_far(around.farthest)}, {format_position(around.farthest.position)}, "
            f"{around.farthest.needed_m:.1f} m needed without the errors of the heights",
        )
    heads = ["mast of", *(f"{mast:g} m" for mast in around.masts_m)]
    widths = [_FIRST, *([6] * len(around.masts_m))]
    right = tuple(range(1, len(widths)))
    rows = [
        ["all is free", *(_share(value) for value in around.shares)],
        ["sight alone", *(_share(value) for value in around.sight_shares)],
    ]
    lines += [
        "",
        f"Reached, of the {_area(around)}",
        *(f"  {line}" for line in table(heads, rows, widths=widths, right=right)),
    ]
    heads = ["towards", *heads[1:], f"farthest, {around.other_m:g} m"]
    rows = [_sector(sector, len(around.masts_m)) for sector in around.sectors]
    lines += ["", *(f"  {line}" for line in table(heads, rows, widths=[*widths, _FAR], right=right))]
    lines += ["", "Before anything is promised"]
    for caution in around.cautions:
        lines += wrapped(caution, first="  ! ")
    return lines


def ascii_only(text: str) -> str:
    """Without the signs that a plain terminal may lack."""
    return text.replace("–", "-").replace("°", " deg")


def _area(around: Around) -> str:
    return "land with an answer" if around.sea_level_m is not None else "area with an answer"


def _known(around: Around) -> str:
    if around.known_share >= 0.99995:
        return "no gaps"
    return f"no answer for {max(0.1, 100.0 * (1.0 - around.known_share)):.1f} % (gaps, and what lies behind them)"


def _share(value: float) -> str:
    words = share_words(value)
    return {"none": "0 %", "under 1 %": "< 1 %"}.get(words, words)


def _far(found: Farthest) -> str:
    return f"{format_distance(found.distance_m)} at {found.bearing_deg % 360.0:05.1f} deg"


def _sector(sector: Sector, masts: int) -> list[str]:
    if sector.shares is None:
        return [sector.name, *["-"] * masts, "no answer"]
    far = "-" if sector.farthest is None else _far(sector.farthest)
    return [sector.name, *(_share(value) for value in sector.shares), far]
