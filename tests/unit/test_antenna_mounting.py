"""Mounting: directions against rotation matrices, polarisation, and what aim and sway cost against theory and random draws."""

import math

import numpy as np
import pytest

from fellspan.antennas.data_sheet import from_data_sheet
from fellspan.antennas.dishes import dish
from fellspan.antennas.mounting import (
    FIELD_ANGLE_DEG,
    Mounting,
    combined_discrimination_db,
    field_angle_between_deg,
    gain_toward_dbi,
    off_boresight_deg,
    pointing_loss,
    polarization_loss_db,
    turn_for,
)
from fellspan.antennas.patches import patch_array
from fellspan.antennas.wires import collinear, dipole
from fellspan.antennas.yagi import propose_yagi, yagi
from fellspan.errors import AntennaError

SECTOR = from_data_sheet(
    name="sector",
    frequency_hz=5.8e9,
    gain_dbi=17.0,
    azimuth_width_deg=90.0,
    elevation_width_deg=6.0,
    front_to_back_db=30.0,
)
YAGI = yagi(propose_yagi(frequency_hz=450e6, boom_m=0.8))


def east_north_up(bearing_deg: float, elevation_deg: float) -> np.ndarray:
    bearing, elevation = math.radians(bearing_deg), math.radians(elevation_deg)
    return np.array(
        [math.cos(elevation) * math.sin(bearing), math.cos(elevation) * math.cos(bearing), math.sin(elevation)]
    )


def turned_about(axis: np.ndarray, angle_deg: float) -> np.ndarray:
    """Rodrigues' rotation matrix, right-handed."""
    x, y, z = axis
    cross = np.array([[0, -z, y], [z, 0, -x], [-y, x, 0]])
    angle = math.radians(angle_deg)
    return np.eye(3) + math.sin(angle) * cross + (1 - math.cos(angle)) * cross @ cross


def test_directions_agree_with_rotation_matrices() -> None:
    random = np.random.default_rng(7)
    for _ in range(200):
        bearing, tilt, roll = random.uniform(0, 360), random.uniform(-80, 80), random.uniform(-180, 180)
        toward, up = random.uniform(0, 360), random.uniform(-89, 89)
        ahead = east_north_up(bearing, tilt)
        # Clockwise seen from behind is right-handed about the boresight, for east-north-up axes.
        turn = turned_about(ahead, roll)
        right, over = turn @ east_north_up(bearing + 90.0, 0.0), turn @ east_north_up(bearing, tilt + 90.0)
        d = east_north_up(toward, up)
        expected = math.degrees(math.atan2(d @ right, d @ ahead)), math.degrees(math.asin(d @ over))
        got = off_boresight_deg(Mounting(bearing_deg=bearing, tilt_deg=tilt, roll_deg=roll), toward, up)
        assert (float(got[0]), float(got[1])) == pytest.approx(expected, abs=1e-6)


def test_bearings_cross_north() -> None:
    azimuth, elevation = off_boresight_deg(Mounting(bearing_deg=350.0), np.array([10.0, 340.0, 170.0]), 0.0)
    assert np.abs(azimuth) == pytest.approx([20.0, 10.0, 180.0])
    assert azimuth[0] > 0.0 > azimuth[1]
    assert elevation == pytest.approx([0.0, 0.0, 0.0])


def test_a_wrong_tilt_shows() -> None:
    level, raised = Mounting(bearing_deg=90.0), Mounting(bearing_deg=90.0, tilt_deg=3.0)
    lost = gain_toward_dbi(SECTOR, level, 90.0, 0.0) - gain_toward_dbi(SECTOR, raised, 90.0, 0.0)
    assert lost == pytest.approx(3.01, abs=0.01)


@pytest.mark.parametrize("polarization", ["vertical", "horizontal", "slant+45", "slant-45"])
def test_a_turning_antenna_swaps_its_planes_with_its_polarisation(polarization: str) -> None:
    mounting = Mounting(bearing_deg=0.0, polarization=polarization)
    field = math.radians(FIELD_ANGLE_DEG[polarization])
    # 25 degrees off the boresight along the electric field, and across it.
    off = math.radians(25.0)
    for along, plane in ((field, "electric"), (field + 0.5 * math.pi, "magnetic")):
        azimuth = math.degrees(math.atan2(math.sin(off) * math.cos(along), math.cos(off)))
        elevation = math.degrees(math.asin(math.sin(off) * math.sin(along)))
        expected = YAGI.gain_dbi(0.0, 25.0) if plane == "electric" else YAGI.gain_dbi(25.0, 0.0)
        assert gain_toward_dbi(YAGI, mounting, azimuth % 360.0, elevation) == pytest.approx(expected, abs=1e-6)


def test_a_sector_keeps_its_planes_whatever_the_polarisation() -> None:
    assert turn_for(SECTOR, "horizontal") == 0.0
    for polarization in ("vertical", "horizontal", "slant+45", "dual"):
        mounting = Mounting(bearing_deg=10.0, polarization=polarization)
        assert gain_toward_dbi(SECTOR, mounting, 40.0, 2.0) == pytest.approx(SECTOR.gain_dbi(30.0, 2.0))


def test_electrical_downtilt_never_turns_sideways() -> None:
    panel = patch_array(frequency_hz=5.8e9, rows=4, columns=4, downtilt_deg=5.0)
    mounting = Mounting(bearing_deg=0.0, polarization="horizontal")
    assert gain_toward_dbi(panel, mounting, 0.0, -5.0) > gain_toward_dbi(panel, mounting, 5.0, 0.0)
    assert gain_toward_dbi(panel, mounting, 5.0, 0.0) == pytest.approx(gain_toward_dbi(panel, mounting, 355.0, 0.0))


@pytest.mark.parametrize(
    ("pattern", "polarization"),
    [
        (collinear(frequency_hz=2.4e9, elements=4), "horizontal"),
        (collinear(frequency_hz=2.4e9, elements=4), "slant+45"),
        (YAGI, "dual"),
        (dipole(frequency_hz=2.4e9), "dual"),
        (dish(frequency_hz=2.4e9, diameter_m=1.2, grid=True), "dual"),
    ],
)
def test_polarisations_that_an_antenna_cannot_have_are_refused(pattern: object, polarization: str) -> None:
    with pytest.raises(AntennaError, match=polarization.replace("+", r"\+")):
        gain_toward_dbi(pattern, Mounting(bearing_deg=0.0, polarization=polarization), 0.0, 0.0)


def test_fields_of_antennas_that_face_each_other() -> None:
    def mounted(polarization: str, roll: float = 0.0) -> Mounting:
        return Mounting(bearing_deg=0.0, polarization=polarization, roll_deg=roll)

    assert field_angle_between_deg(mounted("vertical"), mounted("vertical")) == pytest.approx(0.0)
    assert field_angle_between_deg(mounted("vertical"), mounted("horizontal")) == pytest.approx(90.0)
    # +45 seen from behind A is -45 seen from behind B.
    assert field_angle_between_deg(mounted("slant+45"), mounted("slant+45")) == pytest.approx(90.0)
    assert field_angle_between_deg(mounted("slant+45"), mounted("slant-45")) == pytest.approx(0.0)
    assert field_angle_between_deg(mounted("vertical"), mounted("slant-45")) == pytest.approx(45.0)
    assert field_angle_between_deg(mounted("vertical", 3.0), mounted("vertical", 3.0)) == pytest.approx(6.0)
    assert field_angle_between_deg(mounted("vertical", 3.0), mounted("vertical", -3.0)) == pytest.approx(0.0)
    assert field_angle_between_deg(mounted("dual"), mounted("slant-45")) == 0.0


@pytest.mark.parametrize(("angle", "xpd"), [(1.0, 35.2), (2.0, 29.1), (5.0, 21.2), (10.0, 15.1)])
def test_tilt_between_polarisations(angle: float, xpd: float) -> None:
    # -20 log tan: what leaks into the other polarisation (textbook).
    crossed = polarization_loss_db(90.0 - angle) - polarization_loss_db(angle)
    assert crossed == pytest.approx(xpd, abs=0.05)
    assert polarization_loss_db(angle) == pytest.approx(-20.0 * math.log10(math.cos(math.radians(angle))))


def test_leaks_limit_the_loss_and_add_in_the_worst_case() -> None:
    assert polarization_loss_db(90.0, discrimination_a_db=30.0, discrimination_b_db=30.0) == pytest.approx(
        26.99, abs=0.01
    )
    assert combined_discrimination_db(30.0, 30.0) == pytest.approx(23.98, abs=0.01)
    assert polarization_loss_db(np.array([0.0, 90.0])).shape == (2,)
    assert math.copysign(1.0, polarization_loss_db(0.0)) == 1.0


BELL = from_data_sheet(
    name="bell",
    frequency_hz=5.8e9,
    gain_dbi=29.0,
    azimuth_width_deg=5.0,
    elevation_width_deg=5.0,
    front_to_back_db=40.0,
)


@pytest.mark.parametrize(("fraction", "loss"), [(0.25, 0.75), (0.5, 3.0), (0.75, 6.75)])
def test_steady_error_of_aim_is_twelve_times_its_square(fraction: float, loss: float) -> None:
    # 12 (off-axis / HPBW)^2 dB, the Gaussian lobe.
    got = pointing_loss(BELL, azimuth_sigma_deg=0.0, elevation_sigma_deg=0.0, azimuth_offset_deg=fraction * 5.0)
    assert got.mean_db == pytest.approx(loss, abs=0.03)
    assert got.median_db == got.p999_db == pytest.approx(loss, abs=0.03)


def test_sway_of_a_gaussian_lobe_has_a_closed_distribution() -> None:
    # Equal sway both ways: loss is exponential, 12.04 (sigma / HPBW)^2 chi-square(2); its quantile q is -2 ln(1 - q) of that.
    sigma = 0.5
    got = pointing_loss(BELL, azimuth_sigma_deg=sigma, elevation_sigma_deg=sigma)
    scale = 12.04 * (sigma / 5.0) ** 2
    for quantile, value in ((0.5, got.median_db), (0.9, got.p90_db), (0.99, got.p99_db)):
        assert value == pytest.approx(-2.0 * math.log(1.0 - quantile) * scale, rel=0.01)
    assert got.p999_db == pytest.approx(-2.0 * math.log(0.001) * scale, rel=0.01)
    # Mean power: 1 / (1 + 2 a s^2) for a Gaussian lobe.
    assert got.mean_db == pytest.approx(10.0 * math.log10(1.0 + 2.0 * scale * math.log(10.0) / 10.0), abs=0.01)


def test_sway_agrees_with_random_draws_on_a_real_lobe() -> None:
    antenna = dish(frequency_hz=23e9, diameter_m=0.6)
    got = pointing_loss(
        antenna, azimuth_sigma_deg=0.5, elevation_sigma_deg=0.3, azimuth_offset_deg=0.2, elevation_offset_deg=-0.1
    )
    random = np.random.default_rng(11)
    n = 400_000
    gain = antenna.gain_dbi(0.2 + 0.5 * random.standard_normal(n), -0.1 + 0.3 * random.standard_normal(n))
    loss = antenna.peak_gain_dbi - np.asarray(gain)
    assert got.median_db == pytest.approx(np.quantile(loss, 0.5), rel=0.02)
    assert got.p90_db == pytest.approx(np.quantile(loss, 0.9), rel=0.02)
    assert got.p99_db == pytest.approx(np.quantile(loss, 0.99), rel=0.04)
    assert got.mean_db == pytest.approx(-10.0 * np.log10(np.mean(10.0 ** (-loss / 10.0))), rel=0.02)


def test_bad_mountings_are_refused_with_the_value() -> None:
    for bad, value in (({"bearing_deg": 361.0}, "361"), ({"bearing_deg": 1.0, "tilt_deg": -91.0}, "-91")):
        with pytest.raises(AntennaError, match=value):
            Mounting(**bad)
    with pytest.raises(AntennaError, match="181"):
        Mounting(bearing_deg=0.0, roll_deg=181.0)
    with pytest.raises(AntennaError, match="nan"):
        Mounting(bearing_deg=math.nan)
    with pytest.raises(AntennaError, match=r"-0\.1"):
        pointing_loss(BELL, azimuth_sigma_deg=-0.1, elevation_sigma_deg=0.0)
