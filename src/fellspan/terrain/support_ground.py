"""The ground under the supports of lines, looked up once for all the paths that cross a line.

Asks the ground's rasters; knows nothing of paths.
"""

import numpy as np
import shapely
from numpy.typing import NDArray

from fellspan.terrain.alongpath import Floats
from fellspan.terrain.obstacles import Crossing
from fellspan.terrain.stack import RasterStack


class SupportGround:
    """Gives the ground at both ends of the spans of a crossing's line, as `obstacle_tops` asks for it."""

    def __init__(self, ground: RasterStack) -> None:
        self._ground = ground
        self._known: dict[int, Floats] = {}

    def __call__(self, crossing: Crossing, spans: NDArray[np.int64]) -> Floats:
        """Ground, m above sea level, (k, 2), NaN where it is not known; `spans` (k,)."""
        obstacle = crossing.obstacle
        if id(obstacle) not in self._known:
            line = shapely.get_coordinates(obstacle.shape)
            # No sea here: a support without ground hangs its line level, from the highest ground under the crossing.
            value = self._ground.sample_positions(line[:, 1], line[:, 0]).value_m
            self._known[id(obstacle)] = np.asarray(value, dtype=np.float64)
        known = self._known[id(obstacle)]
        return np.stack((known[spans], known[spans + 1]), axis=1)
