"""Against Rec. ITU-R P.530-19: k exceeded 99.9 % of the worst month, average diffraction, clearance arithmetic."""

import numpy as np
import pytest

from fellspan.propagation import average_diffraction_loss_db, earth_bulge_m, fresnel_radius_m, k_exceeded_99_9

# Equation (4) worked by hand, 4 decimals.
EQUATION_4 = [
    (20, 0.5658), (25, 0.6260), (30, 0.6738), (40, 0.7450), (50, 0.7953),
    (70, 0.8620), (100, 0.9197), (150, 0.9703), (200, 0.9978),
]  # fmt: skip


@pytest.mark.parametrize(("distance_km", "k"), EQUATION_4)
def test_k_by_equation_4(distance_km: float, k: float) -> None:
    assert k_exceeded_99_9(distance_km * 1000.0) == pytest.approx(k, abs=6e-5)


@pytest.mark.parametrize(("distance_km", "k"), [(20, 0.57), (50, 0.80), (100, 0.92), (200, 1.00)])
def test_k_as_read_from_figure_2(distance_km: float, k: float) -> None:
    # Read from the printed curve: no better than 0.01.
    assert k_exceeded_99_9(distance_km * 1000.0) == pytest.approx(k, abs=0.01)


def test_k_is_held_below_18_km() -> None:
    # Our own rule, no outside source: the figure begins at about 18 km. 157 / (144 + 2670/18) by hand.
    held = 0.53706
    for distance_m in (0.0, 500.0, 10_000.0, 18_000.0):
        assert k_exceeded_99_9(distance_m) == pytest.approx(held, abs=1e-5)
    above = k_exceeded_99_9(18_001.0)
    assert isinstance(above, float)
    assert above > held


@pytest.mark.parametrize(("clearance", "loss_db"), [(0.2, 6), (0.0, 10), (-0.5, 20), (-1.0, 30), (-1.5, 40)])
def test_average_diffraction(clearance: float, loss_db: float) -> None:
    # Equation (2), agrees with the line of Fig. 1.
    assert average_diffraction_loss_db(clearance) == pytest.approx(loss_db, abs=1e-12)


@pytest.mark.parametrize(
    ("distance_km", "full", "grazing", "extended", "tropical"),
    [(30, 32.59, 26.21, 32.01, 37.81), (50, 61.76, 61.68, 69.17, 76.66)],
)
def test_height_over_flat_ground_at_mid_path(
    distance_km: float, full: float, grazing: float, extended: float, tropical: float
) -> None:
    # Section 2.2.2.1 at 6 GHz, worked by hand with bulge d1 d2 / (12.742 k): ray height over an obstacle half-way, 0.01 m.
    # The hand values use the printed 17.3 of equation (3), not the exact 17.3146, and k rounded.
    half = distance_km * 500.0
    radius = 17.3 / 17.3146 * np.asarray(fresnel_radius_m(half, half, frequency_hz=6e9))
    low = k_exceeded_99_9(2.0 * half)
    assert earth_bulge_m(half, half, k=4 / 3) + radius == pytest.approx(full, abs=0.01)
    for fraction, height in ((0.0, grazing), (0.3, extended), (0.6, tropical)):
        assert earth_bulge_m(half, half, k=low) + fraction * radius == pytest.approx(height, abs=0.01)
