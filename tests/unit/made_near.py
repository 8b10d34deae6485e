"""A made town: outlines, masts, lines and surveyed points over the small rasters of the screening tests, all from a seed."""

from pathlib import Path

import numpy as np
from made_terrain import lonlat

COLUMNS = "name,kind,wkt,envelope,height_m,top_amsl_m,heights_m,sag_m,radius_m,width_m,growth_m_per_year,error_m"


def town_file(folder: Path, *, seed: int, houses: int = 250, extent_m: tuple[float, float] = (6000.0, 3000.0)) -> Path:
    """Outlines of every size and turn, some of them large or hollow, some trees, masts, and lines of every kind."""
    random = np.random.default_rng(seed)
    rows = [COLUMNS]
    for number in range(houses):
        east, south = random.uniform(0.0, extent_m[0]), random.uniform(0.0, extent_m[1])
        sides, turn = random.uniform(8.0, 60.0, 2), random.uniform(0.0, np.pi)
        kind = ("building", "building", "building", "tree", "other")[number % 5]
        height = random.uniform(3.0, 25.0)
        ring = outline(east, south, sides, turn)
        rows.append(f'house {number},{kind},"POLYGON (({ring}))",,{height},,,,,,{0.3 if kind == "tree" else ""},')
    for number in range(40):
        longitude, latitude = lonlat(random.uniform(0.0, extent_m[0]), random.uniform(0.0, extent_m[1]))
        kind = ("other", "building", "tree")[number % 3]
        rows.append(
            f"mast {number},{kind},POINT ({longitude} {latitude}),,{random.uniform(5, 60)},,,,{random.uniform(1, 30)},,,0.7"
        )
    ends = [lonlat(*place) for place in ((500.0, -200.0), (1800.0, 1100.0), (3300.0, 1500.0), (5200.0, 3200.0))]
    line = ", ".join(f"{longitude} {latitude}" for longitude, latitude in ends)
    rows.append(f'power line,other,"LINESTRING ({line})",,,,30;22;41;28,6,,3,,0.5')
    ends = [lonlat(*place) for place in ((0.0, 2200.0), (3000.0, 900.0), (6000.0, 2000.0))]
    line = ", ".join(f"{longitude} {latitude}" for longitude, latitude in ends)
    rows.append(f'traffic,other,"LINESTRING ({line})",lorries,4.5,,,,,9,,')
    rows.append(f'ships,other,"LINESTRING ({line})","ships, a channel",,128,,,,25,,')
    wood = [
        (3000.0 + 700.0 * np.cos(angle) * random.uniform(0.5, 1.0), 1500.0 + 700.0 * np.sin(angle))
        for angle in np.linspace(0.0, 2.0 * np.pi, 90, endpoint=False)
    ]
    ring = ", ".join("{} {}".format(*lonlat(*place)) for place in [*wood, wood[0]])
    rows.append(f'the wood,tree,"POLYGON (({ring}))",,11,,,,,,0.2,2')
    yard = f"({outline(1500.0, 1500.0, (300.0, 300.0), 0.4)}), ({outline(1500.0, 1500.0, (200.0, 200.0), 0.4)})"
    rows.append(f'the yard,building,"POLYGON ({yard})",,14,,,,,,,')
    file = folder / "town.csv"
    file.write_text("\n".join(rows) + "\n")
    return file


def outline(east_m: float, south_m: float, sides_m: tuple[float, float], turn: float) -> str:
    """A rectangle round a place, as the text of a ring in longitude and latitude."""
    corners = []
    for along, across in ((-1, -1), (1, -1), (1, 1), (-1, 1), (-1, -1)):
        a, b = 0.5 * along * sides_m[0], 0.5 * across * sides_m[1]
        longitude, latitude = lonlat(
            east_m + a * np.cos(turn) - b * np.sin(turn), south_m + a * np.sin(turn) + b * np.cos(turn)
        )
        corners.append(f"{longitude} {latitude}")
    return ", ".join(corners)


def survey_file(folder: Path, *, seed: int, points: int = 80, links: tuple[str, ...] = ()) -> Path:
    """Points of every kind of measurement, some far reaching; a profile across the rasters; and one by a link's name."""
    random = np.random.default_rng(seed)
    rows = [
        "latitude_deg,longitude_deg,link,distance_m,ground_m,top_m,top_above_ground_m,kind,profile,radius_m,error_m"
    ]
    for number in range(points):
        longitude, latitude = lonlat(random.uniform(0.0, 6000.0), random.uniform(0.0, 3000.0))
        ground, above = random.uniform(60.0, 140.0), random.uniform(0.0, 25.0)
        measured = (f"{ground},,", f"{ground},{ground + above},", f",{ground + above},", f",,{above}")[number % 4]
        kind = ("", "tree", "building")[number % 3] if number % 4 else ""
        radius = ("", "40", "120", "300")[number // 4 % 4]
        rows.append(f"{latitude},{longitude},,,{measured},{kind},,{radius},{random.uniform(0.05, 0.5)}")
    for number, share in enumerate(np.linspace(0.0, 1.0, 25)):
        longitude, latitude = lonlat(200.0 + 5600.0 * share, 300.0 + 2400.0 * share)
        rows.append(f"{latitude},{longitude},,,{100 + number % 7},{104 + number % 11},,,walk,,0.1")
    for name in links:
        for distance in range(0, 400, 25):
            rows.append(f",,{name},{distance},{90 + distance % 60},{95 + distance % 60},,tree,measured,,0.1")
    file = folder / "survey.csv"
    file.write_text("\n".join(rows) + "\n")
    return file
