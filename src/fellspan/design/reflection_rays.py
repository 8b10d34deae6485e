"""The mirrored ray of one link over one surface: geometry, strength and phase for any heights, k and water level.

Arrays broadcast, so a curve over height is one call. Knows nothing of sentences, nor of where surfaces come from.
"""

import math
from collections.abc import Callable
from dataclasses import dataclass
from typing import Any, Final

import numpy as np
from numpy.typing import ArrayLike, NDArray

from fellspan.antennas.mounting import gain_toward_dbi
from fellspan.design.reflection_surfaces import Surface
from fellspan.links.antenna_gains import mounted
from fellspan.links.result import LinkResult
from fellspan.links.site import Antenna, Link
from fellspan.propagation import (
    exact_path_difference_m,
    gaussian_lobe_loss_db,
    ground_permittivity,
    inverse_k,
    partial_surface_factor,
    reflected_ray_angles_rad,
    reflecting_zone_length_m,
    reflection_coefficient,
    roughness_factor,
    roughness_parameter,
    specular_geometry,
    two_ray_level_db,
    wavelength_m,
)
from fellspan.propagation.constants import EARTH_RADIUS_M
from fellspan.vocabulary import Polarization

Floats = NDArray[np.float64]
Discrimination = Callable[[Floats, Floats], Floats]
"""(elevation of the direct ray, rad; angle of the mirrored ray below it, rad) -> gain lost by the mirrored ray, dB."""

WATER: Final = "sea water"
GROUND: Final = "wet ground"
TABLE_FROM, TABLE_STEPS = 500, 257


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Traced:
    """Mirrored rays; all arrays of the broadcast shape, NaN where nothing is mirrored.

    `wavelengths` is the path difference with the phase of the surface in it: whole numbers are nulls.
    """

    at_m: Floats
    grazing_rad: Floats
    divergence: Floats
    tangent_a_m: Floats
    tangent_b_m: Floats
    height_a_m: Floats
    height_b_m: Floats
    from_m: Floats
    to_m: Floats
    zone_m: Floats
    coefficient: Floats
    rough: Floats
    partial: Floats
    lost_a_db: Floats
    lost_b_db: Floats
    amplitude: Floats
    wavelengths: Floats

    @property
    def level_db(self) -> Floats:
        """Level over the direct ray, dB."""
        phase = 2.0 * np.pi * (self.wavelengths - 0.5)
        return np.asarray(two_ray_level_db(self.amplitude, phase_rad=phase))


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Rays:
    """What of a link decides its mirrored rays; `planned` heights are those of the antennas, m above sea level."""

    distance_m: float
    frequency_hz: float
    polarization: Polarization
    planned_a_m: float
    planned_b_m: float
    median_k: float
    lost_a: Discrimination
    lost_b: Discrimination

    def permittivity(self, surface: Surface) -> complex:
        """Of sea water, or of wet ground."""
        found: complex = ground_permittivity(
            WATER if surface.kind == "water" else GROUND, frequency_hz=self.frequency_hz
        )
        return found

    def trace(
        self,
        surface: Surface,
        *,
        k: ArrayLike,
        a_amsl_m: ArrayLike | None = None,
        b_amsl_m: ArrayLike | None = None,
        rise_m: ArrayLike = 0.0,
    ) -> Traced:
        """Mirrored rays for antenna levels (as planned unless given), k, and a rise of the surface, m."""
        a = np.asarray(self.planned_a_m if a_amsl_m is None else a_amsl_m, dtype=np.float64)
        b = np.asarray(self.planned_b_m if b_amsl_m is None else b_amsl_m, dtype=np.float64)
        rise, factor = np.asarray(rise_m, dtype=np.float64), np.asarray(k, dtype=np.float64)
        above_a = a - surface.level_a_m - rise
        above_b = b - surface.level_m(self.distance_m) - rise
        shift = (
            -0.5 * self.distance_m / EARTH_RADIUS_M * (np.asarray(inverse_k(factor)) - float(inverse_k(self.median_k)))
        )
        above_a, above_b, factor = np.broadcast_arrays(above_a, above_b, factor)
        seen: dict[str, Any] = {"height_a_m": above_a, "height_b_m": above_b}
        geometry = specular_geometry(self.distance_m, k=factor, **seen)
        at, grazing = np.asarray(geometry.from_a_m), np.asarray(geometry.grazing_rad)
        apart = np.asarray(exact_path_difference_m(geometry.from_a_m, geometry.from_b_m, k=factor, **seen))
        rho = np.asarray(
            reflection_coefficient(grazing, permittivity=self.permittivity(surface), polarization=self.polarization)
        )
        zone = np.asarray(reflecting_zone_length_m(self.distance_m, frequency_hz=self.frequency_hz, **_not_below(seen)))
        from_m = np.clip(at - 0.5 * zone, 0.0, self.distance_m)
        to_m = np.clip(at + 0.5 * zone, 0.0, self.distance_m)
        reflecting = surface.reflecting_between_m(from_m, to_m)
        with np.errstate(invalid="ignore", divide="ignore"):
            share = np.clip(reflecting / (to_m - from_m), 0.0, 1.0)
        printed = partial_surface_factor(
            reflecting, distance_m=self.distance_m, frequency_hz=self.frequency_hz, **_not_below(seen)
        )
        # The printed form is made for short stretches; a zone that reflects from end to end reflects wholly.
        partial = np.maximum(np.asarray(printed), share)
        rough = np.asarray(
            roughness_factor(
                roughness_parameter(grazing, roughness_m=surface.roughness_m, frequency_hz=self.frequency_hz)
            )
        )
        below_a, below_b = np.asarray(reflected_ray_angles_rad(geometry, **seen))
        lost_a, lost_b = self.lost_a(shift, below_a), self.lost_b(shift, below_b)
        amplitude = np.abs(rho) * geometry.divergence * partial * rough * 10.0 ** (-(lost_a + lost_b) / 20.0)
        turned = np.mod(np.angle(rho), 2.0 * np.pi) / (2.0 * np.pi)
        wavelengths = apart / float(wavelength_m(self.frequency_hz)) - turned + 0.5
        return Traced(
            at_m=at,
            grazing_rad=grazing,
            divergence=np.asarray(geometry.divergence),
            tangent_a_m=np.asarray(geometry.tangent_a_m),
            tangent_b_m=np.asarray(geometry.tangent_b_m),
            height_a_m=above_a,
            height_b_m=above_b,
            from_m=from_m,
            to_m=to_m,
            zone_m=zone,
            coefficient=np.abs(rho),
            rough=rough,
            partial=partial,
            lost_a_db=lost_a,
            lost_b_db=lost_b,
            amplitude=np.asarray(amplitude),
            wavelengths=np.asarray(wavelengths),
        )


def _not_below(heights: dict[str, Any]) -> dict[str, Any]:
    return {name: np.maximum(value, 1e-9) for name, value in heights.items()}


def rays_of(link: Link, result: LinkResult) -> tuple[Rays, tuple[str, ...]]:
    """The rays of a link as planned, and what of its antennas is not known."""
    notes: list[str] = []
    lost = []
    for site, antenna, bearing, tilt in (
        (result.a, link.antenna_a, result.bearing_ab_deg, result.tilt_ab_deg),
        (result.b, link.antenna_b, result.bearing_ba_deg, result.tilt_ba_deg),
    ):
        function, note = _discrimination(antenna, link.radio.polarization, bearing, tilt)
        lost.append(function)
        if note is not None:
            notes.append(f"'{site}': {note}")
    rays = Rays(
        distance_m=result.distance_m,
        frequency_hz=link.radio.frequency_hz,
        polarization=_polarization(link, result),
        planned_a_m=result.ends.a.antenna_amsl_m,
        planned_b_m=result.ends.b.antenna_amsl_m,
        median_k=result.median_k,
        lost_a=lost[0],
        lost_b=lost[1],
    )
    return rays, tuple(notes)


def _polarization(link: Link, result: LinkResult) -> Polarization:
    """As mounted; slanted and dual antennas carry horizontal too, which is mirrored more strongly."""
    if result.antennas is None:
        return link.radio.polarization
    mounted_as = {result.antennas.a.polarization, result.antennas.b.polarization}
    return "vertical" if mounted_as == {"vertical"} else "horizontal"


def _discrimination(
    antenna: Antenna, polarization: Polarization, bearing_deg: float, tilt_deg: float
) -> tuple[Discrimination, str | None]:
    pattern = antenna.pattern
    if pattern is not None:
        mounting = mounted(antenna, bearing_deg=bearing_deg, tilt_deg=tilt_deg, polarization=polarization)

        def by_pattern(direct_rad: Floats, below_rad: Floats) -> Floats:
            direct = np.clip(tilt_deg + np.degrees(direct_rad), -90.0, 90.0)
            mirrored = np.clip(direct - np.degrees(below_rad), -90.0, 90.0)
            wanted = np.asarray(gain_toward_dbi(pattern, mounting, bearing_deg, direct))
            if mirrored.size <= TABLE_FROM or not np.isfinite(mirrored).any():
                return np.asarray(wanted - np.asarray(gain_toward_dbi(pattern, mounting, bearing_deg, mirrored)))
            # Thousands of directions in a narrow sheaf: the pattern is asked along it once.
            along = np.linspace(np.nanmin(mirrored), np.nanmax(mirrored), TABLE_STEPS)
            table = np.asarray(gain_toward_dbi(pattern, mounting, bearing_deg, along))
            return np.asarray(wanted - np.interp(mirrored, along, table))

        return by_pattern, None
    width_deg = None if antenna.origin is None else antenna.origin.elevation_width_deg
    if width_deg is not None:

        def by_width(direct_rad: Floats, below_rad: Floats) -> Floats:
            width = math.radians(width_deg)
            return np.asarray(
                np.asarray(gaussian_lobe_loss_db(direct_rad - below_rad, beamwidth_rad=width))
                - np.asarray(gaussian_lobe_loss_db(direct_rad, beamwidth_rad=width))
            )

        return by_width, "only the beamwidth of the antenna is known; its main lobe is taken as Gaussian"

    def none(direct_rad: Floats, below_rad: Floats) -> Floats:
        return np.zeros(np.broadcast(direct_rad, below_rad).shape)

    return none, "no pattern of the antenna is known, so it holds back nothing of the mirrored ray"
