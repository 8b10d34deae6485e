"""Links take each antenna's gain in the true direction of the other end, and say when aim or polarisation is wrong."""

import dataclasses

import pytest
from made_profiles import link_of, mirrored, profile_of

from fellspan.antennas.data_sheet import from_data_sheet
from fellspan.antennas.dishes import dish
from fellspan.antennas.mounting import Mounting
from fellspan.antennas.pattern import Pattern
from fellspan.antennas.wires import dipole
from fellspan.antennas.yagi import propose_yagi, yagi
from fellspan.links.assess import assess_profile
from fellspan.links.result import LinkResult
from fellspan.links.site import Aim, Antenna, Link

FREQUENCY_HZ = 6e9
LENGTH_M = 5000.0
PROFILE = profile_of(LENGTH_M)
"""A to B lies due east, bearing 90; B to A due west, 270."""


def sector(width_deg: float = 90.0, *, downtilt_deg: float = 0.0) -> Pattern:
    return from_data_sheet(
        name="sector",
        frequency_hz=FREQUENCY_HZ,
        gain_dbi=16.0,
        azimuth_width_deg=width_deg,
        elevation_width_deg=7.0,
        front_to_back_db=28.0,
        downtilt_deg=downtilt_deg,
    )


def omni() -> Pattern:
    return from_data_sheet(
        name="omni", frequency_hz=FREQUENCY_HZ, gain_dbi=9.0, azimuth_width_deg=None, elevation_width_deg=12.0
    )


DISH = dish(frequency_hz=FREQUENCY_HZ, diameter_m=0.6)


def antenna(pattern: Pattern, mounting: Mounting | Aim | None = None) -> Antenna:
    return Antenna(name=pattern.name, pattern=pattern, mounting=mounting)


def result_of(
    a: Antenna, b: Antenna, *, heights: tuple[float, float] = (30.0, 30.0), power_dbm: float = 20.0
) -> LinkResult:
    return assess_profile(linked(a, b, heights=heights, power_dbm=power_dbm), PROFILE).result


def linked(a: Antenna, b: Antenna, *, heights: tuple[float, float] = (30.0, 30.0), power_dbm: float = 20.0) -> Link:
    link = link_of(PROFILE, *heights, frequency_hz=FREQUENCY_HZ, power_dbm=power_dbm, threshold_dbm=-75.0)
    return dataclasses.replace(link, antenna_a=a, antenna_b=b)


def about(result: LinkResult, *words: str) -> list[str]:
    return [text for text in result.cautions if all(word in text for word in words)]


def test_antennas_aimed_at_each_other_give_their_peak() -> None:
    result = result_of(antenna(DISH), antenna(DISH))
    assert result.antennas is not None
    for end in (result.antennas.a, result.antennas.b):
        assert end.gain_dbi == pytest.approx(DISH.peak_gain_dbi, abs=1e-6)
        assert (end.azimuth_off_deg, end.elevation_off_deg) == (0.0, 0.0)
    assert result.antennas.a.tilt_deg == result.tilt_ab_deg
    assert result.losses_db.polarization == pytest.approx(0.0, abs=1e-6)
    losses = result.losses_db
    assert losses.gases is not None
    assert result.received_dbm.at_a == pytest.approx(
        20.0 + 2.0 * DISH.peak_gain_dbi - losses.free_space - losses.diffraction - losses.gases, abs=1e-6
    )
    assert not about(result, "antenna of")


@pytest.mark.parametrize("bearing_deg", [90.0, 120.0, 45.0, 270.0, 0.0])
def test_a_sector_off_its_bearing_gives_what_its_pattern_says_there(bearing_deg: float) -> None:
    pattern = sector()
    result = result_of(antenna(pattern, Mounting(bearing_deg=bearing_deg, tilt_deg=0.0)), antenna(DISH))
    assert result.antennas is not None
    end = result.antennas.a
    right = (result.bearing_ab_deg - bearing_deg + 180.0) % 360.0 - 180.0
    expected = pattern.gain_dbi(right, result.tilt_ab_deg)
    assert end.gain_dbi == pytest.approx(expected, abs=1e-6)
    assert end.azimuth_off_deg == pytest.approx(right, abs=0.01)
    assert bool(about(result, "antenna of 'Alder'", "degrees right of" if right > 0 else "degrees left of")) == (
        bearing_deg != 90.0
    )


def test_one_sector_serves_many_links_each_with_its_own_gain() -> None:
    hub = antenna(sector(), Aim(bearing_deg=100.0, tilt_deg=0.0))
    gains = []
    for length_m, height_m in ((3000.0, 60.0), (5000.0, 30.0), (9000.0, 200.0)):
        profile = profile_of(length_m)
        link = link_of(profile, 30.0, height_m, frequency_hz=FREQUENCY_HZ)
        result = assess_profile(dataclasses.replace(link, antenna_a=hub, antenna_b=antenna(DISH)), profile).result
        assert result.antennas is not None
        gains.append(result.antennas.a.gain_dbi)
        assert result.antennas.a.elevation_off_deg == pytest.approx(result.tilt_ab_deg, abs=0.02)
    assert len({round(gain or 0.0, 2) for gain in gains}) == 3


def test_a_wrong_tilt_shows_in_level_and_words() -> None:
    right = result_of(antenna(DISH), antenna(DISH))
    wrong = result_of(antenna(DISH, Aim(tilt_deg=4.0)), antenna(DISH))
    assert right.received_dbm.at_b is not None
    assert wrong.received_dbm.at_b is not None
    assert wrong.antennas is not None
    lost = DISH.peak_gain_dbi - float(DISH.gain_dbi(0.0, 4.0 - wrong.tilt_ab_deg))
    assert lost > 3.0
    assert right.received_dbm.at_b - wrong.received_dbm.at_b == pytest.approx(lost, abs=0.01)
    assert wrong.antennas.a.elevation_off_deg == pytest.approx(wrong.tilt_ab_deg - 4.0, abs=1e-6)
    assert about(wrong, "antenna of 'Alder'", f"{lost:.1f} dB less", "4.0 degrees below the middle of its beam")


def test_an_omni_stands_upright_and_does_not_care_about_bearing() -> None:
    level = result_of(antenna(omni(), Aim(bearing_deg=200.0)), antenna(DISH), heights=(30.0, 30.0))
    assert level.antennas is not None
    assert level.antennas.a.tilt_deg == 0.0
    assert level.antennas.a.azimuth_width_deg is None
    assert level.antennas.a.gain_dbi == pytest.approx(9.0, abs=0.01)
    profile = profile_of(500.0)
    link = link_of(profile, 10.0, 80.0, frequency_hz=FREQUENCY_HZ)
    steep = assess_profile(
        dataclasses.replace(link, antenna_a=antenna(omni()), antenna_b=antenna(DISH)), profile
    ).result
    assert steep.antennas is not None
    assert steep.antennas.a.tilt_deg == 0.0
    assert steep.antennas.a.gain_dbi == pytest.approx(omni().gain_dbi(0.0, steep.tilt_ab_deg), abs=1e-6)
    caution = about(steep, "antenna of 'Alder'", "degrees above the middle")
    assert caution
    assert "right of" not in caution[0]


def test_an_electrical_downtilt_is_made_up_for_by_an_antenna_that_is_aimed() -> None:
    result = result_of(antenna(sector(downtilt_deg=5.0)), antenna(DISH))
    assert result.antennas is not None
    assert result.antennas.a.gain_dbi == pytest.approx(16.0, abs=0.01)
    assert result.antennas.a.tilt_deg == pytest.approx(result.tilt_ab_deg + 5.0, abs=0.15)  # read off the cut
    fixed = result_of(antenna(sector(downtilt_deg=5.0), Aim(bearing_deg=90.0)), antenna(DISH))
    assert fixed.antennas is not None
    assert fixed.antennas.a.elevation_off_deg == pytest.approx(5.0 + fixed.tilt_ab_deg, abs=0.15)


def test_a_pattern_without_cross_polar_level_is_no_perfect_antenna() -> None:
    # Computed Yagis and panels hold none; crossed, real ones lose 20 to 35 dB (common practice, no source).
    made = yagi(propose_yagi(frequency_hz=FREQUENCY_HZ, boom_m=0.04))
    crossed = result_of(antenna(made, Aim(polarization="horizontal")), antenna(made, Aim(polarization="vertical")))
    gains_only = result_of(
        Antenna(gain_dbi=9.0, mounting=Aim(polarization="horizontal")),
        Antenna(gain_dbi=9.0, mounting=Aim(polarization="vertical")),
    )
    # Both leak 25 dB down, powers added: 22 dB, as where nothing but the gain is known.
    assert crossed.losses_db.polarization == pytest.approx(21.99, abs=0.01)
    assert crossed.losses_db.polarization == pytest.approx(gains_only.losses_db.polarization or 0.0)


def test_a_dipole_laid_down_minds_its_bearing_in_words() -> None:
    made = dipole(frequency_hz=FREQUENCY_HZ)
    result = result_of(antenna(made, Aim(bearing_deg=40.0, polarization="horizontal")), antenna(DISH))
    assert about(result, "antenna of 'Alder'", "50.0 degrees right of the middle of its beam")


def test_crossed_polarizations_cost_more_than_20_db() -> None:
    crossed = result_of(antenna(DISH, Aim(polarization="horizontal")), antenna(DISH, Aim(polarization="vertical")))
    alike = result_of(antenna(DISH), antenna(DISH))
    loss = crossed.losses_db.polarization
    assert loss is not None
    assert 20.0 < loss < 40.0
    assert alike.received_dbm.at_a == pytest.approx((crossed.received_dbm.at_a or 0.0) + loss, abs=1e-3)
    assert about(crossed, "horizontal at 'Alder'", "vertical at 'Birch'")
    gains_only = result_of(Antenna(gain_dbi=20.0, mounting=Aim(polarization="horizontal")), Antenna(gain_dbi=20.0))
    assert gains_only.losses_db.polarization is not None
    assert 20.0 < gains_only.losses_db.polarization < 25.0


def test_slant_loses_3_db_and_dual_none() -> None:
    slant = result_of(antenna(DISH, Aim(polarization="slant+45")), antenna(DISH))
    assert slant.losses_db.polarization == pytest.approx(3.01, abs=0.02)  # cos^2(45 degrees) is half the power
    dual = result_of(antenna(DISH, Aim(polarization="dual")), antenna(DISH))
    assert dual.losses_db.polarization == pytest.approx(0.0, abs=1e-6)


def test_a_gain_alone_holds_in_any_direction_and_no_polarization_loss_is_claimed() -> None:
    result = result_of(Antenna(gain_dbi=20.0), Antenna(gain_dbi=20.0))
    assert result.losses_db.polarization is None
    assert result.antennas is not None
    assert (result.antennas.a.gain_dbi, result.antennas.a.azimuth_width_deg) == (20.0, None)


def test_a_link_inside_the_far_field_distance_is_doubted() -> None:
    big = dish(frequency_hz=38e9, diameter_m=1.8)
    assert big.far_field_m > 500.0
    profile = profile_of(500.0)
    link = link_of(profile, 30.0, 30.0, frequency_hz=38e9)
    near = assess_profile(dataclasses.replace(link, antenna_a=antenna(big), antenna_b=antenna(DISH)), profile).result
    assert about(near, "far-field distance of the antenna of 'Alder'")
    assert not about(near, "far-field distance of the antenna of 'Birch'")


def test_from_b_to_a_is_the_mirror_of_a_to_b() -> None:
    link = linked(
        antenna(sector(), Mounting(bearing_deg=70.0, tilt_deg=-2.0)),
        antenna(DISH, Mounting(bearing_deg=272.0, tilt_deg=1.0, polarization="slant+45", roll_deg=10.0)),
        heights=(50.0, 20.0),
    )
    turned = dataclasses.replace(link, a=link.b, b=link.a, antenna_a=link.antenna_b, antenna_b=link.antenna_a)
    there = assess_profile(link, PROFILE).result
    back = assess_profile(turned, mirrored(PROFILE)).result
    assert there.antennas is not None
    assert back.antennas is not None
    assert there.antennas.a.gain_dbi == pytest.approx(back.antennas.b.gain_dbi, abs=1e-9)
    assert there.antennas.b.gain_dbi == pytest.approx(back.antennas.a.gain_dbi, abs=1e-9)
    assert there.losses_db.polarization == pytest.approx(back.losses_db.polarization, abs=1e-9)
    assert there.received_dbm.at_a == pytest.approx(back.received_dbm.at_b, abs=1e-9)


def test_a_horizontal_dish_keeps_its_gain_and_names_its_planes_as_mounted() -> None:
    pattern = from_data_sheet(
        name="fan",
        frequency_hz=FREQUENCY_HZ,
        gain_dbi=16.0,
        azimuth_width_deg=60.0,
        elevation_width_deg=8.0,
        front_to_back_db=25.0,
    )
    turning = dataclasses.replace(pattern, turns=True)
    result = result_of(antenna(turning, Aim(polarization="horizontal")), antenna(DISH, Aim(polarization="horizontal")))
    assert result.antennas is not None
    assert result.antennas.a.azimuth_width_deg == pytest.approx(8.0, abs=0.1)
    assert result.antennas.a.elevation_width_deg == pytest.approx(60.0, abs=0.5)
    assert result.antennas.a.gain_dbi == pytest.approx(16.0, abs=1e-6)
