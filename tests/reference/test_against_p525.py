"""Free space against Rec. ITU-R P.525: values worked by hand from 20 log10(4 pi d / wavelength), c = 299 792 458 m/s."""

import numpy as np
import pytest

from fellspan.propagation import free_space_loss_db

# Rounded to 0.001 dB, hence half of that as tolerance.
HAND = [(2.4e9, 10e3, 120.052), (5.8e9, 20e3, 133.737), (11e9, 50e3, 147.255), (60e9, 500.0, 121.990)]


@pytest.mark.parametrize(("frequency_hz", "distance_m", "loss_db"), HAND)
def test_hand_values(frequency_hz: float, distance_m: float, loss_db: float) -> None:
    assert free_space_loss_db(distance_m, frequency_hz=frequency_hz) == pytest.approx(loss_db, abs=5e-4)


def test_practical_constant_of_p452() -> None:
    # P.452-18, equation (8), prints the constant as 92.4 for GHz and km: rounded to 0.1 dB.
    assert free_space_loss_db(1000.0, frequency_hz=1e9) == pytest.approx(92.4, abs=0.05)


def test_six_db_for_twice_the_distance() -> None:
    near, far = free_space_loss_db(np.array([1e3, 2e3]), frequency_hz=5e9)  # type: ignore[misc]
    assert far - near == pytest.approx(20 * np.log10(2), abs=1e-12)
