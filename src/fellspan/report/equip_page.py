"""What pages show of a comparison of equipment, as a page of its own or a section of a link's: decision, reach, ranking."""

from collections.abc import Container
from dataclasses import dataclass
from pathlib import Path
from typing import Final

from markupsafe import Markup

from fellspan import __version__
from fellspan.design.equip_result import EquipResult, EquipRow
from fellspan.design.equip_words import capital, down_db, pair_words, up_db
from fellspan.errors import OutputError
from fellspan.report import assets, wording
from fellspan.report.reach_drawing import NARROW_WIDTH, draw_reach, reach_words, shown_rows

HEADS: Final = (
    "Antenna",
    "Level",
    "Margin",
    "Spare",
    "Available",
    "Beam",
    "Off aim",
    "Mass",
    "Front",
    "Wind",
    "Moment",
    "Far field",
    "Reach",
)
OF_WIND: Final = ("Wind", "Moment")


@dataclass(frozen=True, slots=True, kw_only=True)
class EquipView:
    """What templates show; `rows` hold the row, its name and what stands beside it, in the order of `heads`.

    Columns of wind are left out where no wind was asked for.
    """

    result: EquipResult
    decision: str
    markup: Markup
    narrow: Markup
    caption: str
    heads: tuple[str, ...]
    rows: tuple[tuple[EquipRow, str, tuple[str, ...]], ...]
    cautions: tuple[str, ...]


def equip_view(result: EquipResult, *, told: Container[str] = ()) -> EquipView:
    """The comparison for a template; cautions that are `told` elsewhere on the page are left out."""
    blown = any(row.wind is not None for row in result.rows)
    kept = [index for index, head in enumerate(HEADS) if blown or head not in OF_WIND]
    return EquipView(
        result=result,
        decision=capital(result.decision),
        markup=Markup(draw_reach(result, uid="reach")),
        narrow=Markup(draw_reach(result, uid="reach-n", width=NARROW_WIDTH)),
        caption="; ".join(reach_words(row, result.rows) for row in shown_rows(result)) + ".",
        heads=tuple(HEADS[index] for index in kept),
        rows=tuple(
            (row, pair_words(row, result.rows), tuple(cells(row)[index - 1] for index in kept[1:]))
            for row in result.rows
        ),
        cautions=tuple(line for line in result.cautions if line not in told),
    )


def render_equip_page(result: EquipResult) -> str:
    """The HTML text of the page; opened with no network it makes no request."""
    made = assets.environment()
    made.filters.update(frequency=wording.frequency, distance=wording.distance)
    return made.get_template("equip.html.j2").render(
        result=result,
        view=equip_view(result),
        version=__version__,
        css={name: assets.asset(f"{name}.css") for name in ("drawing", "page", "polar", "antenna", "equip")},
    )


def cells(row: EquipRow) -> tuple[str, ...]:
    """What stands beside the name in the table, in the order of `HEADS`; a dash for what is not known."""
    wind, reach = row.wind, row.reach
    mark = "" if wind is None or wind.confirmed else "~"
    widths = [f"{one:.1f}°" for one in (row.azimuth_width_deg, row.elevation_width_deg) if one is not None]
    return (
        wording.decibels(_least(row.received_dbm.at_a, row.received_dbm.at_b), "dBm"),
        wording.decibels(_least(row.margin_db.at_a, row.margin_db.at_b)),
        _spare(row.spare_db),
        _available(row.availability_percent.year),
        " × ".join(widths) or "–",
        _decibels(row.off_aim_db),
        "–" if row.mass_kg is None else f"{row.mass_kg:g} kg",
        "–" if row.frontal_area_m2 is None else f"{row.frontal_area_m2:.2g} m²",
        "–" if wind is None else f"{wind.force_n:.0f}{mark} N",
        "–" if wind is None else f"{wind.moment_nm:.0f}{mark} N m",
        "–" if row.far_field_m is None else f"{row.far_field_m:.1f} m",
        "–" if reach is None or reach.distance_m is None else f"{int(reach.distance_m / 100.0) / 10.0:.1f} km",
    )


def write_equip_page(result: EquipResult, out: Path) -> Path:
    """Write the page whole or not at all, as `out` or as equip.html in the folder `out`; where it stands."""
    page = out if out.suffix.lower() in (".html", ".htm") else out / "equip.html"
    part = page.with_name(f".{page.name}.part")
    try:
        page.parent.mkdir(parents=True, exist_ok=True)
        part.write_text(render_equip_page(result), encoding="utf-8", errors="backslashreplace", newline="\n")
        part.replace(page)
    except OSError as error:
        raise OutputError(f"cannot write {page}: {error.strerror or error}") from None
    return page


def _least(one: float | None, other: float | None) -> float | None:
    return None if one is None or other is None else min(one, other)


def _decibels(value: float | None, unit: str = "dB") -> str:
    return "–" if value is None else f"{wording.number(value)} {unit}"


def _spare(value: float | None) -> str:
    """Never too much to spare, never too little missing."""
    if value is None:
        return "–"
    return f"{down_db(value)} dB" if value >= 0.0 else f"−{up_db(-value)} dB"


def _available(value: float | None) -> str:
    """Rounded down; never 100."""
    if value is None:
        return "–"
    return (
        f"{int(min(value, 99.9999) * 1e4 + 1e-6) / 1e4:.4f} %"
        if value >= 99.0
        else f"{int(value * 100.0) / 100.0:.2f} %"
    )
