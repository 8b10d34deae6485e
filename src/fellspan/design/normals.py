"""The numbers that draws begin with: the same for every link, since all draws begin with one seed, and so made only once.

A stretch of NumPy's stream of unit normals; asked for in pieces, it is the same stream.
"""

import threading
from typing import Final

import numpy as np
from numpy.typing import NDArray

KEPT: Final = 3_640_000
"""Numbers kept, 15 MB: as many as the most that draws of planning ask for."""


class Normals:
    """The first unit normals, float32, of a seed; made as far as they are asked for."""

    def __init__(self, seed: int, *, kept: int = KEPT) -> None:
        self._seed = seed
        self._rng = np.random.default_rng(seed)
        # Untouched memory costs nothing.
        self._values = np.empty(kept, dtype=np.float32)
        self._made = 0
        self._lock = threading.Lock()

    def first(self, count: int) -> NDArray[np.float32]:
        """So many of them, (count,), read only."""
        if count > self._values.size:
            return np.random.default_rng(self._seed).standard_normal(count, dtype=np.float32)
        with self._lock:
            if count > self._made:
                self._rng.standard_normal(dtype=np.float32, out=self._values[self._made : count])
                self._made = count
        values = self._values[:count]
        values.flags.writeable = False
        return values


_OF: dict[int, Normals] = {}


def normals(seed: int, count: int) -> NDArray[np.float32]:
    """The first `count` unit normals of a seed, (count,), read only; those of a seed used before are kept."""
    kept = _OF.get(seed)
    if kept is None:
        kept = _OF.setdefault(seed, Normals(seed))
    return kept.first(count)
