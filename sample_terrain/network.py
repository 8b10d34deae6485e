"""Hubs and places of the invented islands, as tables for `fellspan candidates`; texts only, no file is written here."""

import csv
import io

import numpy as np
import relief
import town
from numpy.typing import NDArray

Grid = NDArray[np.float64]

PLACES = 60
_FIRST = (
    "Alder", "Barrow", "Calder", "Dunlin", "Elder", "Fallow", "Garrow", "Hazel", "Iven", "Juniper", "Kestrel", "Linnet",
    "Marl", "Nettle", "Otter", "Plover", "Quern", "Rowan", "Sallow", "Tansy",
)  # fmt: skip
_SECOND = ("Farm", "House", "Cottage")
_SOUTH_WEST: town.Point = (474_500.0, 3_984_000.0)
_NORTH_EAST: town.Point = (489_500.0, 3_995_500.0)
"""The main island, without the one in the east."""

HUBS: tuple[tuple[str, float, float, str, str, str, str], ...] = (
    # name, latitude, longitude, height, sector, antenna, bearing
    ("Beacon", 36.059363, -45.193093, "12 m above ground", "south", "beacon sector", "140"),
    ("Beacon", 36.059363, -45.193093, "12 m above ground", "west", "beacon sector", "235"),
    ("Beacon", 36.059363, -45.193093, "12 m above ground", "north", "beacon sector", "330"),
    ("Cape Light", 36.054121, -45.137122, "18 m above ground", "", "beacon sector", "240"),
    ("Harbour Office", 36.038172, -45.155982, "5 m above roof", "", "beacon sector", "260"),
    ("South Light", 36.017402, -45.215297, "8 m above ground", "", "beacon sector", "20"),
)


def hubs_csv() -> str:
    """Four hubs, one of them with three sectors."""
    columns = ("name", "latitude", "longitude", "height", "sector", "antenna", "bearing")
    return _table(columns, [[_text(value) for value in hub] for hub in HUBS])


def places_csv(ground_m: Grid, trees_m: Grid, seed: int) -> str:
    """Farms and houses on the land of the main island, outside the woods, none within 150 m of another."""
    rng = np.random.default_rng(seed + 4)
    names = [f"{first} {second}" for second in _SECOND for first in _FIRST]
    rows: list[list[str]] = []
    taken: list[town.Point] = []
    while len(rows) < PLACES:
        east, north = rng.uniform(_SOUTH_WEST[0], _NORTH_EAST[0]), rng.uniform(_SOUTH_WEST[1], _NORTH_EAST[1])
        height = rng.uniform(5.0, 9.0)
        if (
            _at(ground_m, east, north, relief.GROUND_CELL_M) < 3.0
            or _at(trees_m, east, north, relief.COVER_CELL_M) > 0.0
        ):
            continue
        if any(np.hypot(east - x, north - y) < 150.0 for x, y in taken):
            continue
        taken.append((east, north))
        longitude, latitude = town.degrees(east, north)
        rows.append(
            [names[len(rows)], f"{latitude:.6f}", f"{longitude:.6f}", f"{round(height * 2.0) / 2.0:g} m above ground"]
        )
    return _table(("name", "latitude", "longitude", "height"), sorted(rows))


def _at(grid: Grid, east: float, north: float, cell_m: float) -> float:
    return float(grid[int((relief.NORTH_M - north) / cell_m), int((east - relief.EAST_M) / cell_m)])


def _text(value: str | float) -> str:
    return value if isinstance(value, str) else f"{value:.6f}"


def _table(columns: tuple[str, ...], rows: list[list[str]]) -> str:
    buffer = io.StringIO()
    writer = csv.writer(buffer, lineterminator="\n")
    writer.writerow(columns)
    writer.writerows(rows)
    return buffer.getvalue()
