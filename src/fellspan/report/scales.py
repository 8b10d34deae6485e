"""Scales, ticks, decimation and the placing of labels for drawings. Pure geometry: knows nothing of radio."""

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray


@dataclass(frozen=True, slots=True, kw_only=True)
class Scale:
    """A straight map from a value to a place on the sheet."""

    from_value: float
    to_value: float
    from_px: float
    to_px: float

    @property
    def px_per_unit(self) -> float:
        """Sheet units for one unit of the value, never negative."""
        return abs((self.to_px - self.from_px) / (self.to_value - self.from_value))

    def at(self, value: float) -> float:
        """Place of one value."""
        share = (value - self.from_value) / (self.to_value - self.from_value)
        return self.from_px + share * (self.to_px - self.from_px)

    def all(self, values: NDArray[np.float64]) -> list[float]:
        """Places of many values."""
        share = (values - self.from_value) / (self.to_value - self.from_value)
        places: list[float] = (self.from_px + share * (self.to_px - self.from_px)).tolist()
        return places


def nice_step(span: float, most: int) -> float:
    """The least of 1, 2, 5 times a power of ten that divides `span` into at most `most` parts."""
    raw = span / max(1, most)
    power = 10.0 ** math.floor(math.log10(raw))
    return next(power * factor for factor in (1.0, 2.0, 5.0, 10.0) if power * factor >= raw * (1.0 - 1e-9))


def nice_ticks(low: float, high: float, most: int) -> list[float]:
    """Round values from `low` to `high`, at most about `most`."""
    step = nice_step(high - low, most)
    first = math.ceil(low / step - 1e-9)
    last = math.floor(high / step + 1e-9)
    return [index * step for index in range(first, last + 1)]


def keep_peaks(
    distance_m: NDArray[np.float64], *, columns: int, peaks: tuple[NDArray[np.float64], ...], exact: tuple[int, ...]
) -> NDArray[np.intp]:
    """Indices that a drawing of `columns` columns needs so that no peak or hollow is lost.

    For each column the first sample, and where each array of `peaks` is highest and lowest; both ends and the indices in
    `exact` always. Samples that are NaN in the first array of `peaks` are left out.
    """
    usable = np.flatnonzero(np.isfinite(peaks[0]))
    if usable.size <= 2 * columns:
        return np.unique(np.concatenate([usable, np.asarray(exact, dtype=np.intp)]))
    column = np.minimum((distance_m[usable] / distance_m[-1] * columns).astype(np.intp), columns - 1)
    starts = np.flatnonzero(np.r_[True, np.diff(column) > 0])
    kept = [np.array([usable[0], usable[-1], *exact], dtype=np.intp), usable[starts]]
    for values in peaks:
        order = np.lexsort((values[usable], column))
        kept.append(usable[order[starts]])
        kept.append(usable[order[np.r_[starts[1:] - 1, order.size - 1]]])
    return np.unique(np.concatenate(kept)).astype(np.intp)


def text_width(content: str, size: float) -> float:
    """A careful estimate of the width of a line of text: wide scripts count in full."""
    units = sum(
        1.0 if ord(char) > 0x2E7F else 0.68 if char.isupper() or ord(char) > 0x24F else 0.56 for char in content
    )
    return units * size


@dataclass(frozen=True, slots=True, kw_only=True)
class Wanted:
    """A label that wants to stand above a place, with a leader down to it."""

    at: float
    width: float


@dataclass(frozen=True, slots=True, kw_only=True)
class Placed:
    """Where it goes: `lane` 0 is the lowest; the text reaches from `start` to `end`; its leader stands at `at`."""

    at: float
    lane: int
    start: float
    end: float
    flipped: bool


def place_labels(
    wanted: list[Wanted], *, low: float, high: float, lanes: int, through: tuple[float, ...] = (), gap: float = 5.0
) -> list[Placed | None]:
    """Give each label a lane so that neither texts nor leaders cross; None where there is no room.

    First come, first served. `through` are places of lines that pass through every lane.
    """
    placed: list[Placed] = []
    answer: list[Placed | None] = []
    for want in wanted:
        found = None
        # Names stand to the right of their leader wherever a lane allows it, so that the eye learns one habit.
        for flipped, lane in ((flip, lane) for flip in (False, True) for lane in range(lanes)):
            start = want.at - gap - want.width if flipped else want.at + gap
            spot = Placed(at=want.at, lane=lane, start=start, end=start + want.width, flipped=flipped)
            free = all(not spot.start - gap < x < spot.end + gap and abs(spot.at - x) > 2.0 for x in through)
            inside = spot.start >= low and spot.end <= high
            if free and inside and all(_apart(spot, other, gap) for other in placed):
                found = spot
                break
        answer.append(found)
        if found:
            placed.append(found)
    return answer


def _apart(one: Placed, other: Placed, gap: float) -> bool:
    if one.lane == other.lane:
        return min(one.start, one.at) - gap > max(other.end, other.at) or max(one.end, one.at) + gap < min(
            other.start, other.at
        )
    upper, lower = (one, other) if one.lane > other.lane else (other, one)
    return not lower.start - gap < upper.at < lower.end + gap and abs(upper.at - lower.at) > 2.0
