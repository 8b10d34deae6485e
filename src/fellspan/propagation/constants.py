"""Constants of the propagation formulas, each with its source; imports nothing of Fellspan."""

from typing import Final

SPEED_OF_LIGHT_M_S: Final = 299_792_458.0
"""In vacuum; exact by the definition of the metre (SI)."""

EARTH_RADIUS_M: Final = 6_371_000.0
"""Mean radius that Rec. ITU-R P.526-16 and P.452-18 multiply by k."""

NEUTRAL_GRADIENT_N_PER_KM: Final = 157.0
"""Refractivity lapse at which a ray is as curved as the Earth, 10^6/6371 rounded: Rec. ITU-R P.452-18, equation (5)."""

STANDARD_K: Final = 4.0 / 3.0
"""Median k to use where no data are at hand: Rec. ITU-R P.530-19, section 2.2.2.1, step 1."""

K_FORMULA_LOW_M: Final = 18_000.0
K_FORMULA_HIGH_M: Final = 200_000.0
"""Ends of the curve of Fig. 2 of Rec. ITU-R P.530-19, read from the figure; equation (4) itself has no printed range."""

LAND_PERMITTIVITY: Final = 22.0
LAND_CONDUCTIVITY_S_M: Final = 0.003
SEA_PERMITTIVITY: Final = 80.0
SEA_CONDUCTIVITY_S_M: Final = 5.0
"""Ground of the general path methods: Rec. ITU-R P.452-18, section 4.2, and P.1812-8, equation (28)."""

KNIFE_EDGE_FLOOR_NU: Final = -0.78
"""At and below this nu the approximate knife edge costs nothing: Rec. ITU-R P.526-16, equation (31)."""
