"""How large the cells of a raster are on the ground, everywhere on it: exact at nodes, a smooth surface between them.

For batches, which ask at three places of every path. Knows headers only.
"""

from typing import Final

import numpy as np
from numpy.polynomial import chebyshev
from numpy.typing import NDArray

from fellspan.terrain.raster_file import RasterFile, cells_on_ground, on_plane

_NODES: Final = (7, 13)
"""Nodes along each side that are tried in turn."""
SMOOTH: Final = 2e-8
"""The surface is used where it departs from the exact size by less than this share of it, at points between the nodes."""
_PROBES: Final = 200

Floats = NDArray[np.float64]


class CellSizes:
    """The shorter side of the cells of one raster, m."""

    def __init__(self, file: RasterFile) -> None:
        self.file = file
        self._surfaces = self._smooth()

    def at(self, column: Floats, row: Floats) -> Floats:
        """The shorter side, m, at places in cells on the raster, shape (n,)."""
        if self._surfaces is None:
            return self.exactly(column, row)
        across, down = 2.0 * column / self.file.width - 1.0, 2.0 * row / self.file.height - 1.0
        sides = [np.asarray(chebyshev.chebval2d(across, down, surface)) for surface in self._surfaces]
        return np.minimum(sides[0], sides[1])

    def exactly(self, column: Floats, row: Floats) -> Floats:
        """As `at`, worked out at each place."""
        return np.minimum(*self._sides(column, row))

    def _sides(self, column: Floats, row: Floats) -> tuple[Floats, Floats]:
        x, y = on_plane(self.file.transform, column, row)
        return cells_on_ground(self.file.transform, self.file.crs_text, x, y)

    def _smooth(self) -> tuple[Floats, Floats] | None:
        """Coefficients of a surface for each side; None where none is close enough, or the CRS ends on the raster."""
        width, height = self.file.width, self.file.height
        rng = np.random.default_rng(0)
        probes = rng.random((2, _PROBES))
        wanted = self._sides(probes[0] * width, probes[1] * height)
        if not all(np.isfinite(side).all() for side in wanted):
            return None
        for count in _NODES:
            nodes = chebyshev.chebpts1(count)
            down, across = np.meshgrid(nodes, nodes, indexing="ij")
            sides = self._sides((across.ravel() + 1.0) * width / 2.0, (down.ravel() + 1.0) * height / 2.0)
            weights = 2.0 / count * chebyshev.chebvander(nodes, count - 1)
            weights[:, 0] /= 2.0
            found = tuple(weights.T @ side.reshape(count, count).T @ weights for side in sides)
            made = [chebyshev.chebval2d(2.0 * probes[0] - 1.0, 2.0 * probes[1] - 1.0, surface) for surface in found]
            off = [np.abs(one / side - 1.0).max() for one, side in zip(made, wanted, strict=True)]
            if max(off) < SMOOTH:
                return found[0], found[1]
        return None
