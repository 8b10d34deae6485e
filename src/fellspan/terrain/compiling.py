"""Machine code from plain functions, for the few loops that arrays cannot do. Importing this module imports numba.

Only modules named `*_kernel` do so, and they are imported where they are called. Knows nothing of what the loops do.
"""

from collections.abc import Callable
from typing import ParamSpec, TypeVar, cast

import numba

P = ParamSpec("P")
R = TypeVar("R")


def compiled(function: Callable[P, R]) -> Callable[P, R]:
    """The function as machine code, made at the first call and kept on disk where that is allowed.

    It runs without Python's lock, so that threads share the work. `NUMBA_DISABLE_JIT=1` leaves it as it is, for tests.
    """
    return _made(function, set())


def compiled_for_numbers(function: Callable[P, R]) -> Callable[P, R]:
    """As `compiled`, for loops that never meet NaN: the least and the greatest of many are then found several at a time.

    Infinite values are legal; asking whether something is NaN is not. No sum is taken in another order.
    """
    return _made(function, {"nnan", "nsz"})


def _made(function: Callable[P, R], fastmath: set[str]) -> Callable[P, R]:
    try:
        made = numba.njit(cache=True, nogil=True, error_model="numpy", fastmath=fastmath)(function)
    except RuntimeError:  # no folder for the cache may be written: compile anew in each run
        made = numba.njit(nogil=True, error_model="numpy", fastmath=fastmath)(function)
    return cast("Callable[P, R]", made)
