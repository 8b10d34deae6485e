"""Rain over a path against values worked by hand from Rec. ITU-R P.530-19, sections 2.4.1 to 2.4.4."""

import pytest

from fellspan.propagation import (
    horizontal_from_vertical_rain_db,
    rain_coefficients,
    rain_events_per_year,
    rain_loss_001_db,
    rain_loss_at_frequency_db,
    rain_loss_db,
    rain_path_factor,
    vertical_from_horizontal_rain_db,
    wet_snow_multiplier,
)

PATHS = [
    # km, GHz, mm/h, polarization, dB by -17, dB by -19
    (10, 11, 30, "vertical", 6.362, 6.362),
    (10, 23, 30, "vertical", 21.632, 21.632),
    (1, 80, 60, "vertical", 27.282, 27.282),
    (20, 18, 30, "horizontal", 29.556, 29.556),
    (0.3, 80, 60, "vertical", 15.505, 15.709),
    (40, 11, 30, "vertical", 15.637, 18.645),
    (20, 5.8, 30, "horizontal", 1.462, 1.443),
]


@pytest.mark.parametrize(("km", "ghz", "rain", "polarization", "by_17", "by_19"), PATHS)
def test_loss_at_a_hundredth_of_a_percent(
    km: float, ghz: float, rain: float, polarization: str, by_17: float, by_19: float
) -> None:
    # By hand, three decimals; the -17 column agrees with itur 0.4.0.
    path = {"rain_rate_001_mm_h": rain, "frequency_hz": ghz * 1e9, "polarization": polarization}
    assert rain_loss_001_db(km * 1e3, **path) == pytest.approx(by_19, abs=6e-4)
    assert rain_loss_001_db(km * 1e3, **path, edition="19") == pytest.approx(by_19, abs=6e-4)
    assert rain_loss_001_db(km * 1e3, **path, edition="17") == pytest.approx(by_17, abs=6e-4)


@pytest.mark.parametrize(
    ("km", "ghz", "rain", "polarization", "by_17", "by_19"),
    [
        (10, 11, 30, "vertical", 0.70696, 0.70696),
        (10, 23, 30, "vertical", 0.63708, 0.63708),
        (0.3, 80, 60, "vertical", 2.5, 2.53286),
        (40, 11, 30, "vertical", 0.43440, 0.51797),
        (20, 5.8, 30, "horizontal", 0.53882, 0.53177),
    ],
)
def test_path_factor(km: float, ghz: float, rain: float, polarization: str, by_17: float, by_19: float) -> None:
    # By hand, five decimals; 2.5 is the cap of -17.
    _, alpha = rain_coefficients(ghz * 1e9, polarization=polarization)
    path = {"rain_rate_001_mm_h": rain, "alpha": alpha, "frequency_hz": ghz * 1e9}
    assert rain_path_factor(km * 1e3, **path) == pytest.approx(by_19, abs=6e-6)
    assert rain_path_factor(km * 1e3, **path, edition="17") == pytest.approx(by_17, abs=6e-6)


@pytest.mark.parametrize(
    ("ghz", "reading_a", "reading_b"),
    [
        (5.8, (2.0401, 0.3799, 0.1125), (2.0401, 0.3799, 0.1125)),
        (11, (2.0295, 0.3796, 0.1117), (2.0151, 0.3793, 0.1106)),
        (18, (1.9755, 0.3784, 0.1076), (1.9351, 0.3774, 0.1046)),
        (23, (1.9492, 0.3778, 0.1057), (1.9025, 0.3766, 0.1022)),
        (60, (1.8495, 0.3753, 0.0984), (1.7933, 0.3739, 0.0943)),
        (80, (1.8206, 0.3746, 0.0963), (1.7643, 0.3731, 0.0922)),
    ],
)
def test_other_percentages(
    ghz: float, reading_a: tuple[float, float, float], reading_b: tuple[float, float, float]
) -> None:
    # By hand, four decimals: share of the loss at 0.01 % that is exceeded for 0.001, 0.1 and 1 %.
    shares = [0.001, 0.1, 1.0]
    assert rain_loss_db(1.0, percent=shares, frequency_hz=ghz * 1e9) == pytest.approx(reading_a, abs=6e-5)
    assert rain_loss_db(1.0, percent=shares, frequency_hz=ghz * 1e9, reading="B") == pytest.approx(reading_b, abs=6e-5)


def test_the_law_is_not_normalised() -> None:
    # By hand: 0.998 of the value at 0.01 % that it starts from, at every frequency.
    assert rain_loss_db(10.0, percent=0.01, frequency_hz=[6e9, 11e9, 80e9]) == pytest.approx(9.98, abs=0.01)


def test_scaling_in_frequency() -> None:
    # By hand.
    assert rain_loss_at_frequency_db(10.0, from_hz=15e9, to_hz=23e9) == pytest.approx(20.736, abs=6e-4)
    assert rain_loss_at_frequency_db(20.0, from_hz=18e9, to_hz=38e9) == pytest.approx(54.81, abs=6e-3)
    assert rain_loss_at_frequency_db(3.0, from_hz=7e9, to_hz=11e9) == pytest.approx(7.178, abs=6e-4)


def test_scaling_in_polarization() -> None:
    # By hand.
    assert vertical_from_horizontal_rain_db(20.0) == pytest.approx(16.901, abs=6e-4)
    assert horizontal_from_vertical_rain_db(20.0) == pytest.approx(23.929, abs=6e-4)


def test_events() -> None:
    assert rain_events_per_year(0.01) == pytest.approx(17.91, abs=6e-3)  # by hand


def test_wet_snow_multiplier() -> None:
    # By hand; its third value, 2.8735, was noted as 2.874.
    assert wet_snow_multiplier([-100, -200, -400, -1000]) == pytest.approx([2.310, 3.456, 2.8735, 1.099], abs=6e-4)
