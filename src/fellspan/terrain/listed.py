"""Where the obstacles and survey rows of a user's files stand, so that planning can see which lie nowhere near a link."""

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal

import numpy as np
import shapely
from numpy.typing import NDArray

from fellspan.terrain.obstacles import Obstacle
from fellspan.terrain.survey import SurveyRow

ListedKind = Literal["obstacle", "survey point"]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Listed:
    """Things of one kind: `names` for people, and a place of each, degrees, shape (n,)."""

    kind: ListedKind
    names: tuple[str, ...]
    latitude_deg: NDArray[np.float64]
    longitude_deg: NDArray[np.float64]


def listed_obstacles(obstacles: Sequence[Obstacle]) -> Listed:
    """A point inside the bounds of each obstacle."""
    bounds = shapely.bounds(np.array([obstacle.shape for obstacle in obstacles], dtype=object)).reshape(-1, 4)
    return Listed(
        kind="obstacle",
        names=tuple(obstacle.name for obstacle in obstacles),
        latitude_deg=bounds[:, [1, 3]].mean(axis=1),
        longitude_deg=bounds[:, [0, 2]].mean(axis=1),
    )


def listed_rows(rows: Sequence[SurveyRow]) -> Listed:
    """The rows that state a position; rows at a distance along a link have none."""
    places = [(row.where, row.latitude_deg, row.longitude_deg) for row in rows]
    known = [(name, north, east) for name, north, east in places if north is not None and east is not None]
    return Listed(
        kind="survey point",
        names=tuple(name for name, _, _ in known),
        latitude_deg=np.array([north for _, north, _ in known], dtype=np.float64),
        longitude_deg=np.array([east for _, _, east in known], dtype=np.float64),
    )
