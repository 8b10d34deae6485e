"""The loops of the polar gather: cells cleaned, rasters sampled along rays, cells read back from rays.

This module imports numba; import it where it is called. Places are in cells, the first cell's centre at 0.5. Knows no file.
"""

import math
from typing import Any

import numpy as np
from numpy.typing import NDArray

from fellspan.terrain.compiling import compiled

Floats = NDArray[np.float64]
Plane = NDArray[np.float32]


@compiled
def clean(
    raw: NDArray[Any],
    nodata: float,
    habits: Floats,
    scale: float,
    offset: float,
    unit_m: float,
    low_m: float,
    high_m: float,
    out: Plane,
) -> None:
    """Heights of cells in metres, NaN where there is none: `nodata` (NaN: none stated), `habits`, and what is not on Earth."""
    for row in range(raw.shape[0]):
        for column in range(raw.shape[1]):
            cell = float(raw[row, column])
            height = (cell * scale + offset) * unit_m
            valid = cell != nodata and low_m < height < high_m
            for habit in habits:
                valid = valid and cell != habit
            out[row, column] = height if valid else math.nan


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
    """
    edge = 1e-6
    most_u, most_v = plane.shape[1] - 1.0, plane.shape[0] - 1.0
    powers = columns.shape[1]
    for ray in range(out.shape[0]):
        for i in range(share.size):
            t = share[i]
            column, row = columns[ray, 0], rows[ray, 0]
            for power in range(1, powers):
                column = column * t + columns[ray, power]
                row = row * t + rows[ray, power]
            if column < -edge or row < -edge or column > width + edge or row > height + edge:
                continue
            if not math.isnan(out[ray, i]):
                continue
            u, v = column - left - 0.5, row - top - 0.5
            out[ray, i] = _height(plane, min(max(u, 0.0), most_u), min(max(v, 0.0), most_v))


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
def cells_from_rays(
    polar: Plane,
    first_ray: int,
    ray_count: int,
    step_m: float,
    reach_m: float,
    easts: Floats,
    norths: Floats,
    columns: Floats,
    ground: Plane,
    needed: Plane,
    distance: Plane,
) -> None:
    """Levels on rays, read at cells, less their ground: bilinear in bearing and distance, NaN out of reach or beside a gap.

    Parameters
    ----------
    polar
        (m, n): rays from `first_ray` on of `ray_count` in the full turn, samples at (j + 1) * step_m.
    easts, norths
        (rows, p), the polynomials of each row of cells, highest power first: a cell's `columns` value, (c,), to distance times
        sine and cosine of its bearing from the site.
    ground
        (rows, c), of the cells.
    needed, distance
        (rows, c), written; `needed` is 0 or more.
    """
    turn = ray_count / (2.0 * math.pi)
    powers = easts.shape[1]
    held, most = polar.shape
    whole = held == ray_count
    for i in range(needed.shape[0]):
        for j in range(needed.shape[1]):
            t = columns[j]
            east, north = easts[i, 0], norths[i, 0]
            for power in range(1, powers):
                east = east * t + easts[i, power]
                north = north * t + norths[i, power]
            away = math.sqrt(east * east + north * north)
            distance[i, j] = away
            if away > reach_m:
                needed[i, j] = math.nan
                continue
            angle = math.atan2(east, north) * turn
            if angle < 0.0:
                angle += ray_count
            ray = int(angle)
            beside = angle - ray
            ray -= first_ray
            if ray < 0:
                ray += ray_count
            if whole:
                ray = ray - ray_count if ray >= ray_count else ray
                following = ray + 1 if ray + 1 < ray_count else 0
            else:
                following = ray + 1
                if following >= held:
                    needed[i, j] = math.nan
                    continue
            along = min(max(away / step_m - 1.0, 0.0), most - 1.0)
            k = min(int(along), max(most - 2, 0))
            ahead = along - k
            nxt = min(k + 1, most - 1)
            one = (1.0 - ahead) * polar[ray, k] + ahead * polar[ray, nxt]
            two = (1.0 - ahead) * polar[following, k] + ahead * polar[following, nxt]
            above = (1.0 - beside) * one + beside * two - ground[i, j]
            needed[i, j] = 0.0 if above < 0.0 else above
