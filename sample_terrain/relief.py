"""Arrays of the invented island group Tolmera: bare ground and tree heights; writes no file and needs no network.

All lengths are metres on the UTM grid of the sample (zone 23 N); the islands exist nowhere but here.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy import ndimage

EAST_M, NORTH_M = 474_000.0, 3_997_000.0
"""Upper left corner of both rasters."""
WIDTH_M, HEIGHT_M = 40_000.0, 15_000.0
GROUND_CELL_M, COVER_CELL_M, RIVER_CELL_M = 10.0, 5.0, 50.0

Grid = NDArray[np.float64]


@dataclass(frozen=True, slots=True, kw_only=True)
class Dome:
    """One island before the rivers cut it: centre, half axes, and the height its summit is scaled to."""

    east_m: float
    north_m: float
    half_east_m: float
    half_north_m: float
    summit_m: float
    roughness: float = 0.38


TOLMERA = Dome(east_m=482_200, north_m=3_989_600, half_east_m=4_600, half_north_m=4_200, summit_m=414)
OSTREL = Dome(east_m=510_400, north_m=3_989_500, half_east_m=2_500, half_north_m=1_900, summit_m=146)
ISLETS = (
    Dome(east_m=490_400, north_m=3_991_900, half_east_m=420, half_north_m=260, summit_m=24, roughness=0.2),
    Dome(east_m=491_300, north_m=3_984_700, half_east_m=300, half_north_m=380, summit_m=31, roughness=0.2),
    Dome(east_m=475_300, north_m=3_995_300, half_east_m=350, half_north_m=300, summit_m=18, roughness=0.2),
    Dome(east_m=505_900, north_m=3_993_600, half_east_m=260, half_north_m=330, summit_m=12, roughness=0.2),
)
BAY_EAST_M, BAY_NORTH_M, BAY_RADIUS_M = 487_900.0, 3_988_300.0, 1_150.0
MOLE_FROM, MOLE_TO, MOLE_HALF_WIDTH_M, MOLE_TOP_M = (486_040.0, 3_988_580.0), (486_900.0, 3_988_200.0), 16.0, 4.0
PLAIN_EAST_M, PLAIN_NORTH_M, PLAIN_RADIUS_M = 485_700.0, 3_987_300.0, 1_650.0


def cell_centres(cell_m: float) -> tuple[Grid, Grid]:
    """Eastings (1, columns) and northings (rows, 1) of the cell centres."""
    east = EAST_M + cell_m * (np.arange(round(WIDTH_M / cell_m)) + 0.5)
    north = NORTH_M - cell_m * (np.arange(round(HEIGHT_M / cell_m)) + 0.5)
    return np.asarray(east[np.newaxis, :], dtype=np.float64), np.asarray(north[:, np.newaxis], dtype=np.float64)


def noise(rng: np.random.Generator, wave_m: float, cell_m: float, *, octaves: int = 1) -> Grid:
    """Smooth noise with a standard deviation near 1; each octave has half the wave and half the height."""
    rows, columns = round(HEIGHT_M / cell_m), round(WIDTH_M / cell_m)
    total = np.zeros((rows, columns))
    for octave in range(octaves):
        step = wave_m / 2**octave / cell_m
        knots = rng.standard_normal((int(rows / step) + 5, int(columns / step) + 5))
        weights_down, weights_across = _spline(rows, step, knots.shape[0]), _spline(columns, step, knots.shape[1])
        total += 1.5 * 0.5**octave * (weights_down @ knots @ weights_across.T)
    return total


def _spline(count: int, step: float, knots: int) -> Grid:
    """Uniform cubic B-spline weights of `count` samples on `knots` knots."""
    place = (np.arange(count) + 0.5) / step + 1.0
    return np.maximum(0.0, _cubic(np.abs(place[:, np.newaxis] - np.arange(knots)[np.newaxis, :])))


def _cubic(x: Grid) -> Grid:
    near = 2.0 / 3.0 - x**2 + x**3 / 2.0
    far = (2.0 - x) ** 3 / 6.0
    return np.where(x < 1.0, near, np.where(x < 2.0, far, 0.0))


def _bump(east: Grid, north: Grid, at_east: float, at_north: float, radius: float) -> Grid:
    return np.exp(-(((east - at_east) ** 2 + (north - at_north) ** 2) / radius**2))


def _from_line(east: Grid, north: Grid, start: tuple[float, float], stop: tuple[float, float]) -> Grid:
    """Distance from a straight stretch."""
    run_east, run_north = stop[0] - start[0], stop[1] - start[1]
    share = ((east - start[0]) * run_east + (north - start[1]) * run_north) / (run_east**2 + run_north**2)
    share = np.clip(share, 0.0, 1.0)
    return np.hypot(east - start[0] - share * run_east, north - start[1] - share * run_north)


def _shape(dome: Dome, east: Grid, north: Grid, wobble: Grid) -> Grid:
    """Positive on the island, 0 at its shore, negative at sea."""
    radius = np.hypot((east - dome.east_m) / dome.half_east_m, (north - dome.north_m) / dome.half_north_m)
    shape = 1.0 - radius + dome.roughness * 0.5 * wobble * np.minimum(1.0, radius + 0.2)
    if dome is TOLMERA:
        shape -= 0.75 * _bump(east, north, BAY_EAST_M, BAY_NORTH_M, BAY_RADIUS_M)
        shape += 0.13 * _bump(east, north, PLAIN_EAST_M, PLAIN_NORTH_M, PLAIN_RADIUS_M)
        for cape_north in (3_989_900.0, 3_986_300.0):
            shape += 0.30 * _bump(east, north, 487_700.0, cape_north, 900.0)
    return shape


def _carve(uplift: Grid, land: NDArray[np.bool_], rough: Grid, *, rounds: int = 28) -> Grid:
    """Rivers: an implicit stream-power model; every land cell drains to its lowest neighbour.

    Each round finds the receivers, gathers the drained area from the heights down, and solves
    dh/dt = U - K sqrt(area) slope from the shore up.
    """
    rows, columns = uplift.shape
    cells = np.flatnonzero(land)
    height = np.where(land, 1.0 + rough - rough.min(), 0.0).ravel()
    area = np.zeros(height.size)
    offsets = [(dr, dc) for dr in (-1, 0, 1) for dc in (-1, 0, 1) if dr or dc]
    lifted, is_land = uplift.ravel(), land.ravel()
    for _ in range(rounds):
        padded = np.pad(height.reshape(rows, columns), 1, constant_values=np.inf)
        drops = np.stack(
            [
                (height.reshape(rows, columns) - padded[1 + dr : 1 + dr + rows, 1 + dc : 1 + dc + columns])
                / np.hypot(dr, dc)
                for dr, dc in offsets
            ]
        ).reshape(len(offsets), -1)
        steepest = drops.argmax(axis=0)
        jump = np.array([dr * columns + dc for dr, dc in offsets])[steepest]
        receiver = np.where(drops.max(axis=0) > 0.0, np.arange(height.size) + jump, np.arange(height.size))
        run = np.array([np.hypot(dr, dc) for dr, dc in offsets])[steepest]
        order = cells[np.argsort(-height[cells], kind="stable")]
        area[:] = 1.0
        downstream, gathered = receiver.tolist(), area.tolist()
        for cell in order.tolist():
            if downstream[cell] != cell:
                gathered[downstream[cell]] += gathered[cell]
        pull = (0.55 * np.sqrt(np.asarray(gathered)) / run).tolist()
        level = (height + np.where(is_land, lifted, 0.0)).tolist()
        for cell in order[::-1].tolist():
            below = downstream[cell]
            if below != cell:
                level[cell] = (level[cell] + pull[cell] * level[below]) / (1.0 + pull[cell])
        height = np.where(is_land, np.maximum(level, 0.2), 0.0)
    return height.reshape(rows, columns)


def _resample(coarse: Grid, cell_m: float) -> Grid:
    east, north = cell_centres(cell_m)
    column = (east[0] - EAST_M) / RIVER_CELL_M - 0.5
    row = (NORTH_M - north[:, 0]) / RIVER_CELL_M - 0.5
    return ndimage.map_coordinates(coarse, np.meshgrid(row, column, indexing="ij"), order=1, mode="nearest")


def make_ground(seed: int) -> Grid:
    """Bare ground above sea level, m, at 10 m cells; 0 at sea."""
    rng = np.random.default_rng(seed)
    wobble_wave, wobble = 3_600.0, {}
    state = rng.bit_generator.state
    for cell in (RIVER_CELL_M, GROUND_CELL_M):
        rng.bit_generator.state = state  # the same coast at both cell sizes
        wobble[cell] = noise(rng, wobble_wave, cell, octaves=6)
    rough = noise(rng, 900.0, RIVER_CELL_M, octaves=4)
    detail = noise(rng, 260.0, GROUND_CELL_M, octaves=3)
    domes = (TOLMERA, OSTREL, *ISLETS)
    east, north = cell_centres(RIVER_CELL_M)
    shapes = [_shape(dome, east, north, wobble[RIVER_CELL_M]) for dome in domes]
    shape = np.maximum.reduce(shapes)
    plain = 1.0 - 0.97 * np.minimum(1.0, 1.6 * _bump(east, north, PLAIN_EAST_M, PLAIN_NORTH_M, PLAIN_RADIUS_M))
    uplift = np.clip(shape, 0.0, 0.8) ** 0.7 * plain * np.exp(0.25 * rough)
    carved = _carve(np.where(shape > 0.0, uplift, 0.0), shape > 0.0, 0.1 * rough)
    for dome, own in zip(domes, shapes, strict=True):
        carved[own > 0.0] *= dome.summit_m / carved[own > 0.0].max()
    east, north = cell_centres(GROUND_CELL_M)
    fine_shape = np.maximum.reduce([_shape(dome, east, north, wobble[GROUND_CELL_M]) for dome in domes])
    level = ndimage.gaussian_filter(_resample(carved, GROUND_CELL_M), 3.0)
    level += detail * np.clip(level / 40.0, 0.05, 1.4)
    shore = np.clip(fine_shape / 0.03, 0.0, 1.0)
    level = np.maximum(level * shore, 0.0) + 1.5 * shore
    ground = np.where(fine_shape > 0.0, np.maximum(level, 0.3), 0.0)
    return np.where(
        _from_line(east, north, MOLE_FROM, MOLE_TO) < MOLE_HALF_WIDTH_M, np.maximum(ground, MOLE_TOP_M), ground
    )


def make_trees(seed: int, ground_m: Grid) -> Grid:
    """Tree heights above ground, m, at 5 m cells; 0 where none stand."""
    rng = np.random.default_rng(seed + 1)
    wood, clearing = noise(rng, 1_500.0, GROUND_CELL_M, octaves=4), noise(rng, 240.0, GROUND_CELL_M, octaves=2)
    east, north = cell_centres(GROUND_CELL_M)
    town = _bump(east, north, PLAIN_EAST_M, PLAIN_NORTH_M, 1_500.0) > 0.35
    wooded = (wood > 0.55) & (clearing < 1.3) & (ground_m > 12.0) & (ground_m < 310.0) & ~town
    stand = 15.0 + 3.0 * clearing - 0.02 * np.maximum(ground_m - 120.0, 0.0)
    stand_m = np.where(wooded, stand, 0.0)
    fine = np.repeat(np.repeat(stand_m, 2, axis=0), 2, axis=1)
    crowns = rng.standard_normal(fine.shape, dtype=np.float32)
    return np.where(fine > 0.0, np.clip(fine + 2.0 * crowns, 3.0, 25.0), 0.0)
