"""What stands on the invented islands besides trees, and the survey of one path; texts only, no file is written here.

Places are metres on the UTM grid of the sample (zone 23 N) and leave as longitude and latitude.
"""

import csv
import io
import json
import math

import numpy as np
import pyproj
import relief
from numpy.typing import NDArray

Grid = NDArray[np.float64]
Point = tuple[float, float]

CENTRE: Point = (485_300.0, 3_987_850.0)
"""Town hall square of Vessary, the town."""
TURN_DEG = 8.0
BEACON: Point = (482_610.0, 3_990_550.0)
WEST_POINT: Point = (476_900.0, 3_990_300.0)
SURVEYED_LINK = "Beacon - West Point"
SURVEYED_STRETCHES = (("beacon", 0.0, 240.0), ("wooded spur", 1_560.0, 2_160.0), ("west point", 5_560.0, 5_715.7))
"""Name, from and to in metres from the beacon: where an unlisted tree could reach the zone."""
_SURVEY_STEP_M = 12.0

_TO_DEGREES = pyproj.Transformer.from_crs("EPSG:32623", "EPSG:4326", always_xy=True)


def degrees(east_m: float, north_m: float) -> Point:
    """Longitude and latitude, rounded to a centimetre."""
    longitude, latitude = _TO_DEGREES.transform(east_m, north_m)
    return round(longitude, 7), round(latitude, 7)


def in_town(along_m: float, across_m: float) -> Point:
    """Easting and northing of a place given along the main street (east is positive) and across it (north is positive)."""
    turn = math.radians(TURN_DEG)
    return (
        CENTRE[0] + along_m * math.cos(turn) - across_m * math.sin(turn),
        CENTRE[1] + along_m * math.sin(turn) + across_m * math.cos(turn),
    )


def outline(along_m: float, across_m: float, length_m: float, width_m: float) -> list[Point]:
    """A rectangle of the town's street grid, as a closed ring in degrees."""
    corners = ((-1, -1), (1, -1), (1, 1), (-1, 1), (-1, -1))
    return [degrees(*in_town(along_m + 0.5 * x * length_m, across_m + 0.5 * y * width_m)) for x, y in corners]


LANDMARKS: tuple[tuple[str, float, float, float, float, float], ...] = (
    # name, along, across, length, width, height above ground; all m
    ("town hall", 0.0, 34.0, 30.0, 22.0, 18.0),
    ("church nave", -120.0, 32.0, 32.0, 14.0, 12.5),
    ("church tower", -140.0, 32.0, 8.0, 8.0, 25.0),
    ("school", -560.0, -150.0, 46.0, 16.0, 11.0),
    ("market hall", 70.0, -36.0, 44.0, 24.0, 10.0),
    ("east terrace", 262.0, 19.0, 26.0, 11.0, 9.0),
    ("west terrace", 22.0, -19.0, 24.0, 11.0, 8.5),
    ("harbour office", 690.0, 250.0, 24.0, 14.0, 14.0),
    ("warehouse 1", 650.0, 60.0, 62.0, 24.0, 11.0),
    ("warehouse 2", 650.0, 20.0, 62.0, 24.0, 11.0),
    ("warehouse 3", 655.0, -30.0, 56.0, 26.0, 12.0),
    ("cold store", 640.0, 120.0, 40.0, 30.0, 16.0),
    ("slipway shed", 640.0, -110.0, 50.0, 20.0, 9.0),
)


def buildings_geojson(seed: int) -> str:
    """Outlines of the houses along the streets and of the landmarks, with heights above ground."""
    rng = np.random.default_rng(seed + 2)
    features = [_building(name, outline(*place), height) for name, *place, height in LANDMARKS]
    number = 0
    for street in range(-4, 4):
        for side in (-1.0, 1.0):
            for along in np.arange(-430.0, 440.0, 30.0).tolist():
                across = street * 80.0 + side * 18.0
                length, width = rng.uniform(11.0, 20.0), rng.uniform(8.0, 11.0)
                height = round(rng.uniform(5.5, 9.5) * 2.0) / 2.0
                if rng.random() < 0.25 or any(_close(along, across, *place) for _, *place, _ in LANDMARKS):
                    continue
                number += 1
                features.append(_building(f"house {number}", outline(along, across, length, width), height))
    lines = ",\n".join(json.dumps(feature, separators=(",", ":")) for feature in features)
    return f'{{"type":"FeatureCollection","features":[\n{lines}\n]}}\n'


def _close(along: float, across: float, at_along: float, at_across: float, length: float, width: float) -> bool:
    return abs(along - at_along) < 0.5 * length + 14.0 and abs(across - at_across) < 0.5 * width + 9.0


def _building(name: str, ring: list[Point], height_m: float) -> dict[str, object]:
    return {
        "type": "Feature",
        "properties": {"name": name, "kind": "building", "height_m": height_m},
        "geometry": {"type": "Polygon", "coordinates": [ring]},
    }


def _line(points: list[Point]) -> str:
    return "LINESTRING (" + ", ".join("{:.7f} {:.7f}".format(*degrees(*point)) for point in points) + ")"


def obstacles_csv() -> str:
    """Trees, crane, ships, road and power line: what no raster holds."""
    columns = [
        "name",
        "kind",
        "wkt",
        "envelope",
        "height_m",
        "top_amsl_m",
        "heights_m",
        "sag_m",
        "radius_m",
        "width_m",
        "growth_m_per_year",
        "error_m",
        "source",
    ]
    lime_tree = in_town(-306.0, -64.0)
    street = [in_town(along, 0.0) for along in (-560.0, -300.0, 0.0, 300.0, 620.0)]
    quay_road = [in_town(622.0, across) for across in (-140.0, 0.0, 140.0, 270.0)]
    poles = [(484_620.0, 3_988_330.0), (484_300.0, 3_988_640.0), (483_960.0, 3_988_930.0), (483_700.0, 3_989_230.0)]
    fairway = [(489_600.0, 3_988_250.0), (487_600.0, 3_988_600.0), (486_950.0, 3_988_950.0), (486_500.0, 3_989_250.0)]
    rows: list[dict[str, object]] = [
        {
            "name": "lime tree on School Walk",
            "kind": "tree",
            "wkt": "POINT ({:.7f} {:.7f})".format(*degrees(*lime_tree)),
            "height_m": 14.5,
            "radius_m": 5,
            "growth_m_per_year": 0.3,
            "error_m": 0.5,
            "source": "sighted from the town hall roof",
        },
        {
            "name": "quay crane",
            "kind": "other",
            "wkt": "POINT ({:.7f} {:.7f})".format(*degrees(*in_town(700.0, 90.0))),
            "envelope": "quay crane, jib up",
            "height_m": 42,
            "radius_m": 28,
            "error_m": 0.5,
            "source": "harbour office",
        },
        {
            "name": "ships in the fairway",
            "kind": "other",
            "wkt": _line(fairway),
            "envelope": "air draught of the largest ship",
            "top_amsl_m": 30,
            "width_m": 120,
            "error_m": 0.5,
            "source": "harbour office",
        },
        {
            "name": "Main Street traffic",
            "kind": "other",
            "wkt": _line(street),
            "envelope": "road traffic",
            "height_m": 5,
            "width_m": 9,
            "error_m": 0.2,
            "source": "road gauge",
        },
        {
            "name": "Quay Road traffic",
            "kind": "other",
            "wkt": _line(quay_road),
            "envelope": "road traffic",
            "height_m": 5,
            "width_m": 9,
            "error_m": 0.2,
            "source": "road gauge",
        },
        {
            "name": "20 kV power line",
            "kind": "other",
            "wkt": _line(poles),
            "heights_m": "16;18;18;16",
            "sag_m": 3,
            "width_m": 4,
            "error_m": 0.5,
            "source": "utility drawing",
        },
    ]
    return _table(columns, rows)


def survey_csv(ground_m: Grid, trees_m: Grid, seed: int) -> str:
    """A crew's levels along the critical stretches of one path: ground and tops, from distances along it.

    They differ from the rasters as measurements do: by decimetres on the ground, and trees stand lower than the canopy
    raster has them.
    """
    rng = np.random.default_rng(seed + 3)
    columns = [
        "profile",
        "link",
        "distance_m",
        "ground_m",
        "top_m",
        "kind",
        "error_m",
        "growth_m_per_year",
        "source",
        "note",
    ]
    length = math.dist(BEACON, WEST_POINT)
    rows: list[dict[str, object]] = []
    for name, start, stop in SURVEYED_STRETCHES:
        count = math.ceil((stop - start) / _SURVEY_STEP_M)
        for distance in np.linspace(start, stop, count + 1).tolist():
            share = min(distance / length, 1.0)
            east = BEACON[0] + share * (WEST_POINT[0] - BEACON[0])
            north = BEACON[1] + share * (WEST_POINT[1] - BEACON[1])
            ground = _bilinear(ground_m, east, north) + rng.normal(0.0, 0.15)
            row, column = (
                int((relief.NORTH_M - north) / relief.COVER_CELL_M),
                int((east - relief.EAST_M) / relief.COVER_CELL_M),
            )
            tree = float(trees_m[row, column])
            tree = max(0.0, tree - 1.5 + rng.normal(0.0, 0.3)) if tree > 0.0 else 0.0
            rows.append(
                {
                    "profile": name,
                    "link": SURVEYED_LINK,
                    "distance_m": f"{distance:.1f}",
                    "ground_m": f"{ground:.2f}",
                    "top_m": f"{ground + tree:.2f}",
                    "kind": "tree" if tree > 0.0 else "",
                    "error_m": "0.1" if tree == 0.0 else "0.3",
                    "growth_m_per_year": "" if tree == 0.0 else "0.2",
                    "source": "levelled and taped",
                    "note": "",
                }
            )
    return _table(columns, rows)


def _bilinear(grid: Grid, east: float, north: float) -> float:
    row, column = (
        (relief.NORTH_M - north) / relief.GROUND_CELL_M - 0.5,
        (east - relief.EAST_M) / relief.GROUND_CELL_M - 0.5,
    )
    top, left = math.floor(row), math.floor(column)
    down, right = row - top, column - left
    upper = grid[top, left] * (1.0 - right) + grid[top, left + 1] * right
    lower = grid[top + 1, left] * (1.0 - right) + grid[top + 1, left + 1] * right
    return float(upper * (1.0 - down) + lower * down)


def _table(columns: list[str], rows: list[dict[str, object]]) -> str:
    buffer = io.StringIO()
    writer = csv.DictWriter(buffer, columns, restval="", lineterminator="\n")
    writer.writeheader()
    writer.writerows(rows)
    return buffer.getvalue()
