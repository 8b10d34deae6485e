"""survey.csv and survey.gpx: what to verify on the ground before anyone builds; reads levels and computes no clearance.

For each link: where each criterion is nearest to failing, the worst point of each obstruction, and the two sites. At each
stands the highest top that is still acceptable, so that a person with a staff or a tape can decide on the spot.
"""

import xml.etree.ElementTree as ET
from dataclasses import dataclass, replace

from fellspan.exports.places import nearest, position_at
from fellspan.exports.tables import MEASURED_WORDS
from fellspan.exports.text import Cell, csv_text, rounded, xml_text
from fellspan.links import words
from fellspan.planning.plan import LinkPlan, StudyPlan

GPX_NAMESPACE = "http://www.topografix.com/GPX/1/1"
SAME_PLACE_M = 5.0
"""Points nearer to each other than this are one walk."""

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


@dataclass(frozen=True, slots=True, kw_only=True)
class SurveyPoint:
    """One point to verify; levels in m above sea level.

    `highest_top_m` is the highest top that every criterion still accepts there, `spare_m` how far the top known now stays
    under it (negative where it is too high already); both None at the sites. `rank` counts from 1 within the link, the
    least spare height first, the sites last.
    """

    label: str
    link: str
    rank: int
    verify: str
    from_a_m: float
    latitude_deg: float
    longitude_deg: float
    stands_there: str
    ground_m: float
    top_m: float
    highest_top_m: float | None
    spare_m: float | None
    sigma_m: float
    measured: str


def survey_points(plan: StudyPlan) -> tuple[SurveyPoint, ...]:
    """The points of all links, in the order of the plan; points closer than `SAME_PLACE_M` are joined."""
    points: list[SurveyPoint] = []
    for number, linked in enumerate(plan.links, start=1):
        found = sorted(_along(linked), key=lambda point: (point.spare_m or 0.0, point.from_a_m))
        joined: list[SurveyPoint] = []
        for point in found:
            twin = next(
                (i for i, kept in enumerate(joined) if abs(kept.from_a_m - point.from_a_m) < SAME_PLACE_M), None
            )
            if twin is None:
                joined.append(point)
            elif point.verify not in joined[twin].verify:
                joined[twin] = replace(joined[twin], verify=f"{joined[twin].verify}; {point.verify}")
        for rank, point in enumerate((*joined, *_sites(linked)), start=1):
            points.append(replace(point, rank=rank, label=f"L{number:02d}-{rank:02d}"))
    return tuple(points)


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


def survey_gpx(points: tuple[SurveyPoint, ...], *, title: str) -> str:
    """The points as waypoints (GPX 1.1); `ele` is the ground above sea level."""
    root = ET.Element("gpx", xmlns=GPX_NAMESPACE, version="1.1", creator="Fellspan")
    metadata = ET.SubElement(root, "metadata")
    ET.SubElement(metadata, "name").text = xml_text(title)
    for point in points:
        waypoint = ET.SubElement(root, "wpt", lat=f"{point.latitude_deg:.7f}", lon=f"{point.longitude_deg:.7f}")
        ground = rounded(point.ground_m, 2)
        if ground is not None:
            ET.SubElement(waypoint, "ele").text = f"{ground:.2f}"
        ET.SubElement(waypoint, "name").text = point.label
        ET.SubElement(waypoint, "desc").text = xml_text(_words(point))
    ET.indent(root, " ")
    return '<?xml version="1.0" encoding="UTF-8"?>\n' + ET.tostring(root, encoding="unicode") + "\n"


def _words(point: SurveyPoint) -> str:
    head = f"{point.link}, {point.from_a_m / 1000.0:.3f} km from A: {point.stands_there}. Verify: {point.verify}."
    if point.highest_top_m is None or point.spare_m is None:
        return head
    known = f"now taken as {point.top_m:.1f} m, standard error {point.sigma_m:.1f} m, measured: {point.measured}"
    return f"{head} Nothing may stand above {words.down_m(point.highest_top_m):.1f} m above sea level here ({known})."


def _along(linked: LinkPlan) -> list[SurveyPoint]:
    wanted: list[tuple[float, str, str]] = []
    for criterion in linked.result.clearance:
        wanted.append((criterion.worst_at_m, f"governing point, {criterion.criterion}", criterion.cause))
        wanted += [
            (obstruction.worst_at_m, f"obstruction, {criterion.criterion}", obstruction.cause)
            for obstruction in criterion.obstructions
        ]
    return [_point(linked, at_m, verify, cause) for at_m, verify, cause in wanted]


def _sites(linked: LinkPlan) -> list[SurveyPoint]:
    ends = linked.result.ends
    wanted = ((0.0, ends.a, "A"), (linked.profile.length_m, ends.b, "B"))
    return [
        replace(
            _point(linked, at_m, f"position, ground and antenna height of end {letter}", f"site {end.site}"),
            latitude_deg=end.latitude_deg,
            longitude_deg=end.longitude_deg,
            ground_m=end.ground_m,
            top_m=end.antenna_amsl_m,
            highest_top_m=None,
            spare_m=None,
        )
        for at_m, end, letter in wanted
    ]


def _point(linked: LinkPlan, at_m: float, verify: str, stands_there: str) -> SurveyPoint:
    profile, levels = linked.profile, linked.levels
    index = nearest(levels.distance_m, at_m)
    longitude, latitude = position_at(profile, float(levels.distance_m[index]))
    top = float(levels.surface_m[index])
    spare = float((levels.available_m[index] - levels.need_m[:, index]).min())
    return SurveyPoint(
        label="",
        link=linked.result.name,
        rank=0,
        verify=verify,
        from_a_m=float(levels.distance_m[index]),
        latitude_deg=latitude,
        longitude_deg=longitude,
        stands_there=stands_there,
        ground_m=float(profile.ground_m[index]),
        top_m=top,
        highest_top_m=top + spare,
        spare_m=spare,
        sigma_m=float(profile.sigma_m[index]),
        measured=MEASURED_WORDS[int(profile.measured[index])],
    )
