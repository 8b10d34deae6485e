"""Wind on an antenna: force, moment on its mast arm, and drag coefficients by shape with how far each can be trusted.

Pure arithmetic; knows no antennas, masts or codes. It compares antennas; a structure is for licensed practice.
"""

from dataclasses import dataclass
from typing import Final, Literal

import numpy as np
from numpy.typing import ArrayLike, NDArray

from fellspan.errors import QuantityError

AIR_DENSITY_KG_M3: Final = 1.225
"""Of the standard atmosphere at sea level, 15 degrees Celsius."""

Shape = Literal["solid dish", "grid dish", "flat plate", "long plate", "rods"]


@dataclass(frozen=True, slots=True, kw_only=True)
class Drag:
    """A drag coefficient, dimensionless, for the area from the front; where it comes from, and whether that was seen."""

    coefficient: float
    source: str
    confirmed: bool


DRAG: Final[dict[Shape, Drag]] = {
    "solid dish": Drag(coefficient=1.5, source="upper end of 1.2 to 1.5, common practice, no source", confirmed=False),
    "grid dish": Drag(coefficient=1.0, source="on the area of the rods, common practice, no source", confirmed=False),
    "flat plate": Drag(
        coefficient=1.17, source="square plate or disc across the wind, Hoerner, Fluid-Dynamic Drag", confirmed=True
    ),
    "long plate": Drag(coefficient=1.4, source="plate several times as long as wide, from memory", confirmed=False),
    "rods": Drag(coefficient=1.2, source="long round rod below the critical speed, from memory", confirmed=False),
}
"""By shape. Only what was seen in its source is `confirmed`; the rest serves to compare, not to build by."""

WORST_ANGLE: Final = (
    "The force is that of wind from the front, without ice; the worst angle for a dish is often 50 to 60 degrees off, "
    "and there it twists the mast too, which is not counted here."
)


def wind_force_n(
    area_m2: ArrayLike, *, speed_m_s: ArrayLike, drag_coefficient: ArrayLike
) -> NDArray[np.float64] | float:
    """Force of a wind from the front.

    Parameters
    ----------
    area_m2
        Wind-loaded area from the front, m2, >= 0.
    speed_m_s
        Gust at the height of the antenna, m/s, >= 0.
    drag_coefficient
        Dimensionless, > 0; see `DRAG`.

    Returns
    -------
    force_n
        N; shape of the inputs together.

    Raises
    ------
    QuantityError
        A value is negative or not finite.

    Notes
    -----
    F = 1/2 rho v^2 Cd A with rho = 1.225 kg/m3 (fluid dynamics, any textbook). No ice, no shielding, no gust factor.
    """
    area, speed, drag = (np.asarray(value, dtype=np.float64) for value in (area_m2, speed_m_s, drag_coefficient))
    for label, array, unit in (("area", area, " m2"), ("wind speed", speed, " m/s"), ("drag coefficient", drag, "")):
        wrong = ~(np.isfinite(array) & (array >= 0.0))
        if wrong.any():
            raise QuantityError(f"{label} {float(array[wrong].flat[0]):g}{unit} must be 0 or more")
    force = 0.5 * AIR_DENSITY_KG_M3 * speed**2 * drag * area
    return float(force) if force.ndim == 0 else force


def wind_moment_nm(force_n: ArrayLike, *, arm_m: ArrayLike) -> NDArray[np.float64] | float:
    """Bending moment of a force about the last support of the mast, N m; `arm_m` is the height of the antenna above it, m."""
    arm = np.asarray(arm_m, dtype=np.float64)
    if (~(np.isfinite(arm) & (arm >= 0.0))).any():
        raise QuantityError(
            f"mast arm {float(np.max(np.where(np.isfinite(arm), arm, np.inf))):g} m must be 0 m or more"
        )
    moment = np.asarray(force_n, dtype=np.float64) * arm
    return float(moment) if moment.ndim == 0 else moment


def shape_of(kind: str, *, grid: bool = False, width_m: float = 1.0, height_m: float = 1.0) -> Shape:
    """The shape that wind meets, from the kind of an antenna of the catalogue and its size.

    Kinds without a clear shape count as plates, the larger coefficient where they are long.
    """
    if kind == "dish":
        return "grid dish" if grid else "solid dish"
    if kind in ("yagi", "dipole", "omni"):
        return "rods"
    long, short = max(width_m, height_m), min(width_m, height_m)
    return "long plate" if long > LONG_FROM * short else "flat plate"


LONG_FROM: Final = 2.0
"""A plate counts as long from this ratio of its sides on (our own rule)."""
