"""Prepared patterns: each form is found, and the table keeps its promise at directions that it was not made with."""

import math

import numpy as np
import pytest

from fellspan.antennas.data_sheet import from_data_sheet
from fellspan.antennas.dishes import dish
from fellspan.antennas.envelopes import f699_envelope
from fellspan.antennas.patches import patch, patch_array
from fellspan.antennas.prepared import CHUNK, prepare
from fellspan.antennas.wires import collinear, dipole
from fellspan.antennas.yagi import propose_yagi, yagi


def sheet(azimuth: float | None, elevation: float, gain: float, tilt: float = 0.0) -> object:
    return from_data_sheet(
        name="sheet",
        frequency_hz=5.8e9,
        gain_dbi=gain,
        azimuth_width_deg=azimuth,
        elevation_width_deg=elevation,
        front_to_back_db=None if azimuth is None else 35.0,
        downtilt_deg=tilt,
    )


CASES = {
    "dish": (lambda: dish(frequency_hz=5.8e9, diameter_m=0.6), "revolved"),
    "narrow dish": (lambda: dish(frequency_hz=80e9, diameter_m=0.6), "revolved"),
    "dipole": (lambda: dipole(frequency_hz=2.4e9), "omni"),
    "omni": (lambda: collinear(frequency_hz=5.8e9, elements=12, downtilt_deg=3.0), "omni"),
    "omni sheet": (lambda: sheet(None, 8.0, 9.0), "omni"),
    "patch": (lambda: patch(frequency_hz=5.8e9), "separable"),
    "panel": (lambda: patch_array(frequency_hz=5.8e9, rows=8, columns=8), "separable"),
    "sector": (lambda: patch_array(frequency_hz=5.8e9, rows=12, columns=1, downtilt_deg=3.0), "separable"),
    "sector sheet": (lambda: sheet(90.0, 6.0, 17.0, 2.0), "grid"),
    "narrow sheet": (lambda: sheet(2.0, 2.0, 37.0), "grid"),
    "yagi": (lambda: yagi(propose_yagi(frequency_hz=450e6, boom_m=0.8)), "grid"),
}


@pytest.mark.parametrize("case", CASES)
def test_table_error_is_under_a_hundredth_of_a_decibel(case: str) -> None:
    make, form = CASES[case]
    antenna = make()
    ready = prepare(antenna)
    assert ready.form == form
    assert ready.error_db <= 0.01
    random = np.random.default_rng(5)
    beam = min(math.degrees(299_792_458.0 / (antenna.frequency_hz * antenna.size_m)), 60.0)
    azimuth = np.concatenate((random.uniform(-180.0, 180.0, 60_000), random.uniform(-2.0, 2.0, 60_000) * beam))
    elevation = np.concatenate(
        (np.degrees(np.arcsin(random.uniform(-1.0, 1.0, 60_000))), random.uniform(-1.4, 1.4, 60_000) * beam)
    )
    exact = np.asarray(antenna.gain_dbi(azimuth, elevation))
    off = np.abs(np.asarray(ready.gain_dbi(azimuth, elevation)) - exact)
    down = antenna.peak_gain_dbi - exact
    assert np.max(off[down <= 30.0]) < 0.01
    assert np.max(off[(down > 30.0) & (down <= 40.0)], initial=0.0) < 0.16


@pytest.mark.slow
def test_a_long_yagi_keeps_the_bound_too() -> None:
    antenna = yagi(propose_yagi(frequency_hz=2.4e9, boom_m=0.53))
    ready = prepare(antenna)
    assert ready.form == "grid"
    random = np.random.default_rng(6)
    azimuth, elevation = random.uniform(-180.0, 180.0, 100_000), random.uniform(-90.0, 90.0, 100_000)
    exact = np.asarray(antenna.gain_dbi(azimuth, elevation))
    off = np.abs(np.asarray(ready.gain_dbi(azimuth, elevation)) - exact)
    assert np.max(off[exact >= antenna.peak_gain_dbi - 30.0]) < 0.01


def test_an_envelope_with_steps_is_left_exact() -> None:
    envelope = f699_envelope(frequency_hz=80e9, diameter_m=0.3)
    ready = prepare(envelope)
    angle = np.linspace(-180.0, 180.0, 999)
    assert ready.form == "exact" or ready.error_db <= 0.01
    if ready.form == "exact":
        assert np.array_equal(np.asarray(ready.gain_dbi(angle, 0.0)), np.asarray(envelope.gain_dbi(angle, 0.0)))


@pytest.mark.parametrize("case", ["dish", "omni", "panel", "sector sheet"])
def test_shapes_gaps_turns_and_buffers(case: str) -> None:
    antenna = CASES[case][0]()
    ready = prepare(antenna)
    assert type(ready.gain_dbi(10.0, 1.0)) is float
    assert ready.gain_dbi(10.0, 1.0) == pytest.approx(antenna.gain_dbi(10.0, 1.0), abs=0.15)
    grid = ready.gain_dbi(np.arange(-180.0, 180.0, 3.0)[None, :], np.arange(-90.0, 91.0, 1.0)[:, None])
    assert grid.shape == (181, 120)
    gaps = np.asarray(ready.gain_dbi(np.array([np.nan, 0.0, 3.0]), np.array([0.0, np.nan, 0.0])))
    assert list(np.isnan(gaps)) == [True, True, False]
    assert ready.gain_dbi(370.0, 1.0) == pytest.approx(ready.gain_dbi(10.0, 1.0), abs=1e-3)
    azimuth = np.linspace(-180.0, 180.0, 2 * CHUNK + 17)
    whole = ready.gain_dbi(azimuth, 0.5)
    for kind in (np.float64, np.float32):
        out = np.empty(azimuth.shape, dtype=kind)
        assert ready.gain_dbi(azimuth, 0.5, out=out) is out
        assert np.array_equal(out, whole.astype(kind))
    # One at a time is the same as all at once, across the seam between chunks.
    for at in (0, CHUNK - 1, CHUNK, CHUNK + 1, azimuth.size - 1):
        assert ready.gain_dbi(float(azimuth[at]), 0.5) == pytest.approx(whole[at], abs=1e-9)
    assert ready.gain_dbi(np.empty(0), 0.0).shape == (0,)
    with pytest.raises(ValueError, match="shape"):
        ready.gain_dbi(azimuth, 0.5, out=np.empty(3))


def test_poles_and_straight_behind_are_inside_the_table() -> None:
    for case in ("dish", "omni", "panel", "sector sheet", "yagi"):
        antenna = CASES[case][0]()
        ready = prepare(antenna)
        for azimuth, elevation in ((180.0, 0.0), (-180.0, 0.0), (0.0, 90.0), (0.0, -90.0), (180.0, 90.0), (90.0, 0.0)):
            exact, read = antenna.gain_dbi(azimuth, elevation), ready.gain_dbi(azimuth, elevation)
            assert 10.0 ** (read / 20.0) == pytest.approx(
                10.0 ** (exact / 20.0), rel=2e-3, abs=2e-3 * 10.0 ** (antenna.peak_gain_dbi / 20.0) * 0.03
            ), case
