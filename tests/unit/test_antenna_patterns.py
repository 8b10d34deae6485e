"""What every pattern must do: hold its energy, take arrays and scalars, keep what is not a number, and give honest facts."""

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from fellspan.antennas.cuts import MeasuredCut, pattern_from_cuts
from fellspan.antennas.data_sheet import from_data_sheet
from fellspan.antennas.dishes import dish
from fellspan.antennas.envelopes import f699_envelope, f699_gain_dbi
from fellspan.antennas.envelopes_p2mp import f1336_omni_envelope, f1336_sector_envelope
from fellspan.antennas.facts import Cut, cut, cut_facts, facts_of
from fellspan.antennas.parts import no_cross_polar
from fellspan.antennas.patches import patch, patch_array
from fellspan.antennas.pattern import Pattern
from fellspan.antennas.sphere import directivity_dbi, radiated_power, refuse_surplus
from fellspan.antennas.wires import collinear, dipole
from fellspan.antennas.yagi import YagiDesign, propose_yagi, yagi
from fellspan.errors import AntennaError

ANGLES = np.arange(-180.0, 181.0, 5.0)


def measured() -> Pattern:
    real = patch_array(frequency_hz=5.8e9, rows=4, columns=2)
    around, over = cut(real, "horizontal", step_deg=1.0), cut(real, "vertical", step_deg=1.0)
    azimuth, elevation = (
        MeasuredCut(angle_deg=each.angle_deg[:-1], relative_db=each.gain_dbi[:-1] - real.peak_gain_dbi)
        for each in (around, over)
    )
    return pattern_from_cuts(
        name="measured", frequency_hz=5.8e9, gain_dbi=real.peak_gain_dbi - 0.5, azimuth=azimuth, elevation=elevation
    )


KINDS = {
    "dipole": dipole(frequency_hz=2.4e9, efficiency=0.9),
    "omni": collinear(frequency_hz=2.4e9, elements=6, downtilt_deg=4.0, efficiency=0.8),
    "patch": patch(frequency_hz=5.8e9),
    "panel": patch_array(frequency_hz=5.8e9, rows=4, columns=4),
    "sector": patch_array(frequency_hz=5.8e9, rows=12, columns=1, downtilt_deg=3.0),
    "yagi": yagi(propose_yagi(frequency_hz=450e6, boom_m=0.8)),
    "dish": dish(frequency_hz=5.8e9, diameter_m=0.6),
    "grid": dish(frequency_hz=2.4e9, diameter_m=0.9, grid=True),
    "sheet": from_data_sheet(
        name="sheet",
        frequency_hz=5.8e9,
        gain_dbi=17.0,
        azimuth_width_deg=90.0,
        elevation_width_deg=6.0,
        front_to_back_db=30.0,
    ),
    "file": measured(),
}
ENVELOPES = {
    "F.699": f699_envelope(frequency_hz=11e9, diameter_m=1.2),
    "F.1336 omni": f1336_omni_envelope(frequency_hz=2e9, peak_gain_dbi=10.0),
    "F.1336 sector": f1336_sector_envelope(frequency_hz=3.5e9, peak_gain_dbi=17.0, azimuth_width_deg=65.0),
    "F.1336 sector, high": f1336_sector_envelope(frequency_hz=26e9, peak_gain_dbi=20.0, azimuth_width_deg=65.0),
}
EVERY = KINDS | ENVELOPES


@pytest.mark.parametrize("kind", KINDS)
def test_gain_less_directivity_is_the_stated_efficiency(kind: str) -> None:
    antenna = KINDS[kind]
    assert antenna.efficiency is not None
    assert antenna.peak_gain_dbi - directivity_dbi(antenna) == pytest.approx(
        10.0 * math.log10(antenna.efficiency), abs=0.005
    )
    refuse_surplus(antenna)


@pytest.mark.parametrize("kind", EVERY)
def test_scalars_arrays_and_gaps(kind: str) -> None:
    antenna = EVERY[kind]
    for gain in (antenna.gain_dbi, antenna.cross_gain_dbi):
        one = gain(20.0, -5.0)
        assert type(one) is float
        grid = np.asarray(gain(ANGLES[None, :], np.array([-90.0, -5.0, 0.0, 90.0])[:, None]))
        assert grid.shape == (4, ANGLES.size)
        assert np.all(np.isfinite(grid))
        assert grid[1, 40] == pytest.approx(gain(20.0, -5.0))
        assert gain(20, -5) == pytest.approx(one)
    gaps = np.asarray(antenna.gain_dbi(np.array([np.nan, 0.0, 10.0]), np.array([0.0, np.nan, 0.0])))
    assert list(np.isnan(gaps)) == [True, True, False]
    assert math.isnan(antenna.gain_dbi(math.nan, 0.0))


@pytest.mark.parametrize("kind", EVERY)
def test_nothing_stands_above_the_peak_and_the_peak_is_reached(kind: str) -> None:
    antenna = EVERY[kind]
    fine = np.arange(-10.0, 10.01, 0.05)
    highest = max(
        float(np.max(antenna.gain_dbi(ANGLES[None, :], ANGLES[18:55][:, None]))),
        float(np.max(antenna.gain_dbi(0.0, fine))),
    )
    assert highest == pytest.approx(antenna.peak_gain_dbi, abs=0.01)


@pytest.mark.parametrize("kind", EVERY)
def test_inputs_are_left_alone_and_turns_do_not_matter(kind: str) -> None:
    antenna = EVERY[kind]
    azimuth, elevation = np.array([30.0, -170.0]), np.array([3.0, -2.0])
    before = azimuth.copy(), elevation.copy()
    antenna.gain_dbi(azimuth, elevation)
    assert np.array_equal(azimuth, before[0])
    assert np.array_equal(elevation, before[1])
    if kind not in ("sheet", "F.1336 sector"):
        assert antenna.gain_dbi(azimuth + 360.0, elevation) == pytest.approx(
            antenna.gain_dbi(azimuth, elevation), abs=1e-6
        )


@pytest.mark.parametrize(("power", "directivity"), [(1, 6.0), (3, 14.0), (20, 82.0)])
def test_integration_against_closed_forms(power: int, directivity: float) -> None:
    # Gain cos^n over the front half-space: power cos^(2n), directivity 2 (2n + 1); exact.
    def co(azimuth: np.ndarray, elevation: np.ndarray) -> np.ndarray:
        return np.maximum(np.cos(azimuth) * np.cos(elevation), 0.0) ** power

    made = Pattern(
        name="cosine",
        kind="test",
        frequency_hz=1e9,
        peak_gain_dbi=0.0,
        co_amplitude=co,
        cross_amplitude=no_cross_polar,
        size_m=0.3,
        efficiency=1.0,
        source="closed form",
    )
    assert directivity_dbi(made) == pytest.approx(10.0 * math.log10(directivity), abs=0.01)


def test_isotropic_power_is_the_whole_sphere() -> None:
    made = Pattern(
        name="isotropic",
        kind="test",
        frequency_hz=1e9,
        peak_gain_dbi=0.0,
        co_amplitude=lambda azimuth, elevation: np.ones(np.broadcast(azimuth, elevation).shape),
        cross_amplitude=no_cross_polar,
        size_m=0.1,
        efficiency=1.0,
        source="closed form",
    )
    assert radiated_power(made) == pytest.approx(4.0 * math.pi, rel=1e-9)


@pytest.mark.parametrize("grid", [False, True])
@pytest.mark.parametrize("diameter", [0.3, 0.6, 0.9, 1.2, 1.8, 2.4, 3.0])
def test_dish_lobes_stay_under_f699(grid: bool, diameter: float) -> None:
    theta = np.concatenate((np.linspace(0.0, 5.0, 10_001), np.linspace(5.0, 180.0, 20_001)))
    for ghz in (2.4, 6.0) if grid else (1.5, 2.4, 5.8, 11.0, 18.0, 23.0, 38.0, 60.0, 70.0, 80.0, 86.0):
        size = diameter * ghz / 0.299792458
        if size < 1.5:
            continue
        antenna = dish(frequency_hz=ghz * 1e9, diameter_m=diameter, grid=grid)
        over = np.asarray(antenna.gain_dbi(theta, 0.0)) - np.asarray(
            f699_gain_dbi(theta, size_wavelengths=size, frequency_hz=ghz * 1e9, peak_gain_dbi=antenna.peak_gain_dbi)
        )
        assert np.max(over) < 0.01, (ghz, theta[np.argmax(over)])


def test_facts_of_a_dish() -> None:
    facts = facts_of(dish(frequency_hz=11e9, diameter_m=1.2))
    assert facts.azimuth == facts.elevation
    assert facts.azimuth.peak_deg == 0.0
    # The aperture's own stands at -22.3 dB (textbook); what struts and rim scatter may only raise it.
    assert facts.azimuth.side_lobe_db is not None
    assert -22.3 < facts.azimuth.side_lobe_db < -20.5
    assert facts.azimuth.side_lobe_deg == pytest.approx(1.75 * 57.3 / 44.03, rel=0.05)
    assert facts.cross_polar_db == pytest.approx(30.0, abs=0.1)
    assert facts.front_to_back_db is not None
    assert facts.front_to_back_db > 40.0
    shown = [facts.azimuth.peak_deg, facts.azimuth.half_power_deg, facts.far_field_m]
    assert all(math.copysign(1.0, value) == 1.0 for value in shown if value is not None)


def test_an_omni_has_no_front() -> None:
    for antenna in (KINDS["omni"], KINDS["dipole"]):
        facts = facts_of(antenna)
        assert facts.front_to_back_db is None
        assert facts.azimuth.half_power_deg is None
        assert facts.azimuth.side_lobe_db is None
        assert facts.cross_polar_db is None


def test_an_infinite_ground_plane_has_nothing_behind() -> None:
    assert facts_of(patch(frequency_hz=5.8e9)).front_to_back_db is None
    assert facts_of(patch(frequency_hz=5.8e9, front_to_back_db=18.0)).front_to_back_db == pytest.approx(18.0, abs=1.0)


def test_side_lobes_survive_one_degree_data_with_noise() -> None:
    real = patch_array(frequency_hz=5.8e9, rows=8, columns=8)
    truth = facts_of(real).elevation
    coarse = cut(real, "vertical", step_deg=1.0)
    noise = np.random.default_rng(3).normal(0.0, 0.15, coarse.angle_deg.size)
    relative = coarse.gain_dbi - real.peak_gain_dbi + noise
    data = MeasuredCut(angle_deg=coarse.angle_deg[:-1], relative_db=(relative - np.max(relative))[:-1])
    antenna = pattern_from_cuts(
        name="noisy", frequency_hz=5.8e9, gain_dbi=real.peak_gain_dbi - 1.0, azimuth=data, elevation=data
    )
    got = facts_of(antenna).elevation
    assert truth.side_lobe_db is not None
    assert got.side_lobe_db == pytest.approx(truth.side_lobe_db, abs=0.6)
    assert got.side_lobe_deg == pytest.approx(truth.side_lobe_deg, abs=1.5)  # its top is flat to the noise so far
    assert got.half_power_deg == pytest.approx(truth.half_power_deg, abs=0.4)


def test_ripples_on_the_flank_of_a_wide_beam_are_no_side_lobes() -> None:
    angle = np.arange(-180.0, 181.0)
    ripple = np.random.default_rng(4).normal(0.0, 0.15, angle.size)
    gain = np.maximum(-12.0 * (angle / 65.0) ** 2, -24.0) + ripple
    found = cut_facts(Cut(plane="horizontal", angle_deg=angle, gain_dbi=gain, cross_gain_dbi=gain - 30.0))
    assert found.side_lobe_db is None
    gain = np.maximum(gain, -15.0 - 0.5 * np.abs(np.abs(angle) - 110.0) + ripple)
    found = cut_facts(Cut(plane="horizontal", angle_deg=angle, gain_dbi=gain, cross_gain_dbi=gain - 30.0))
    assert found.side_lobe_db == pytest.approx(-15.0, abs=0.5)
    assert abs(found.peak_deg) < 6.0
    assert found.side_lobe_deg == pytest.approx(
        110.0, abs=2.0 + abs(found.peak_deg)
    )  # counted from where the ripple peaks


def test_cross_polar_is_told_in_the_middle_of_a_tilted_beam() -> None:
    made = from_data_sheet(
        name="tilted",
        frequency_hz=5.8e9,
        gain_dbi=17.0,
        azimuth_width_deg=65.0,
        elevation_width_deg=6.0,
        front_to_back_db=30.0,
        cross_polar_db=22.0,
        downtilt_deg=4.0,
    )
    assert facts_of(made).cross_polar_db == pytest.approx(22.0, abs=0.01)


def test_electrical_downtilt_lowers_the_beam() -> None:
    for antenna, tilt in ((KINDS["omni"], 4.0), (KINDS["sector"], 3.0)):
        assert facts_of(antenna).elevation.peak_deg == pytest.approx(-tilt, abs=0.35)


def test_cut_facts_of_a_cut_that_never_falls() -> None:
    flat = cut(KINDS["dipole"], "horizontal")
    assert cut_facts(flat).half_power_deg is None


@settings(max_examples=25, deadline=None, derandomize=True)
@given(
    azimuth=st.floats(5.0, 120.0),
    elevation=st.floats(5.0, 60.0),
    below=st.floats(0.6, 3.0),
    back=st.floats(18.0, 60.0),
    cross=st.floats(10.0, 40.0),
    tilt=st.floats(-5.0, 5.0),
)
def test_data_sheets_are_honoured_with_their_energy(
    azimuth: float, elevation: float, below: float, back: float, cross: float, tilt: float
) -> None:
    # The practical estimate 32 400 / (az el) less a little is what data sheets come to; wide beams hold less than it says.
    gain = 10.0 * math.log10(32400.0 / (azimuth * elevation)) - below
    try:
        antenna = from_data_sheet(
            name="any",
            frequency_hz=5.8e9,
            gain_dbi=gain,
            azimuth_width_deg=azimuth,
            elevation_width_deg=elevation,
            front_to_back_db=back,
            cross_polar_db=cross,
            downtilt_deg=tilt,
        )
    except AntennaError as refused:
        assert "more than it gets" in str(refused) or "outside" in str(refused)  # noqa: PT017
        bell = 1.133 * math.radians(azimuth) * math.radians(elevation)
        most = 4.0 * math.pi / (bell * (1.0 + 10.0 ** (-cross / 10.0)) + 0.35 * 10.0 ** (-back / 10.0))
        assert gain > 10.0 * math.log10(most) - 0.2, refused  # noqa: PT017
        return
    assert antenna.gain_dbi(0.0, -tilt) == pytest.approx(gain, abs=0.01)
    for side in (-0.5, 0.5):
        assert antenna.gain_dbi(side * azimuth, -tilt) == pytest.approx(gain - 3.01, abs=0.02)
        assert antenna.gain_dbi(0.0, -tilt + side * elevation) == pytest.approx(gain - 3.01, abs=0.02)
    assert antenna.gain_dbi(180.0, 0.0) == pytest.approx(gain - back, abs=0.01)
    assert antenna.gain_dbi(0.0, -tilt) - antenna.cross_gain_dbi(0.0, -tilt) == pytest.approx(cross, abs=0.01)
    assert antenna.efficiency is not None
    assert antenna.efficiency <= 1.0
    refuse_surplus(antenna)


@pytest.mark.parametrize(
    ("changed", "told"),
    [
        ({"gain_dbi": 30.0}, "30.00 dBi"),
        ({"azimuth_width_deg": 200.0}, "200"),
        ({"elevation_width_deg": 0.01}, "0.01"),
        ({"front_to_back_db": None}, "front-to-back"),
        ({"azimuth_width_deg": None}, "omni"),
        ({"cross_polar_db": 3.0}, "3"),
        ({"downtilt_deg": 31.0}, "31"),
        ({"gain_dbi": math.nan}, "nan"),
    ],
)
def test_impossible_data_sheets_are_refused(changed: dict[str, object], told: str) -> None:
    good = {
        "name": "panel",
        "frequency_hz": 5.8e9,
        "gain_dbi": 17.0,
        "azimuth_width_deg": 90.0,
        "elevation_width_deg": 6.0,
        "front_to_back_db": 30.0,
    }
    with pytest.raises(AntennaError, match=told):
        from_data_sheet(**{**good, **changed})


@pytest.mark.parametrize(
    ("make", "told"),
    [
        (lambda: dish(frequency_hz=5.8e9, diameter_m=0.01), "0.19"),
        (lambda: dish(frequency_hz=5.8e9, diameter_m=0.6, aperture_efficiency=0.95), "more than its taper"),
        (lambda: dish(frequency_hz=5.8e9, diameter_m=0.6, taper_power=3), "3"),
        (lambda: collinear(frequency_hz=2.4e9, elements=70), "70"),
        (lambda: collinear(frequency_hz=2.4e9, elements=4, spacing_wavelengths=0.3), "0.3"),
        (lambda: patch_array(frequency_hz=5.8e9, rows=0, columns=1), "0"),
        (lambda: patch(frequency_hz=5.8e9, permittivity=40.0), "40"),
        (lambda: propose_yagi(frequency_hz=450e6, boom_m=0.1), "0.100 m"),
        (lambda: YagiDesign(frequency_hz=1e9, place_m=(0.0, 0.0), length_m=(0.1, 0.1), rod_diameter_m=0.002), "rising"),
        (lambda: YagiDesign(frequency_hz=1e9, place_m=(0.0,), length_m=(0.1,), rod_diameter_m=0.002), "1"),
        (
            lambda: YagiDesign(
                frequency_hz=1e9, place_m=(0.0, 0.1), length_m=(0.1, 0.1), rod_diameter_m=0.002, driven=2
            ),
            "2",
        ),
    ],
)
def test_impossible_antennas_are_refused_with_the_value(make: object, told: str) -> None:
    with pytest.raises(AntennaError, match=told) as caught:
        make()
    assert len(str(caught.value).splitlines()) <= 4


def test_fatter_rods_are_cut_shorter_and_keep_the_gain() -> None:
    thin, fat = (propose_yagi(frequency_hz=450e6, boom_m=0.8, rod_diameter_m=d) for d in (0.003, 0.012))
    assert all(b < a for a, b in zip(thin.length_m[2:], fat.length_m[2:], strict=True))
    assert yagi(thin).peak_gain_dbi == pytest.approx(yagi(fat).peak_gain_dbi, abs=0.4)
