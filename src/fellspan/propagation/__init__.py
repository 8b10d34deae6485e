"""Physics of radio waves over terrain: free space, refraction, Fresnel zones, diffraction.

Pure functions of numbers and arrays with no I/O. Knows nothing of terrain files, sites or links. Every formula stands here
once, with its source and validity range as data in `sources`.
"""

from fellspan.propagation.average_diffraction import average_diffraction_loss_db
from fellspan.propagation.bullington import bullington_loss_db, delta_bullington_loss_db, effective_heights_m
from fellspan.propagation.free_space import free_space_loss_db, wavelength_m
from fellspan.propagation.fresnel import earth_bulge_m, fresnel_radius_m
from fellspan.propagation.knife_edge import (
    double_edge_loss_db,
    knife_edge_loss_db,
    knife_edge_loss_exact_db,
    knife_edge_nu,
)
from fellspan.propagation.refraction import (
    effective_earth_radius_m,
    gradient_from_k_n_per_km,
    inverse_k,
    inverse_k_from_gradient,
    k_exceeded_99_9,
    k_from_gradient,
    refractivity,
    saturation_vapour_pressure_hpa,
    vapour_pressure_hpa,
)
from fellspan.propagation.rounded_obstacle import (
    hilltop_radius_m,
    rounded_obstacle_extra_db,
    rounded_obstacle_loss_db,
    smooth_enough_m,
)
from fellspan.propagation.sources import SOURCES, Source, Validity, out_of_range, source
from fellspan.propagation.spherical import first_residue_loss_db, spherical_earth_loss_db

__all__ = [
    "SOURCES",
    "Source",
    "Validity",
    "average_diffraction_loss_db",
    "bullington_loss_db",
    "delta_bullington_loss_db",
    "double_edge_loss_db",
    "earth_bulge_m",
    "effective_earth_radius_m",
    "effective_heights_m",
    "first_residue_loss_db",
    "free_space_loss_db",
    "fresnel_radius_m",
    "gradient_from_k_n_per_km",
    "hilltop_radius_m",
    "inverse_k",
    "inverse_k_from_gradient",
    "k_exceeded_99_9",
    "k_from_gradient",
    "knife_edge_loss_db",
    "knife_edge_loss_exact_db",
    "knife_edge_nu",
    "out_of_range",
    "refractivity",
    "rounded_obstacle_extra_db",
    "rounded_obstacle_loss_db",
    "saturation_vapour_pressure_hpa",
    "smooth_enough_m",
    "source",
    "spherical_earth_loss_db",
    "vapour_pressure_hpa",
    "wavelength_m",
]
