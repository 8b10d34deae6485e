"""Mounting: where an antenna points, how it is turned about its boresight, and what wrong aim or polarisation costs."""

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from fellspan.antennas.pattern import Pattern
from fellspan.errors import AntennaError
from fellspan.vocabulary import MountedPolarization

FIELD_ANGLE_DEG: dict[MountedPolarization, float] = {
    "vertical": 90.0,
    "slant+45": 45.0,
    "horizontal": 0.0,
    "slant-45": -45.0,
}
"""Angle of the electric field above the horizontal, degrees, seen from behind the antenna; 'dual' has two and is not here."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Mounting:
    """How an antenna hangs on its mast.

    Parameters
    ----------
    bearing_deg
        True bearing of the boresight, degrees, 0 to 360.
    tilt_deg
        Of the boresight, degrees, up is positive; mechanical. Electrical downtilt belongs to the pattern.
    polarization
        'vertical', 'horizontal', 'slant+45', 'slant-45' or 'dual'.
    roll_deg
        Turn about the boresight against the intended polarisation, degrees, clockwise seen from behind; a mounting fault.

    Raises
    ------
    AntennaError
        A value is out of range.
    """

    bearing_deg: float
    tilt_deg: float = 0.0
    polarization: MountedPolarization = "vertical"
    roll_deg: float = 0.0

    def __post_init__(self) -> None:
        if not (math.isfinite(self.bearing_deg) and 0.0 <= self.bearing_deg <= 360.0):
            raise AntennaError(f"antenna bearing {self.bearing_deg:g} degrees is outside 0 to 360")
        if not (math.isfinite(self.tilt_deg) and -90.0 <= self.tilt_deg <= 90.0):
            raise AntennaError(f"antenna tilt {self.tilt_deg:g} degrees is outside -90 (down) to 90 (up)")
        if not (math.isfinite(self.roll_deg) and -180.0 <= self.roll_deg <= 180.0):
            raise AntennaError(f"antenna roll {self.roll_deg:g} degrees is outside -180 to 180")


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Mountings:
    """Many ways to hang one kind of antenna: a `Mounting` whose bearing and tilt are arrays of one shape, in its ranges."""

    bearing_deg: NDArray[np.float64]
    tilt_deg: NDArray[np.float64]
    polarization: MountedPolarization
    roll_deg: float = 0.0


def off_boresight_deg(
    mounting: Mounting | Mountings, bearing_deg: ArrayLike, elevation_deg: ArrayLike, *, turn_deg: float = 0.0
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Azimuth and elevation off the boresight, in the antenna's own frame, of directions given on the ground.

    Parameters
    ----------
    mounting
        Boresight and roll; many of them broadcast with the directions.
    bearing_deg, elevation_deg
        True bearing and elevation of the directions, degrees; broadcast together.
    turn_deg
        Further turn about the boresight, degrees, clockwise seen from behind (a quarter turn for horizontal polarisation).

    Returns
    -------
    azimuth_deg, elevation_deg
        Shape of the inputs together; azimuth -180 to 180.
    """
    across = np.radians(np.asarray(bearing_deg, dtype=np.float64) - mounting.bearing_deg)
    up = np.radians(np.asarray(elevation_deg, dtype=np.float64))
    ahead, right, high = np.cos(up) * np.cos(across), np.cos(up) * np.sin(across), np.sin(up) + 0.0 * across
    tilt = np.radians(mounting.tilt_deg)
    ahead, high = ahead * np.cos(tilt) + high * np.sin(tilt), high * np.cos(tilt) - ahead * np.sin(tilt)
    roll = math.radians(mounting.roll_deg + turn_deg)
    right, high = right * math.cos(roll) - high * math.sin(roll), high * math.cos(roll) + right * math.sin(roll)
    azimuth = np.degrees(np.arctan2(right, ahead))
    elevation = np.degrees(np.arctan2(high, np.hypot(ahead, right)))
    return np.asarray(azimuth), np.asarray(elevation)


def turn_for(pattern: Pattern, polarization: MountedPolarization) -> float:
    """Turn about the boresight, degrees clockwise, that gives a pattern the polarisation.

    0 where its planes stay put: a sector for horizontal polarisation hangs upright like one for vertical, fed otherwise,
    and its data hold as they are. A Yagi or a dish is turned, and its planes with it.
    """
    if not pattern.turns or polarization == "dual":
        return 0.0
    built = 90.0 if pattern.electric_plane == "vertical" else 0.0
    return built - FIELD_ANGLE_DEG[polarization]


def refuse_unfit(pattern: Pattern, mounting: Mounting | Mountings) -> None:
    """Refuse a polarisation that the antenna cannot have, however it is mounted.

    Raises
    ------
    AntennaError
        For instance a collinear omni asked for horizontal polarisation: laid down, it is no omni.
    """
    possible = pattern.polarizations
    if possible is not None and mounting.polarization not in possible:
        raise AntennaError(
            f"antenna '{pattern.name}' cannot be mounted for polarisation '{mounting.polarization}'",
            f"it can be {', '.join(possible)}",
        )


def gain_toward_dbi(
    pattern: Pattern, mounting: Mounting | Mountings, bearing_deg: ArrayLike, elevation_deg: ArrayLike
) -> NDArray[np.float64] | float:
    """Co-polar gain of a mounted antenna toward true bearings and elevations, dBi; AntennaError as in `refuse_unfit`."""
    refuse_unfit(pattern, mounting)
    azimuth, elevation = off_boresight_deg(
        mounting, bearing_deg, elevation_deg, turn_deg=turn_for(pattern, mounting.polarization)
    )
    return pattern.gain_dbi(azimuth, elevation)


def cross_gain_toward_dbi(
    pattern: Pattern, mounting: Mounting | Mountings, bearing_deg: ArrayLike, elevation_deg: ArrayLike
) -> NDArray[np.float64] | float:
    """Cross-polar gain of a mounted antenna toward true bearings and elevations, dBi; AntennaError as in `refuse_unfit`."""
    refuse_unfit(pattern, mounting)
    azimuth, elevation = off_boresight_deg(
        mounting, bearing_deg, elevation_deg, turn_deg=turn_for(pattern, mounting.polarization)
    )
    return pattern.cross_gain_dbi(azimuth, elevation)


def field_angle_between_deg(a: Mounting | Mountings, b: Mounting | Mountings) -> float:
    """Angle between the electric fields of two antennas that face each other, degrees, 0 to 90; 0 where one is dual."""
    if "dual" in (a.polarization, b.polarization):
        return 0.0
    # Seen from behind A, B faces us: its own left is our right, so its field angle and its roll change sign.
    field_a = FIELD_ANGLE_DEG[a.polarization] - a.roll_deg
    field_b = 180.0 - (FIELD_ANGLE_DEG[b.polarization] - b.roll_deg)
    apart = abs(field_a - field_b) % 180.0
    return min(apart, 180.0 - apart)


def polarization_loss_db(
    angle_deg: ArrayLike, *, discrimination_a_db: ArrayLike = math.inf, discrimination_b_db: ArrayLike = math.inf
) -> NDArray[np.float64] | float:
    """Loss from fields that stand at an angle to each other.

    Parameters
    ----------
    angle_deg
        Angle between the two linear polarisations, degrees.
    discrimination_a_db, discrimination_b_db
        Cross-polar discrimination of each antenna, dB; what leaks limits the loss at right angles.

    Returns
    -------
    loss_db
        0 where they agree; -20 log cos(angle) for perfect antennas.

    Notes
    -----
    Malus's law in amplitude; the leaked powers of both antennas add on average.
    """
    angle = np.radians(np.asarray(angle_deg, dtype=np.float64))
    leak = 10.0 ** (-np.asarray(discrimination_a_db) / 10.0) + 10.0 ** (-np.asarray(discrimination_b_db) / 10.0)
    power = np.minimum(np.cos(angle) ** 2 + np.sin(angle) ** 2 * leak, 1.0)
    loss = -10.0 * np.log10(np.maximum(power, 1e-30)) + 0.0  # no minus before a nought
    return float(loss) if loss.ndim == 0 else loss


def combined_discrimination_db(first_db: ArrayLike, second_db: ArrayLike) -> NDArray[np.float64] | float:
    """Discrimination left when two leaks add in phase, the worst case, dB: 30 and 30 leave 23.98."""
    total = 10.0 ** (-np.asarray(first_db, dtype=np.float64) / 20.0) + 10.0 ** (
        -np.asarray(second_db, dtype=np.float64) / 20.0
    )
    left = -20.0 * np.log10(total)
    return float(left) if left.ndim == 0 else np.asarray(left)


@dataclass(frozen=True, slots=True, kw_only=True)
class PointingLoss:
    """Loss of one end from aim and sway, dB: on average in power, and not exceeded for 50, 90, 99 and 99.9 % of the time."""

    mean_db: float
    median_db: float
    p90_db: float
    p99_db: float
    p999_db: float


def pointing_loss(
    pattern: Pattern,
    *,
    azimuth_sigma_deg: float,
    elevation_sigma_deg: float,
    azimuth_offset_deg: float = 0.0,
    elevation_offset_deg: float = 0.0,
) -> PointingLoss:
    """What a steady error of aim and a normally distributed sway cost, from the pattern itself.

    Parameters
    ----------
    pattern
        In its own frame.
    azimuth_sigma_deg, elevation_sigma_deg
        Standard deviation of mast twist and sway, degrees, >= 0.
    azimuth_offset_deg, elevation_offset_deg
        Steady error of aim, degrees.

    Returns
    -------
    loss
        Relative to the gain on the boresight.

    Raises
    ------
    AntennaError
        A standard deviation is negative or not finite.

    Notes
    -----
    Deterministic: both normal errors on 361 even steps to 4.5 standard deviations, weighed by the normal density. For small
    errors it tends to the Gaussian lobe's 12 (off-axis / HPBW)^2 dB.
    """
    for label, sigma in (("azimuth", azimuth_sigma_deg), ("elevation", elevation_sigma_deg)):
        if not (math.isfinite(sigma) and sigma >= 0.0):
            raise AntennaError(f"{label} sway {sigma:g} degrees must be 0 or more")
    normal = np.linspace(-4.5, 4.5, 361)
    weight = np.exp(-0.5 * (normal[:, None] ** 2 + normal[None, :] ** 2)).ravel()
    azimuth = azimuth_offset_deg + azimuth_sigma_deg * normal
    elevation = elevation_offset_deg + elevation_sigma_deg * normal
    gain = np.asarray(pattern.gain_dbi(azimuth[:, None], elevation[None, :])).ravel()
    loss = float(np.asarray(pattern.gain_dbi(0.0, 0.0))) - gain
    order = np.argsort(loss)
    share = np.cumsum(weight[order]) - 0.5 * weight[order]
    median, p90, p99, p999 = (float(np.interp(q * weight.sum(), share, loss[order])) for q in (0.5, 0.9, 0.99, 0.999))
    mean = -10.0 * math.log10(float(np.average(10.0 ** (-loss / 10.0), weights=weight)))
    return PointingLoss(mean_db=mean, median_db=median, p90_db=p90, p99_db=p99, p999_db=p999)
