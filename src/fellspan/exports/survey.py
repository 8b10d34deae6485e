"""survey.csv and survey.gpx: what to verify on the ground before anyone builds, as design listed it; computes nothing."""

import xml.etree.ElementTree as ET
from dataclasses import replace

from fellspan.design.survey_list import SurveyPoint, label_of, survey_list
from fellspan.exports.text import Cell, csv_text, rounded, xml_text
from fellspan.links import words
from fellspan.planning.plan import StudyPlan

GPX_NAMESPACE = "http://www.topografix.com/GPX/1/1"

COLUMNS = (
    "point",
    "link",
    "rank",
    "verify",
    "km_from_a",
    "latitude_deg",
    "longitude_deg",
    "stands_there",
    "ground_amsl_m",
    "top_amsl_m",
    "highest_top_amsl_m",
    "spare_m",
    "sigma_m",
    "measured",
)


def survey_points(plan: StudyPlan) -> tuple[SurveyPoint, ...]:
    """The points of all links, in the order of the plan, labelled by link and rank."""
    return tuple(
        replace(point, label=label_of(number, point.rank))
        for number, linked in enumerate(plan.links, start=1)
        for point in linked.survey or survey_list(linked.result, linked.profile, linked.levels)
    )


def survey_csv(points: tuple[SurveyPoint, ...]) -> str:
    """The points as a table."""
    rows: list[list[Cell]] = [
        [
            point.label,
            point.link,
            point.rank,
            point.verify,
            rounded(point.from_a_m / 1000.0, 4),
            rounded(point.latitude_deg, 7),
            rounded(point.longitude_deg, 7),
            point.stands_there,
            rounded(point.ground_m, 2),
            rounded(point.top_m, 2),
            rounded(point.highest_top_m, 2),
            rounded(point.spare_m, 2),
            rounded(point.sigma_m, 2),
            point.measured,
        ]
        for point in points
    ]
    return csv_text(COLUMNS, rows)


def survey_gpx(points: tuple[SurveyPoint, ...], *, title: str, growth_years: float = 0.0) -> str:
    """The points as waypoints (GPX 1.1); `ele` is the ground above sea level. `growth_years` is what trees were grown by."""
    root = ET.Element("gpx", xmlns=GPX_NAMESPACE, version="1.1", creator="Fellspan")
    metadata = ET.SubElement(root, "metadata")
    ET.SubElement(metadata, "name").text = xml_text(title)
    for point in points:
        waypoint = ET.SubElement(root, "wpt", lat=f"{point.latitude_deg:.7f}", lon=f"{point.longitude_deg:.7f}")
        ground = rounded(point.ground_m, 2)
        if ground is not None:
            ET.SubElement(waypoint, "ele").text = f"{ground:.2f}"
        ET.SubElement(waypoint, "name").text = point.label
        ET.SubElement(waypoint, "desc").text = xml_text(_words(point, growth_years))
    ET.indent(root, " ")
    return '<?xml version="1.0" encoding="UTF-8"?>\n' + ET.tostring(root, encoding="unicode") + "\n"


def _words(point: SurveyPoint, growth_years: float) -> str:
    head = f"{point.link}, {point.from_a_m / 1000.0:.3f} km from A: {point.stands_there}. Verify: {point.verify}."
    if point.highest_top_m is None or point.spare_m is None:
        return head
    known = f"now taken as {point.top_m:.1f} m, standard error {point.sigma_m:.1f} m, measured: {point.measured}"
    grown = f", in {growth_years:g} years as now" if growth_years > 0.0 else ""
    return f"{head} Nothing may stand above {words.down_m(point.highest_top_m):.1f} m above sea level here{grown} ({known})."
