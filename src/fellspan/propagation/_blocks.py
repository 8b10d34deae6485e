"""Batches in pieces that stay in the near caches; knows no physics."""

import math
from collections.abc import Iterator
from typing import Final

from fellspan.propagation._arrays import FloatArray

BLOCK: Final = 1 << 15
"""Samples (times what each is worked out for) in one piece; a few temporaries of that many doubles fit a second-level cache."""


def in_blocks(
    shape: tuple[int, ...],
    profiles: tuple[FloatArray, ...],
    values: tuple[FloatArray, ...],
) -> Iterator[tuple[slice, tuple[FloatArray, ...], tuple[FloatArray, ...]]]:
    """Pieces along the first axis of a result, each with what belongs to it.

    Parameters
    ----------
    shape
        Of the result.
    profiles, values
        Arrays that broadcast to `shape`, the profiles with one axis more at their end, the samples.

    Yields
    ------
    piece, profiles, values
        The slice of the first axis, and views of the arrays, all with the axes of the result.
    """
    profiles = tuple(_with_axes(array, len(shape) + 1) for array in profiles)
    values = tuple(_with_axes(array, len(shape)) for array in values)
    samples = max(array.shape[-1] for array in profiles)
    if not shape or math.prod(shape) * samples <= BLOCK:
        yield slice(None), profiles, values
        return
    rows = max(1, BLOCK // (samples * math.prod(shape[1:])))
    for start in range(0, shape[0], rows):
        piece = slice(start, start + rows)
        yield (
            piece,
            tuple(array if array.shape[0] == 1 else array[piece] for array in profiles),
            tuple(array if array.shape[0] == 1 else array[piece] for array in values),
        )


def _with_axes(array: FloatArray, axes: int) -> FloatArray:
    return array.reshape((1,) * (axes - array.ndim) + array.shape)
