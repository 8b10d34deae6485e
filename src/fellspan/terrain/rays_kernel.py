"""The loops of the polar gather: cells cleaned, rasters sampled along rays, cells read back from rays.

This module imports numba; import it where it is called. Places are in cells, the first cell's centre at 0.5. Knows no file.
"""

import math

import numpy as np
from numpy.typing import NDArray

from fellspan.terrain.compiling import compiled

Floats = NDArray[np.float64]
Plane = NDArray[np.float32]


@compiled
def clean(
    cells: Plane, nodata: float, habits: Floats, scale: float, offset: float, unit_m: float, low_m: float, high_m: float
) -> None:
    """Raw cells become heights in metres, NaN where there is none: `nodata` (NaN: none stated), `habits`, not on Earth."""
    for row in range(cells.shape[0]):
        for column in range(cells.shape[1]):
            cell = float(cells[row, column])
            height = (cell * scale + offset) * unit_m
            valid = cell != nodata and low_m < height < high_m
            for habit in habits:
                valid = valid and cell != habit
            cells[row, column] = height if valid else math.nan


@compiled
def _height(plane: Plane, u: float, v: float) -> float:
    """Bilinear between centres, `u`, `v` counted from the first one as `blocks.bilinear` has it."""
    left, top = int(u), int(v)
    across, down = u - left, v - top
    right, bottom = min(left + 1, plane.shape[1] - 1), min(top + 1, plane.shape[0] - 1)
    a, b = float(plane[top, left]), float(plane[top, right])
    c, d = float(plane[bottom, left]), float(plane[bottom, right])
    value = (1.0 - down) * ((1.0 - across) * a + across * b) + down * ((1.0 - across) * c + across * d)
    if not math.isnan(value):
        return value
    nearest = plane[bottom if down >= 0.5 else top, right if across >= 0.5 else left]
    if math.isnan(nearest):
        return math.nan
    total = weighed = 0.0
    for height, weight in (
        (a, (1.0 - down) * (1.0 - across)),
        (b, (1.0 - down) * across),
        (c, down * (1.0 - across)),
        (d, down * across),
    ):
        if not math.isnan(height):
            total += weight
            weighed += weight * height
    return weighed / total if total > 0.0 else math.nan


@compiled
def _places(share: Floats, polynomial: Floats, moved: float, out: Floats) -> None:
    """A ray's polynomial, highest power first, at `share`, less `moved`; loops that the compiler makes into vectors."""
    out[:] = polynomial[0]
    for power in range(1, polynomial.size - 1):
        for i in range(share.size):
            out[i] = out[i] * share[i] + polynomial[power]
    for i in range(share.size):
        out[i] = out[i] * share[i] + (polynomial[polynomial.size - 1] - moved)


@compiled
def gather(
    plane: Plane,
    share: Floats,
    columns: Floats,
    rows: Floats,
    width: float,
    height: float,
    left: float,
    top: float,
    out: Floats,
    is_new: bool,
) -> None:
    """Fill what is NaN in `out` (m, n) from a raster, at places along rays.

    Parameters
    ----------
    plane
        Heights of a window of cells, its first cell at `left`, `top` of the raster, of `width` by `height` cells.
    share
        (n,), places along the rays as shares of their length.
    columns, rows
        (m, p), the polynomials of each ray, highest power first: share of the length to place in cells of the raster.
    is_new
        Whether nothing in `out` was written yet: then all of it is, with NaN beside the raster.
    """
    block = 64  # neighbouring rays pass the same cells: block by block these stay at hand
    edge = 1e-6
    one, across_plane = np.uint64(1), np.uint64(plane.shape[1])
    flat = plane.reshape(-1)
    most_u, most_v = plane.shape[1] - 1.0, plane.shape[0] - 1.0
    u, v = np.empty(block), np.empty(block)
    for first in range(0, share.size, block):
        part = share[first : first + block]
        count = part.size
        for ray in range(out.shape[0]):
            _places(part, columns[ray], left + 0.5, u[:count])
            _places(part, rows[ray], top + 0.5, v[:count])
            low_u, high_u, low_v, high_v = u[0], u[0], v[0], v[0]
            for i in range(1, count):
                low_u, high_u = min(low_u, u[i]), max(high_u, u[i])
                low_v, high_v = min(low_v, v[i]), max(high_v, v[i])
            if is_new and low_u >= 0.0 and low_v >= 0.0 and high_u < most_u and high_v < most_v:
                for i in range(count):
                    at_u, at_v = u[i], v[i]
                    column, row = int(at_u), int(at_v)
                    across, down = at_u - column, at_v - row
                    at = np.uint64(row) * across_plane + np.uint64(column)
                    below = at + across_plane
                    upper = flat[at] + across * (flat[at + one] - flat[at])
                    value = upper + down * (flat[below] + across * (flat[below + one] - flat[below]) - upper)
                    out[ray, first + i] = value if not math.isnan(value) else _height(plane, at_u, at_v)
                continue
            for i in range(count):
                beside = u[i] < -edge - left - 0.5 or u[i] > width + edge - left - 0.5
                beside = beside or v[i] < -edge - top - 0.5 or v[i] > height + edge - top - 0.5
                if beside:
                    out[ray, first + i] = math.nan if is_new else out[ray, first + i]
                elif is_new or math.isnan(out[ray, first + i]):
                    at_u, at_v = min(max(u[i], 0.0), most_u), min(max(v[i], 0.0), most_v)
                    out[ray, first + i] = _height(plane, at_u, at_v)


@compiled
def gather_cells(
    plane: Plane, affine: Floats, width: float, height: float, left: float, top: float, out: Plane
) -> None:
    """As `gather`, at the centres of a grid of cells: `affine` (6,) takes their column and row to those of the raster."""
    most_u, most_v = plane.shape[1] - 1.0, plane.shape[0] - 1.0
    edge = 1e-6
    for i in range(out.shape[0]):
        for j in range(out.shape[1]):
            if not math.isnan(out[i, j]):
                continue
            column = affine[0] * (j + 0.5) + affine[1] * (i + 0.5) + affine[2]
            row = affine[3] * (j + 0.5) + affine[4] * (i + 0.5) + affine[5]
            if column < -edge or row < -edge or column > width + edge or row > height + edge:
                continue
            u, v = column - left - 0.5, row - top - 0.5
            out[i, j] = _height(plane, min(max(u, 0.0), most_u), min(max(v, 0.0), most_v))


@compiled
def _angles(east: Floats, north: Floats, ray_count: float, waves: Floats, out: Floats) -> None:
    """Bearings in numbers of rays, 0 to `ray_count`; `waves` as `arctangent` gives them, in the square of the lesser ratio."""
    eighth = ray_count / 8.0
    for i in range(east.size):
        a, b = abs(east[i]), abs(north[i])
        low, high = min(a, b), max(a, b)
        ratio = low / (high + 1e-300)
        square = ratio * ratio
        value = waves[0]
        for power in range(1, 11):
            value = value * square + waves[power]
        angle = value * ratio
        angle = 2.0 * eighth - angle if a > b else angle
        angle = 4.0 * eighth - angle if north[i] < 0.0 else angle
        out[i] = 8.0 * eighth - angle if east[i] < 0.0 else angle


def arctangent(ray_count: int) -> Floats:
    """Eleven powers, highest first, for `_angles`: within 1e-9 of a radian, a hundred thousandth of a ray."""
    nodes = 0.5 - 0.5 * np.cos(np.pi * (np.arange(11) + 0.5) / 11)
    values = np.arctan(np.sqrt(nodes)) / np.sqrt(nodes)
    return np.asarray(np.linalg.solve(np.vander(nodes, 11), values) * (ray_count / (2.0 * math.pi)))


@compiled
def cells_from_rays(
    polar: Plane,
    first_ray: int,
    ray_count: int,
    step_m: float,
    reach_m: float,
    easts: Floats,
    norths: Floats,
    columns: Floats,
    waves: Floats,
    ground: Plane,
    needed: Plane,
) -> None:
    """Levels on rays, read at cells, less their ground: bilinear in bearing and distance, NaN out of reach or beside a gap.

    Parameters
    ----------
    polar
        (m, n): rays from `first_ray` on of `ray_count` in the full turn, the first once more after a whole turn; samples at
        (j + 1) * step_m.
    easts, norths
        (rows, p), the polynomials of each row of cells, highest power first: a cell's `columns` value, (c,), to distance times
        sine and cosine of its bearing from the site.
    waves
        As `arctangent` gives them.
    ground
        (rows, c), of the cells.
    needed
        (rows, c), written: 0 or more.
    """
    block = 64  # cells of a square lie on the same rays: square by square these stay at hand
    held, most = polar.shape
    flat = polar.reshape(-1)
    one, samples = np.uint64(1), np.uint64(most)
    last_ray, last_sample, per_step = held - 2, most - 2, 1.0 / step_m
    east, north, angle, along = np.empty(block), np.empty(block), np.empty(block), np.empty(block)
    for first in range(0, columns.size, block):
        part = columns[first : first + block]
        count = part.size
        for i in range(needed.shape[0]):
            _places(part, easts[i], 0.0, east[:count])
            _places(part, norths[i], 0.0, north[:count])
            nearest = math.inf
            for j in range(count):
                away = math.sqrt(east[j] * east[j] + north[j] * north[j])
                nearest = min(nearest, away)
                along[j] = max(away * per_step - 1.0, 0.0) if away <= reach_m else -1.0
            if nearest > reach_m:
                needed[i, first : first + count] = math.nan
                continue
            _angles(east[:count], north[:count], float(ray_count), waves, angle[:count])
            for j in range(count):
                beside = angle[j] - first_ray
                angle[j] = beside + ray_count if beside < 0.0 else beside
            for j in range(count):
                if along[j] < 0.0 or angle[j] > held - 1.0:
                    needed[i, first + j] = math.nan
                    continue
                ray, sample = min(int(angle[j]), last_ray), min(int(along[j]), last_sample)
                beside, ahead = angle[j] - ray, along[j] - sample
                at = np.uint64(ray) * samples + np.uint64(sample)
                also = at + samples
                here = flat[at] + ahead * (flat[at + one] - flat[at])
                there = flat[also] + ahead * (flat[also + one] - flat[also])
                above = here + beside * (there - here) - ground[i, first + j]
                needed[i, first + j] = 0.0 if above < 0.0 else above


@compiled
def cell_distances(easts: Floats, norths: Floats, columns: Floats, out: Plane) -> None:
    """How far cells are from the site, (rows, c), m; arguments as of `cells_from_rays`."""
    east, north = np.empty(columns.size), np.empty(columns.size)
    for i in range(out.shape[0]):
        _places(columns, easts[i], 0.0, east)
        _places(columns, norths[i], 0.0, north)
        for j in range(columns.size):
            out[i, j] = math.sqrt(east[j] * east[j] + north[j] * north[j])
