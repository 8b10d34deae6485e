"""What every formula here shares in handling numbers and arrays; knows no physics.

Scalars go in and Python floats come out; arrays broadcast; nothing that a caller owns is written to.
"""

from typing import Any, TypeAlias

import numpy as np
from numpy.typing import ArrayLike, NDArray

from fellspan.errors import QuantityError

FloatArray: TypeAlias = NDArray[np.float64]
Result: TypeAlias = NDArray[np.float64] | float


def as_floats(value: ArrayLike) -> FloatArray:
    """The value as float64, without a copy where it already is."""
    return np.asarray(value, dtype=np.float64)


def as_result(value: Any) -> Result:
    """A Python float for a scalar, else the array."""
    array = np.asarray(value, dtype=np.float64)
    return float(array) if array.ndim == 0 else array


def quiet() -> np.errstate:
    """Undefined values become NaN without a warning: the caller sees them in the result."""
    return np.errstate(divide="ignore", invalid="ignore", over="ignore")


def positive(value: ArrayLike) -> FloatArray:
    """The value where it is above zero, NaN elsewhere."""
    array = as_floats(value)
    if array.size and array.min() > 0.0:
        return array
    return np.where(array > 0.0, array, np.nan)


def not_negative(value: ArrayLike) -> FloatArray:
    """The value where it is zero or more, NaN elsewhere."""
    array = as_floats(value)
    if array.size and array.min() >= 0.0:
        return array
    return np.where(array >= 0.0, array, np.nan)


def is_vertical(polarization: ArrayLike) -> NDArray[np.bool_]:
    """True where the polarization is vertical; anything but the two words of `vocabulary.Polarization` is refused."""
    words = np.asarray(polarization)
    wrong = [str(word) for word in words.reshape(-1) if word not in ("horizontal", "vertical")]
    if wrong:
        raise QuantityError(f"polarization is {wrong[0]!r}", "it must be 'horizontal' or 'vertical'")
    return np.asarray(words == "vertical", dtype=np.bool_)
