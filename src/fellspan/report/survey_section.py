"""What to verify on the ground, as a table on the page of a link: the points of survey.csv under the same names.

Shows what design listed and computes nothing.
"""

from dataclasses import dataclass

from fellspan.design.survey_list import SurveyPoint, label_of
from fellspan.geodesy.coordinates import format_position
from fellspan.geodesy.position import Position
from fellspan.links import words
from fellspan.planning.plan import LinkPlan
from fellspan.report import wording


@dataclass(frozen=True, slots=True, kw_only=True)
class SurveyRow:
    """One point in words."""

    label: str
    from_a: str
    place: str
    stands_there: str
    verify: str
    top: str
    highest: str
    spare: str
    error: str
    measured: str


@dataclass(frozen=True, slots=True, kw_only=True)
class SurveySection:
    """The rows, and what must be known to use them."""

    rows: tuple[SurveyRow, ...]
    note: str


def survey_section(link: LinkPlan, *, number: int, growth_years: float) -> SurveySection | None:
    """The section of a link, `number` being its place in the study from 1; None where no list was made."""
    if not link.survey:
        return None
    length_m = link.profile.length_m
    note = (
        "Highest top: the highest that every criterion still accepts there, above sea level. Spare: how far the top in the "
        "data stays below it."
    )
    if growth_years > 0.0:
        note += f" Tops are those in {growth_years:g} years: what still grows must stay lower today by as much as it will grow."
    return SurveySection(rows=tuple(_row(point, number, length_m) for point in link.survey), note=note)


def _row(point: SurveyPoint, number: int, length_m: float) -> SurveyRow:
    highest = point.highest_top_m
    return SurveyRow(
        label=label_of(number, point.rank),
        from_a=wording.kilometres(point.from_a_m, length_m=length_m),
        place=format_position(Position(latitude_deg=point.latitude_deg, longitude_deg=point.longitude_deg)),
        stands_there=point.stands_there,
        verify=point.verify,
        top=wording.metres(point.top_m) if highest is not None else f"antenna {wording.metres(point.top_m)}",
        # Rounded down: a top that is read off and kept is then always low enough.
        highest="–" if highest is None else wording.metres(words.down_m(highest)),
        spare="–" if point.spare_m is None else wording.metres(words.down_m(point.spare_m), sign=True),
        error=wording.metres(point.sigma_m),
        measured=point.measured,
    )
