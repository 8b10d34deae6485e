"""What readings of different hours and water levels say: whether the level swings, and with which of both.

Works on readings alone; knows no causes but whether they are steady.
"""

import math
from typing import Final

import numpy as np

from fellspan.design.acceptance_hypotheses import ENDS, Numbers, Varies
from fellspan.design.as_built import moments_of

READ_AGAIN_DB: Final = 1.1
"""Standard deviation of a reading repeated on a steady link (common practice, no source)."""
RANGE_OF: Final = (0.0, 0.0, 1.13, 1.69, 2.06, 2.33, 2.53, 2.70, 2.85, 2.97, 3.08)
"""Mean range of so many readings, in standard deviations (tables of the range of normal samples, from memory)."""
LONG_HOURS, MUCH_WATER_M = 5.0, 0.4
"""Readings that stand over less than this say nothing for a level being steady (our own figures)."""


def swing_factors(numbers: Numbers) -> dict[str, float]:
    """Factor on the weight of causes that are steady, that vary with the hour and that vary with the water."""
    chains, each = numbers.link.radio.chains, numbers.built.levels_are == "each chain"
    found = [moments_of(numbers.built.at(end), chains=chains, each=each) for end in ENDS]
    found = [moments for moments in found if len(moments) > 1]
    factors: dict[str, float] = {}
    if not found:
        return factors
    swings = [max(level for _, _, level in moments) - min(level for _, _, level in moments) for moments in found]
    swing, count = sum(swings) / len(swings), max(len(moments) for moments in found)
    usual = RANGE_OF[min(count, len(RANGE_OF) - 1)] * READ_AGAIN_DB
    steady = max(_bell(swing, usual, 0.9), 1e-6)
    varying = _bell(swing, 9.0, 6.0) + (0.01 if swing > usual + 2.0 else 0.0)
    better = varying / steady
    hours = [hour for moments in found for hour, _, _ in moments if hour is not None]
    waters = [water for moments in found for _, water, _ in moments if water is not None]
    long = bool(hours) and max(hours) - min(hours) >= LONG_HOURS
    much = bool(waters) and max(waters) - min(waters) >= MUCH_WATER_M
    if better < 1.0 and not (long or much):
        return factors
    better = min(max(better, 0.03), 1e4)
    hour_is: Varies = "with the hour"
    water_is: Varies = "with the water"
    factors[hour_is] = factors[water_is] = better
    tied = _tied_to_water(found)
    if better > 1.0 and tied is not None:
        factors[water_is] *= 3.0 if tied > 0.8 else 0.3
        factors[hour_is] *= 0.4 if tied > 0.8 else 2.0
    return factors


def _tied_to_water(found: list[list[tuple[float | None, float | None, float]]]) -> float | None:
    """Share of the swing that a curve over the water level explains, 0 to 1; None where too little was read of it."""
    shares = []
    for moments in found:
        pairs = [(water, level) for _, water, level in moments if water is not None]
        if len(pairs) < 4 or max(pairs)[0] - min(pairs)[0] < MUCH_WATER_M:
            continue
        water, level = np.array(pairs).T
        left = level - np.polyval(np.polyfit(water, level, 1), water)
        whole = float(np.sum((level - level.mean()) ** 2))
        shares.append(1.0 - float(np.sum(left**2)) / whole if whole > 0.0 else 0.0)
    return sum(shares) / len(shares) if shares else None


def _bell(value: float, middle: float, spread: float) -> float:
    return math.exp(-0.5 * ((value - middle) / spread) ** 2) / (spread * math.sqrt(2.0 * math.pi))
