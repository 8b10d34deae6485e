"""Numbers to a tenth, toward caution: what is missing goes up, what there is goes down. Knows no results.

Apart from `words`, which reads results, so that what results are made of can ask too.
"""

import math
from typing import Final

_FUZZ: Final = 1e-6
"""Of a tenth: a sum of floats that falls short of a tenth by less is that tenth."""


def up_tenth(value: float) -> float:
    """Up to a tenth, never -0."""
    return math.ceil(value * 10.0 - _FUZZ) / 10.0 + 0.0


def down_tenth(value: float) -> float:
    """Down to a tenth, never -0; of a negative number that is away from 0."""
    return math.floor(value * 10.0 + _FUZZ) / 10.0 + 0.0
