"""Reflection of a ray from smooth ground or water: where, how strongly, and what it does to the level.

Heights are above the reflecting surface, which follows the curve of the Earth and may be tilted against the level; they are
measured upward at the two ends from that surface prolonged. Knows nothing of profiles, antennas' patterns or links.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from fellspan.propagation._arrays import FloatArray, Result, as_floats, as_result, not_negative, positive, quiet
from fellspan.propagation.constants import EARTH_RADIUS_M, SPEED_OF_LIGHT_M_S
from fellspan.propagation.free_space import wavelength_m
from fellspan.propagation.refraction import inverse_k

_SMALL_M = 1e-6


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class SpecularGeometry:
    """Where a smooth Earth mirrors a ray; every field has the broadcast shape and is NaN where nothing is mirrored.

    `from_a_m` and `from_b_m` are the distances of the point from the ends, `grazing_rad` the angle between ray and surface,
    `divergence` what the curve of the
    Earth leaves of the amplitude (above 1 for negative k), `tangent_a_m` and `tangent_b_m` the heights of
    the ends above the plane that touches the surface in the point.
    """

    from_a_m: Result
    from_b_m: Result
    grazing_rad: Result
    divergence: Result
    tangent_a_m: Result
    tangent_b_m: Result


def specular_geometry(
    distance_m: ArrayLike,
    *,
    height_a_m: ArrayLike,
    height_b_m: ArrayLike,
    k: ArrayLike,
    earth_radius_m: float = EARTH_RADIUS_M,
) -> SpecularGeometry:
    """The point of a smooth Earth from which a ray is mirrored.

    Parameters
    ----------
    distance_m
        Path length, m, > 0.
    height_a_m, height_b_m
        Heights of the ends above the reflecting surface, m, > 0.
    k
        Effective Earth radius factor; may be infinite or negative, not 0.
    earth_radius_m
        6371 km, as everywhere here; P.530 prints 6375 km in (121) and 12.74, twice 6370 km, in the heights above the plane.

    Notes
    -----
    Rec. ITU-R P.530-19, section 6.1.2, equations (121) to (132): the closed root of M b^3 - (1 + M) b + c = 0, sharpened by
    Newton's method, which also serves 1/k of 0 and below, where the closed form is not defined.
    Source key: p530-19-reflection-point.
    """
    distance = positive(distance_m)
    a, b = positive(height_a_m), positive(height_b_m)
    curve = as_floats(inverse_k(k)) / earth_radius_m
    with quiet():
        m = distance**2 * curve / (4.0 * (a + b))
        share = _reflection_share(m, (a - b) / (a + b))
        room = 1.0 - m * (1.0 + share**2)
        from_a, from_b = 0.5 * distance * (1.0 + share), 0.5 * distance * (1.0 - share)
        grazing = (a + b) / distance * room
        seen = grazing > 0.0
        divergence = np.sqrt(room / (1.0 + m * (1.0 - 3.0 * share**2)))
        values = (
            from_a,
            from_b,
            grazing,
            divergence,
            a - 0.5 * curve * from_a**2,
            b - 0.5 * curve * from_b**2,
        )
    names = ("from_a_m", "from_b_m", "grazing_rad", "divergence", "tangent_a_m", "tangent_b_m")
    return SpecularGeometry(
        **{name: as_result(np.where(seen, value, np.nan)) for name, value in zip(names, values, strict=True)}
    )


def _reflection_share(m: FloatArray, c: FloatArray) -> FloatArray:
    """b of d1 = d (1 + b)/2: the root of M b^3 - (1 + M) b + c between -1 and 1."""
    m, c = np.broadcast_arrays(m, c)
    curved = np.where(m > _SMALL_M, m, np.nan)
    angle = np.arccos(np.clip(1.5 * c * np.sqrt(3.0 * curved / (curved + 1.0) ** 3), -1.0, 1.0))
    closed = 2.0 * np.sqrt((curved + 1.0) / (3.0 * curved)) * np.cos((np.pi + angle) / 3.0)
    b = np.where(m > _SMALL_M, closed, c)
    for _ in range(4):
        b = b - (m * b**3 - (1.0 + m) * b + c) / (3.0 * m * b**2 - 1.0 - m)
    return np.asarray(np.where(np.abs(b) < 1.0, b, np.nan))


def path_difference_wavelengths(
    distance_m: ArrayLike, *, tangent_a_m: ArrayLike, tangent_b_m: ArrayLike, frequency_hz: ArrayLike
) -> Result:
    """How much longer the mirrored ray is than the direct one, in wavelengths, from the heights above the tangent plane, m.

    Notes
    -----
    Rec. ITU-R P.530-19, section 6.1.2: 2 h1' h2' / (wavelength d). Flat angles only: at 200 m over 10 km it is some 4 parts
    in 10 000 too great; `exact_path_difference_m` is not. Source key: p530-19-reflection-point.
    """
    with quiet():
        return as_result(
            2.0
            * as_floats(tangent_a_m)
            * as_floats(tangent_b_m)
            / (as_floats(wavelength_m(frequency_hz)) * positive(distance_m))
        )


def exact_path_difference_m(
    from_a_m: ArrayLike, from_b_m: ArrayLike, *, height_a_m: ArrayLike, height_b_m: ArrayLike, k: ArrayLike
) -> Result:
    """Way over a point of the smooth Earth less the direct way, m: chords of the circle of radius k * 6371 km.

    Parameters
    ----------
    from_a_m, from_b_m
        Distances of the point from the ends along the surface, m.
    height_a_m, height_b_m
        Heights of the ends above the surface, m.

    Notes
    -----
    Law of cosines, derived; least at the point of reflection, so a small error of the point does not count.
    Source key: two-ray-sphere.
    """
    curve = as_floats(inverse_k(k)) / EARTH_RADIUS_M
    first, second = as_floats(from_a_m), as_floats(from_b_m)
    a, b = as_floats(height_a_m), as_floats(height_b_m)
    with quiet():
        direct = np.sqrt((a - b) ** 2 + _chord_m(first + second, curve) ** 2 * (1.0 + a * curve) * (1.0 + b * curve))
        leg_a = np.sqrt(a**2 + _chord_m(first, curve) ** 2 * (1.0 + a * curve))
        leg_b = np.sqrt(b**2 + _chord_m(second, curve) ** 2 * (1.0 + b * curve))
    return as_result(leg_a + leg_b - direct)


def _chord_m(along_m: FloatArray, curve: FloatArray) -> FloatArray:
    return np.asarray(along_m * np.sinc(0.5 * along_m * curve / np.pi))


def roughness_parameter(grazing_rad: ArrayLike, *, roughness_m: ArrayLike, frequency_hz: ArrayLike) -> Result:
    """g = 4 pi sigma_h sin(phi) / wavelength: the phase that the standard deviation of the surface's height, m, is worth.

    Rec. ITU-R P.530-19, section 6.1.2, equations (133) to (138). Source key: p530-19-reflecting-surface.
    """
    with quiet():
        phase = 4.0 * np.pi * not_negative(roughness_m) * np.sin(as_floats(grazing_rad))
        return as_result(phase / as_floats(wavelength_m(frequency_hz)))


def roughness_factor(g: ArrayLike) -> Result:
    """What roughness leaves of the mirrored amplitude, 0 to 1, from g of `roughness_parameter`.

    Rec. ITU-R P.530-19, section 6.1.2, equations (133) to (138). Source key: p530-19-reflecting-surface.
    """
    half = 0.5 * as_floats(g) ** 2
    return as_result(np.sqrt((1.0 + half) / (1.0 + 2.35 * half + 2.0 * np.pi * half**2)))


def smooth_up_to_m(grazing_rad: ArrayLike, *, frequency_hz: ArrayLike) -> Result:
    """Standard deviation of height, m, up to which a surface counts as smooth: wavelength / (8 sin phi), Rayleigh's criterion.

    Source key: p530-19-reflecting-surface.
    """
    with quiet():
        return as_result(as_floats(wavelength_m(frequency_hz)) / (8.0 * np.sin(as_floats(grazing_rad))))


def reflecting_zone_length_m(
    distance_m: ArrayLike, *, height_a_m: ArrayLike, height_b_m: ArrayLike, frequency_hz: ArrayLike
) -> Result:
    """Length of the first Fresnel zone on the surface, m, along the path.

    Rec. ITU-R P.530-19, section 6.1.2, equations (133) to (138). Source key: p530-19-reflecting-surface.
    """
    distance = positive(distance_m)
    a, b = not_negative(height_a_m), not_negative(height_b_m)
    with quiet():
        spread = distance * as_floats(wavelength_m(frequency_hz))
        return as_result(distance * np.sqrt(1.0 + 4.0 * a * b / spread) / (1.0 + (a + b) ** 2 / spread))


def reflecting_zone_width_m(distance_m: ArrayLike, *, frequency_hz: ArrayLike) -> Result:
    """Width of the first Fresnel zone on the surface, m, across the path: sqrt(wavelength d).

    Rec. ITU-R P.530-19, section 6.1.2, equations (133) to (138). Source key: p530-19-reflecting-surface.
    """
    return as_result(np.sqrt(positive(distance_m) * as_floats(wavelength_m(frequency_hz))))


def partial_surface_factor(
    reflecting_m: ArrayLike,
    *,
    distance_m: ArrayLike,
    height_a_m: ArrayLike,
    height_b_m: ArrayLike,
    frequency_hz: ArrayLike,
) -> Result:
    """What is left of the mirrored amplitude, 0 to 1, where only `reflecting_m` of the zone's length reflects.

    Rec. ITU-R P.530-19, section 6.1.2, equations (133) to (138), held to 1. Source key: p530-19-reflecting-surface.
    """
    distance = positive(distance_m)
    a, b = positive(height_a_m), positive(height_b_m)
    with quiet():
        factor = not_negative(reflecting_m) * (a + b) ** 2 / np.sqrt(a * b * distance**3)
        return as_result(np.minimum(factor / np.sqrt(as_floats(wavelength_m(frequency_hz))), 1.0))


def reflected_ray_angles_rad(geometry: SpecularGeometry, *, height_a_m: ArrayLike, height_b_m: ArrayLike) -> Result:
    """Angles between the direct and the mirrored ray at A and at B, radians, stacked first: shape (2, ...).

    Rec. ITU-R P.530-19, section 6.1.2, equations (140) to (148), with the drop to the tangent plane taken from the geometry.
    Source key: p530-19-reflection-antennas.
    """
    a, b = as_floats(height_a_m), as_floats(height_b_m)
    first, second = as_floats(geometry.from_a_m), as_floats(geometry.from_b_m)
    with quiet():
        between = (a - b) / (first + second)
        # d2^2 / (2 ae) is h2 - h2', so d2 / (2 ae) needs no k here.
        at_a = a / first - between - (b - as_floats(geometry.tangent_b_m)) / second
        at_b = b / second + between - (a - as_floats(geometry.tangent_a_m)) / first
    return as_result(np.stack(np.broadcast_arrays(at_a, at_b)))


def gaussian_lobe_loss_db(off_rad: ArrayLike, *, beamwidth_rad: ArrayLike) -> Result:
    """Gain lost off the middle of a main lobe of Gaussian shape, dB: 12 (angle / half-power width)^2.

    Rec. ITU-R P.530-19, section 6.1.2, equations (140) to (148). Source key: p530-19-reflection-antennas.
    """
    with quiet():
        return as_result(12.0 * (as_floats(off_rad) / positive(beamwidth_rad)) ** 2)


def deepest_fade_db(amplitude: ArrayLike, *, direct_loss_db: ArrayLike = 0.0) -> Result:
    """Depth of the deepest fade, dB, where the mirrored ray has `amplitude` relative to an unattenuated direct one.

    `direct_loss_db` is what the direct ray itself loses, by tilt. Infinite where the two rays cancel.
    Rec. ITU-R P.530-19, section 6.1.2, equations (140) to (148). Source key: p530-19-reflection-antennas.
    """
    direct = 10.0 ** (-as_floats(direct_loss_db) / 20.0)
    with quiet():
        return as_result(-20.0 * np.log10(np.abs(direct - as_floats(amplitude))))


def two_ray_level_db(amplitude: ArrayLike, *, phase_rad: ArrayLike) -> Result:
    """Level of a direct ray of amplitude 1 and a mirrored ray that lags by `phase_rad`, dB relative to the direct ray.

    Derived: 20 log |1 + amplitude exp(-j phase)|. Source key: two-ray-sphere.
    """
    size = as_floats(amplitude)
    with quiet():
        power = 1.0 + size**2 + 2.0 * size * np.cos(as_floats(phase_rad))
        return as_result(10.0 * np.log10(np.maximum(power, 1e-12)))


def amplitude_from_height_scan(swing_db: ArrayLike) -> Result:
    """Amplitude of the mirrored ray from the swing between maximum and minimum, dB, of a scan over height.

    Rec. ITU-R P.530-19, section 6.1.2, equations (133) to (138). Source key: p530-19-reflecting-surface.
    """
    swing = not_negative(swing_db)
    with quiet():
        ratio = 10.0 ** (swing / 10.0)
        return as_result(np.where(swing == 0.0, 0.0, (ratio + 1.0 - 2.0 * np.sqrt(ratio)) / (ratio - 1.0)))


def pitch_of_minima_m(distance_m: ArrayLike, *, other_tangent_m: ArrayLike, frequency_hz: ArrayLike) -> Result:
    """Height between one minimum and the next at an end, m; `other_tangent_m` is the height of the other end above the plane.

    Half of it, or 3/2, 5/2 ..., spaces two antennas so that one is strong where the other fades.
    Rec. ITU-R P.530-19, section 6.2.1, equations (151) to (153). Source key: p530-19-reflection-spacing.
    """
    with quiet():
        return as_result(
            as_floats(wavelength_m(frequency_hz)) * positive(distance_m) / (2.0 * positive(other_tangent_m))
        )


def frequency_separation_hz(distance_m: ArrayLike, *, tangent_a_m: ArrayLike, tangent_b_m: ArrayLike) -> Result:
    """Least difference of two frequencies, Hz, at which one is strong where the other fades.

    Rec. ITU-R P.530-19, section 6.2.1, equations (151) to (153): c d / (4 h1' h2'). Source key: p530-19-reflection-spacing.
    """
    with quiet():
        product = positive(tangent_a_m) * positive(tangent_b_m)
        return as_result(SPEED_OF_LIGHT_M_S * positive(distance_m) / (4.0 * product))
