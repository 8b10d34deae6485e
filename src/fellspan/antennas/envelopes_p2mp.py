"""Reference envelopes of ITU-R F.1336-5: omni, sector and low-gain antennas, for interference work.

The text was read in quotation only; the formulas agree in two independent open implementations.
"""

import math
from typing import Literal

import numpy as np
from numpy.typing import ArrayLike, NDArray

from fellspan.antennas.parts import check, wavelength_m
from fellspan.antennas.pattern import AmplitudeFunction, Pattern

SideLobes = Literal["peak", "average"]
Quality = Literal["typical", "improved"]

_SOURCE = "ITU-R F.1336-5 (formulas agree in two independent implementations; text read in quotation)"


def f1336_omni_gain_dbi(
    elevation_deg: ArrayLike,
    *,
    peak_gain_dbi: float,
    side_lobes: SideLobes = "peak",
    k: float = 0.7,
    downtilt_deg: float = 0.0,
) -> NDArray[np.float64] | float:
    """Omni, recommends 2.

    Parameters
    ----------
    elevation_deg
        Above the horizon, degrees, -90 to 90; any shape.
    peak_gain_dbi
        Verified by ITU-R for 8 to 13 dBi.
    side_lobes
        'peak' envelope or 'average' side lobes.
    k
        0.7 typical (0.4 to 3 GHz), 0 improved side lobes.
    downtilt_deg
        Electrical, beam below the horizon all around.
    """
    angle = np.asarray(elevation_deg, dtype=np.float64)
    if downtilt_deg:
        lowered = angle + downtilt_deg
        angle = 90.0 * lowered / np.where(lowered >= 0.0, 90.0 + downtilt_deg, 90.0 - downtilt_deg)
    width = 107.6 * 10.0 ** (-0.1 * peak_gain_dbi)
    x = np.abs(angle) / width
    floor = math.log10(k + 1.0)
    if side_lobes == "peak":
        lobe_from, lobe_to, level = math.sqrt(1.0 - floor / 1.2), 1.0, peak_gain_dbi - 12.0
    else:
        lobe_from, lobe_to, level = 1.0, math.sqrt(1.25 + floor / 1.2), peak_gain_dbi - 15.0
        # Between the beam's edge and theta_5 the average law is level; the beam's own law holds up to the edge.
    main = peak_gain_dbi - 12.0 * x**2
    far = level + 10.0 * np.log10(np.maximum(x, 1e-9) ** -1.5 + k)
    gain = np.select([np.isnan(x), x < lobe_from, x < lobe_to], [np.nan, main, level + 10.0 * floor], far)
    return float(gain) if gain.ndim == 0 else gain


def f1336_sector_gain_dbi(
    azimuth_deg: ArrayLike,
    elevation_deg: ArrayLike,
    *,
    peak_gain_dbi: float,
    azimuth_width_deg: float,
    side_lobes: SideLobes = "peak",
    quality: Quality = "typical",
    elevation_width_deg: float | None = None,
) -> NDArray[np.float64] | float:
    """Sector for 0.4 to 6 GHz, recommends 3.

    Parameters
    ----------
    azimuth_deg, elevation_deg
        Off the boresight, degrees; broadcast together.
    peak_gain_dbi, azimuth_width_deg
        Gain and half-power width in azimuth.
    side_lobes, quality
        'peak' or 'average'; 'typical' or 'improved' side lobes.
    elevation_width_deg
        Half-power width in elevation; None takes 31 000 10^(-G/10) / azimuth width.
    """
    kh, kv = (0.8, 0.7) if quality == "typical" else (0.7, 0.3)
    back_k = 0.7
    height = 31000.0 * 10.0 ** (-0.1 * peak_gain_dbi) / azimuth_width_deg
    height = height if elevation_width_deg is None else elevation_width_deg
    azimuth, elevation = np.broadcast_arrays(
        np.asarray(azimuth_deg, dtype=np.float64), np.asarray(elevation_deg, dtype=np.float64)
    )
    level = -12.0 if side_lobes == "peak" else -15.0
    back = level + 10.0 * math.log10(1.0 + 8.0 * back_k) - 15.0 * math.log10(180.0 / height)

    def across(x: NDArray[np.float64]) -> NDArray[np.float64]:
        lambda_kh = 3.0 * (1.0 - 0.5**-kh)
        law = np.where(x <= 0.5, -12.0 * x**2, -12.0 * np.maximum(x, 0.5) ** (2.0 - kh) - lambda_kh)
        return np.maximum(law, back)

    c_top = (180.0 / height) ** 1.5 * (4.0**-1.5 + kv) / (1.0 + 8.0 * back_k)
    c = 10.0 * math.log10(c_top) / math.log10(22.5 / height)
    lambda_kv = 12.0 - c * math.log10(4.0) - 10.0 * math.log10(4.0**-1.5 + kv)
    x = np.abs(elevation) / height
    safe = np.maximum(x, 1e-9)
    if side_lobes == "peak":
        edge, drop = math.sqrt(1.0 - 0.36 * kv), 0.0
    else:
        edge, drop = math.sqrt(1.33 - 0.33 * kv), 3.0
    upright = np.select(
        [np.isnan(x), x < edge, x < 4.0, x < 90.0 / height],
        [np.nan, -12.0 * x**2, level + 10.0 * np.log10(safe**-1.5 + kv), -lambda_kv - drop - c * np.log10(safe)],
        back,
    )
    side = across(np.abs(azimuth) / azimuth_width_deg)
    front, rear = across(np.array([0.0, 180.0 / azimuth_width_deg]))
    blend = (side - rear) / (front - rear)
    gain = np.asarray(peak_gain_dbi + side + blend * upright)
    return float(gain) if gain.ndim == 0 else gain


def f1336_sector_high_gain_dbi(
    azimuth_deg: ArrayLike,
    elevation_deg: ArrayLike,
    *,
    peak_gain_dbi: float,
    azimuth_width_deg: float,
    elevation_width_deg: float | None = None,
    side_lobes: SideLobes = "peak",
) -> NDArray[np.float64] | float:
    """Sector for 6 to 70 GHz, recommends 3; parameters as in `f1336_sector_gain_dbi`."""
    height = 31000.0 * 10.0 ** (-0.1 * peak_gain_dbi) / azimuth_width_deg
    height = height if elevation_width_deg is None else elevation_width_deg
    azimuth, elevation = np.broadcast_arrays(
        np.radians(np.asarray(azimuth_deg, dtype=np.float64)), np.radians(np.asarray(elevation_deg, dtype=np.float64))
    )
    ahead = np.cos(elevation) * np.cos(azimuth)
    aside, up = np.cos(elevation) * np.sin(azimuth), np.sin(elevation)
    off = np.hypot(aside, up)
    psi = np.degrees(np.arctan2(off, ahead))
    safe = np.where(off > 0.0, off, 1.0)
    # The 3 dB ellipse in the direction of psi: cos/sin of the angle around the boresight over the two widths.
    width = 1.0 / np.hypot(aside / safe / azimuth_width_deg, up / safe / height + (off == 0.0) / height)
    x = psi / width
    edge, level = (1.0, -12.0) if side_lobes == "peak" else (1.152, -15.0)
    relative = np.where(x < edge, -12.0 * x**2, level - 15.0 * np.log10(np.maximum(x, 1e-9)))
    gain = np.asarray(peak_gain_dbi + relative)
    return float(gain) if gain.ndim == 0 else gain


def f1336_low_gain_dbi(off_axis_deg: ArrayLike, *, peak_gain_dbi: float) -> NDArray[np.float64] | float:
    """Low-gain antenna with circular symmetry, 1 to 3 GHz, below about 20 dBi, recommends 4; angle off boresight, degrees."""
    angle = np.abs(np.asarray(off_axis_deg, dtype=np.float64))
    width = math.sqrt(27000.0 * 10.0 ** (-0.1 * peak_gain_dbi))
    first = 1.9 * width
    second = first * 10.0 ** ((peak_gain_dbi - 6.0) / 32.0)
    gain = np.select(
        [np.isnan(angle), angle < 1.08 * width, angle < first, angle < second],
        [
            np.nan,
            peak_gain_dbi - 12.0 * (angle / width) ** 2,
            peak_gain_dbi - 14.0,
            peak_gain_dbi - 14.0 - 32.0 * np.log10(np.maximum(angle, 1e-9) / first),
        ],
        -8.0,
    )
    return float(gain) if gain.ndim == 0 else gain


def f1336_omni_envelope(*, frequency_hz: float, peak_gain_dbi: float, k: float = 0.7) -> Pattern:
    """The peak envelope of an omni as a Pattern, 0.4 to 70 GHz, 0 to 15 dBi."""
    check("frequency", frequency_hz, 0.4e9, 70e9, "Hz")
    check("gain", peak_gain_dbi, 0.0, 15.0, "dBi")

    def co(azimuth_rad: NDArray[np.float64], elevation_rad: NDArray[np.float64]) -> NDArray[np.float64]:
        gain = f1336_omni_gain_dbi(np.degrees(elevation_rad), peak_gain_dbi=peak_gain_dbi, k=k)
        return np.asarray(10.0 ** ((gain - peak_gain_dbi) / 20.0) + 0.0 * azimuth_rad, dtype=np.float64)

    return _envelope(f"F.1336-5 omni {peak_gain_dbi:g} dBi", frequency_hz, peak_gain_dbi, co)


def f1336_sector_envelope(*, frequency_hz: float, peak_gain_dbi: float, azimuth_width_deg: float) -> Pattern:
    """The peak envelope of a sector as a Pattern, 0.4 to 70 GHz; above 6 GHz by the law for that range."""
    check("frequency", frequency_hz, 0.4e9, 70e9, "Hz")
    check("azimuth width", azimuth_width_deg, 3.0, 180.0, "degrees")
    law = f1336_sector_gain_dbi if frequency_hz <= 6e9 else f1336_sector_high_gain_dbi

    def co(azimuth_rad: NDArray[np.float64], elevation_rad: NDArray[np.float64]) -> NDArray[np.float64]:
        gain = law(
            np.degrees(azimuth_rad),
            np.degrees(elevation_rad),
            peak_gain_dbi=peak_gain_dbi,
            azimuth_width_deg=azimuth_width_deg,
        )
        return np.asarray(10.0 ** ((gain - peak_gain_dbi) / 20.0), dtype=np.float64)

    return _envelope(f"F.1336-5 sector {peak_gain_dbi:g} dBi", frequency_hz, peak_gain_dbi, co)


def _envelope(name: str, frequency_hz: float, peak_gain_dbi: float, co: AmplitudeFunction) -> Pattern:
    return Pattern(
        name=name,
        kind="envelope",
        frequency_hz=frequency_hz,
        peak_gain_dbi=peak_gain_dbi,
        co_amplitude=co,
        cross_amplitude=co,
        size_m=0.1 * 10.0 ** (peak_gain_dbi / 20.0) * wavelength_m(frequency_hz),
        efficiency=None,
        turns=False,
        source=_SOURCE,
        notes=("a limit for interference work, not for the wanted signal",),
    )
