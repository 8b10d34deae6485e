"""Climate figures as a study gives them: all optional, checked when made."""

import math
from dataclasses import dataclass, fields
from typing import Final

from fellspan.errors import QuantityError

_LIMITS: Final = {
    "rain_rate_001_mm_h": ("rain rate at 0.01 %", 0.0, 400.0, "mm/h"),
    "dn1_n_per_km": ("dn1", -2000.0, 0.0, "N/km"),
    "dn75": ("dn75", 0.0, 200.0, "N-units over 75 m"),
    "log_k": ("log K", -12.0, 2.0, ""),
    "terrain_roughness_m": ("terrain roughness", 0.0, 4000.0, "m"),
    "gradient_median_n_per_km": ("median gradient", -500.0, 300.0, "N/km"),
    "gradient_tail_n_per_km": ("gradient at 99.9 %", -300.0, 1000.0, "N/km"),
    "temperature_c": ("temperature", -90.0, 60.0, "degrees Celsius"),
    "total_pressure_hpa": ("pressure", 300.0, 1100.0, "hPa"),
    "vapour_g_m3": ("water vapour", 0.0, 50.0, "g/m3"),
    "rain_height_m": ("rain height", -1000.0, 7000.0, "m"),
    "altitude_m": ("height of the place", -500.0, 9000.0, "m"),
}
"""What can be on Earth, and unlikely to be a slip of units: our own choice, no source."""


@dataclass(frozen=True, slots=True, kw_only=True)
class GivenClimate:
    """What the study says of the climate; None where it says nothing.

    Parameters
    ----------
    rain_rate_001_mm_h
        Rain rate exceeded for 0.01 % of an average year, one-minute values, 0 to 400 mm/h.
    monthly_rain_mm, monthly_temperature_c
        Twelve means each, January to December; both or neither. They serve where no rain rate is given.
    dn1_n_per_km, dn75, log_k, terrain_roughness_m, gradient_median_n_per_km, gradient_tail_n_per_km, rain_height_m
        As in `ClimateFigures`.
    temperature_c
        Annual mean near the ground, degrees Celsius.
    total_pressure_hpa
        Pressure at the place itself, not reduced to sea level.
    vapour_g_m3
        Density of water vapour, annual mean.
    altitude_m
        Height of the place above sea level, m; pressure, and the air where nothing better is known, follow from it.

    Raises
    ------
    QuantityError
        A figure is not finite or outside what there is on Earth, there are not twelve months, or one list lacks the other.
    """

    rain_rate_001_mm_h: float | None = None
    monthly_rain_mm: tuple[float, ...] | None = None
    monthly_temperature_c: tuple[float, ...] | None = None
    dn1_n_per_km: float | None = None
    dn75: float | None = None
    log_k: float | None = None
    terrain_roughness_m: float | None = None
    gradient_median_n_per_km: float | None = None
    gradient_tail_n_per_km: float | None = None
    temperature_c: float | None = None
    total_pressure_hpa: float | None = None
    vapour_g_m3: float | None = None
    rain_height_m: float | None = None
    altitude_m: float | None = None

    def __post_init__(self) -> None:
        for field in fields(self):
            value = getattr(self, field.name)
            if value is not None and field.name in _LIMITS:
                object.__setattr__(self, field.name, _checked(float(value), *_LIMITS[field.name]))
        self._check_months()
        median, tail = self.gradient_median_n_per_km, self.gradient_tail_n_per_km
        if median is not None and tail is not None and tail <= median:
            raise QuantityError(
                f"the gradient at 99.9 % is {tail:g} N/km, not above the median of {median:g} N/km",
                "it is the gradient that is not exceeded for 99.9 % of the time; low k means a high gradient",
            )

    def _check_months(self) -> None:
        rain, temperature = self.monthly_rain_mm, self.monthly_temperature_c
        if (rain is None) != (temperature is None):
            raise QuantityError(
                f"monthly {'temperature' if temperature is None else 'rain'} is missing",
                "the rain rate needs both monthly rain in mm and monthly mean temperature in degrees Celsius",
            )
        for name, values, low, high, unit in (
            ("monthly rain", rain, 0.0, 3000.0, "mm"),
            ("monthly temperature", temperature, -90.0, 60.0, "degrees Celsius"),
        ):
            if values is None:
                continue
            if len(values) != 12:
                raise QuantityError(f"{name} has {len(values)} values", "give twelve, January to December")
            for value in values:
                _checked(float(value), name, low, high, unit)
        if rain is not None and temperature is not None:
            object.__setattr__(self, "monthly_rain_mm", tuple(map(float, rain)))
            object.__setattr__(self, "monthly_temperature_c", tuple(map(float, temperature)))


def _checked(value: float, name: str, low: float, high: float, unit: str) -> float:
    if not (math.isfinite(value) and low <= value <= high):
        raise QuantityError(
            f"{name} is {value:g} {unit}".rstrip(), f"it must be between {low:g} and {high:g} {unit}".rstrip()
        )
    return value
