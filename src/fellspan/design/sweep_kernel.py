"""The level that every place along a ray must be seen at, over all that stands before it: exact, in linear time.

With A's antenna at height h_a and a target at distance D, a sample of surface S at x asks, by need = S + bulge + fraction * F1,
for a slope (h_b - h_a) / D of at least

    s(x) + c * sqrt(1/x - 1/D) + D / (2 k a),   s(x) = (S - h_a) / x - x / (2 k a),   c = fraction * sqrt(wavelength).

The last term is the same for all samples. Write u = 1/x and v = 1/D. For two samples, the nearer one's curve falls against the
farther one's as D grows, so a farther sample takes over from a nearer one once, or never. The greatest curve is therefore a
queue: each target asks its front, the front leaves when the next one takes over, and a new sample removes from the back
those that it overtakes before they ever come first. Each sample enters and leaves once.

The moment of taking over is closed: with sigma = (s_j - s_i) / c and p = sqrt(u_j - v), sqrt(u_i - v) = p + sigma, hence
p = ((u_i - u_j) / sigma - sigma) / 2. An error of rounding in it costs no more than the same error in s would.

This module imports numba; import it where it is called. Knows nothing of rasters, sites or cells.
"""

import math

import numpy as np
from numpy.typing import NDArray

from fellspan.terrain.compiling import compiled

Floats = NDArray[np.float64]


@compiled
def _push(
    slope: Floats, near: Floats, takes: Floats, head: int, tail: int, s: float, u: float, c: float, last: float
) -> int:
    """Add a curve at the back of the queue; the new end of it. `takes` is 1/D from which on a curve leads, going outward."""
    at = math.inf
    while tail > head:
        back = tail - 1
        if s <= slope[back]:
            return tail  # nearer and not lower: the back leads for ever
        if c == 0.0:
            tail = back
            continue
        sigma = (s - slope[back]) / c
        p = 0.5 * ((near[back] - u) / sigma - sigma)
        if p <= 0.0:
            tail = back  # leads from where it stands
            continue
        at = u - p * p
        if at <= last:
            return tail  # would lead beyond the last target only
        if back > head and at >= takes[back]:
            tail = back
            continue
        break
    if tail == head:
        at = math.inf
    slope[tail] = s
    near[tail] = u
    takes[tail] = at
    return tail + 1


@compiled
def _beside_a(
    distance: Floats,
    ground: Floats,
    surface: Floats,
    j: int,
    antenna: float,
    c: float,
    flat: float,
    site_near_m: float,
    near_m: float,
    share: float,
) -> float:
    """The greatest slope asked on a path so short that what counts as the ends' own depends on its length."""
    end = distance[j]
    own_a, own_b = min(site_near_m, share * end) + 1e-6, min(near_m, share * end) + 1e-6
    best = -math.inf
    for i in range(j):
        x = distance[i]
        height = ground[i] if x <= own_a or end - x <= own_b else surface[i]
        asked = (height - antenna) / x - x * flat + c * math.sqrt(1.0 / x - 1.0 / end)
        best = max(best, asked)
    return best


@compiled
def sweep(  # noqa: PLR0912  # one loop: a call for each part of it would cost more than the part
    distance: Floats,
    target: NDArray[np.int64],
    ground: Floats,
    surface: Floats,
    has_cover: bool,
    antenna: float,
    roots: Floats,
    flats: Floats,
    site_near_m: float,
    near_m: float,
    near_share: float,
    level: NDArray[np.float32] | Floats,
) -> None:
    """Least level of the other antenna on rays, m above sea level, so that every criterion holds on what stands before it.

    Parameters
    ----------
    distance
        (n,), of the samples, m from A, rising, above 0.
    target
        (n,), which target a sample is, rising, or -1.
    ground, surface
        (m, n), m above sea level, NaN in gaps; `surface` is not read where `has_cover` is False.
    antenna
        Level of A's antenna, m above sea level.
    roots, flats
        (c,), of each criterion: fraction * sqrt(wavelength), and 1 / (2 k a), which may be 0 or negative.
    site_near_m, near_m, near_share
        Cover so near to A, or to the target, and within this share of the path, is what that end stands on.
    level
        (m, targets), written: NaN beyond a gap; where nothing stands before the target, its own ground.
    """
    count = distance.size
    near_end = 1.0 / distance
    last = near_end[count - 1]
    short = near_m / near_share
    slope, near, takes = np.empty(count), np.empty(count), np.empty(count)
    slope_b, near_b, takes_b = np.empty(count), np.empty(count), np.empty(count)
    for ray in range(level.shape[0]):
        for rule in range(roots.size):
            c, flat = roots[rule], flats[rule]
            head = tail = head_b = tail_b = waiting = due = 0
            for j in range(count):
                end, v = distance[j], near_end[j]
                height = ground[ray, j]
                if target[j] >= 0:
                    due = target[j] + 1
                    while head + 1 < tail and takes[head + 1] >= v:
                        head += 1
                    best = slope[head] + c * math.sqrt(near[head] - v) if tail > head else -math.inf
                    if has_cover and end < short:
                        own = site_near_m, near_m, near_share
                        best = _beside_a(distance, ground[ray], surface[ray], j, antenna, c, flat, *own)
                    elif has_cover:
                        while end - distance[waiting] > near_m + 1e-6:
                            x = distance[waiting]
                            if x > site_near_m + 1e-6:
                                asked = (surface[ray, waiting] - antenna) * near_end[waiting] - x * flat
                                tail_b = _push(
                                    slope_b, near_b, takes_b, head_b, tail_b, asked, near_end[waiting], c, last
                                )
                            waiting += 1
                        while head_b + 1 < tail_b and takes_b[head_b + 1] >= v:
                            head_b += 1
                        if tail_b > head_b:
                            best = max(best, slope_b[head_b] + c * math.sqrt(near_b[head_b] - v))
                    asked_level = height if best == -math.inf else antenna + end * (best + end * flat)
                    if rule == 0 or asked_level > level[ray, due - 1]:
                        level[ray, due - 1] = asked_level
                if math.isnan(height):
                    level[ray, due:] = np.nan
                    break
                asked = (height - antenna) * v - end * flat
                tail = _push(slope, near, takes, head, tail, asked, v, c, last)
