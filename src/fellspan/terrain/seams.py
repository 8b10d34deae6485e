"""How far rasters that overlap disagree: measured, said, and refused where their errors cannot explain it.

Knows differences and names; reads no raster.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from fellspan.errors import SeamError

_MOST_POINTS = 64
_FEWEST_POINTS = 5
_SIGMAS = 3.0
_ALWAYS_ALLOWED_M = 1.0
_SILENT_M = 0.05
"""Tiles of one folder that agree so well are not worth a line."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Seam:
    """The step from raster `first`, the finer one, to `second` where both have data, over `points` places."""

    first: str
    second: str
    median_m: float
    p95_m: float
    """95th percentile of the absolute difference."""
    points: int
    allowed_m: float
    """What the errors of both explain: 3 combined standard errors, 1 m at least."""
    siblings: bool
    """True for tiles of one folder."""

    @property
    def is_refused(self) -> bool:
        """True where the step is systematic and beyond what is allowed."""
        return self.points >= _FEWEST_POINTS and abs(self.median_m) > self.allowed_m

    def __str__(self) -> str:
        return (
            f"where {self.first} and {self.second} overlap, the second is {abs(self.median_m):.1f} m "
            f"{'higher' if self.median_m >= 0 else 'lower'} in the median, and 95 % agree within {self.p95_m:.1f} m "
            f"({self.points} points)"
        )


def spread(wanted: NDArray[np.bool_], most: int = _MOST_POINTS) -> NDArray[np.int64]:
    """Indices of at most `most` of the wanted points, evenly among them."""
    found = np.flatnonzero(wanted)
    if found.size <= most:
        return found
    return found[np.linspace(0, found.size - 1, most).astype(np.int64)]


def allowed_m(first_error_m: ArrayLike, second_error_m: ArrayLike) -> NDArray[np.float64]:
    """How far two rasters of such errors may disagree, m: 3 combined standard errors, 1 m at least."""
    return np.asarray(np.maximum(_ALWAYS_ALLOWED_M, _SIGMAS * np.hypot(first_error_m, second_error_m)))


def seam_of(
    names: tuple[str, str], step_m: NDArray[np.float64], *, errors_m: tuple[float, float], siblings: bool
) -> Seam | None:
    """The seam that differences (second less first) show; None where no point has both."""
    both = step_m[np.isfinite(step_m)]
    if both.size == 0:
        return None
    return Seam(
        first=names[0],
        second=names[1],
        median_m=float(np.median(both)),
        p95_m=float(np.percentile(np.abs(both), 95.0)),
        points=int(both.size),
        allowed_m=float(allowed_m(*errors_m)),
        siblings=siblings,
    )


class SeamBook:
    """The worst seam met for each pair of rasters."""

    def __init__(self) -> None:
        self._worst: dict[tuple[str, str], Seam] = {}

    def add(
        self, names: tuple[str, str], step_m: NDArray[np.float64], *, errors_m: tuple[float, float], siblings: bool
    ) -> None:
        """Enter what was measured between two rasters."""
        seam = seam_of(names, step_m, errors_m=errors_m, siblings=siblings)
        if seam is not None:
            self._enter(seam)

    def keep(self, other: "SeamBook") -> None:
        """Take over the seams of another book where they are worse."""
        for seam in other._worst.values():
            self._enter(seam)

    def seams(self) -> tuple[Seam, ...]:
        """All seams, in an order that does not depend on when they were met."""
        return tuple(self._worst[key] for key in sorted(self._worst))

    def notes(self) -> tuple[str, ...]:
        """A line for each seam worth one."""
        return tuple(str(seam) for seam in self.seams() if not (seam.siblings and seam.p95_m < _SILENT_M))

    def refuse(self) -> None:
        """Raise SeamError for the first seam that the rasters' errors do not explain."""
        for seam in self.seams():
            if seam.is_refused:
                raise SeamError(
                    f"{seam.first} and {seam.second} disagree by {abs(seam.median_m):.1f} m where they overlap",
                    f"allowed is {seam.allowed_m:.1f} m, three standard errors of both; median of {seam.points} points",
                    "is one in feet, above another datum, or a surface model? correct its declaration or leave it out,",
                    'or state the larger error of the worse one, as in error = "3 m"',
                )

    def _enter(self, seam: Seam) -> None:
        key = (seam.first, seam.second)
        known = self._worst.get(key)
        if known is None or (abs(seam.median_m), seam.p95_m, seam.points) > (
            abs(known.median_m),
            known.p95_m,
            known.points,
        ):
            self._worst[key] = seam
