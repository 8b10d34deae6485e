"""The footprint on flat ground: edges where trigonometry puts them, widths from the pattern itself, rings for omnis."""

import math

import numpy as np
import pytest

from fellspan.antennas.data_sheet import from_data_sheet
from fellspan.antennas.dishes import dish
from fellspan.antennas.footprint import footprint
from fellspan.antennas.mounting import Mounting, gain_toward_dbi
from fellspan.antennas.pattern import Pattern
from fellspan.errors import AntennaError

SECTOR = from_data_sheet(
    name="sector",
    frequency_hz=5.8e9,
    gain_dbi=16.0,
    azimuth_width_deg=60.0,
    elevation_width_deg=8.0,
    front_to_back_db=28.0,
)
OMNI = from_data_sheet(
    name="omni", frequency_hz=5.8e9, gain_dbi=9.0, azimuth_width_deg=None, elevation_width_deg=12.0, downtilt_deg=3.0
)
DISH = dish(frequency_hz=5.8e9, diameter_m=0.6)


def away(height_m: float, down_deg: float) -> float:
    return height_m / math.tan(math.radians(down_deg))


def test_half_power_edges_lie_half_a_beamwidth_either_side_of_the_tilt() -> None:
    shown = footprint(SECTOR, height_m=30.0, tilt_deg=-6.0)
    first = shown.contours[0]
    assert shown.centre_m == pytest.approx(away(30.0, 6.0))
    # 3 dB of the contour is a hair less than half power, 3.0103 dB
    assert first.near_m == pytest.approx(away(30.0, 10.0), rel=2e-3)
    assert first.far_m == pytest.approx(away(30.0, 2.0), rel=4e-3)


@pytest.mark.parametrize(("pattern", "tilt_deg"), [(SECTOR, -6.0), (SECTOR, -1.0), (DISH, -5.0), (DISH, -45.0)])
def test_every_point_of_an_outline_has_the_gain_it_stands_for(pattern: Pattern, tilt_deg: float) -> None:
    height_m = 25.0
    shown = footprint(pattern, height_m=height_m, tilt_deg=tilt_deg)
    mounting = Mounting(bearing_deg=0.0, tilt_deg=tilt_deg)
    for contour in shown.contours:
        distance = np.hypot(contour.ahead_m, contour.right_m)
        inside = distance < 0.999 * shown.reach_m
        assert np.count_nonzero(inside) > 20
        bearing = np.degrees(np.arctan2(contour.right_m, contour.ahead_m))[inside] % 360.0
        gain = np.asarray(
            gain_toward_dbi(pattern, mounting, bearing, -np.degrees(np.arctan(height_m / distance[inside])))
        )
        assert np.max(np.abs(gain - pattern.peak_gain_dbi - contour.level_db)) < 0.1


def test_lower_levels_reach_further_on_all_sides() -> None:
    shown = footprint(SECTOR, height_m=30.0, tilt_deg=-12.0)
    near = [contour.near_m or 0.0 for contour in shown.contours]
    far = [contour.far_m or math.inf for contour in shown.contours]
    wide = [contour.width_m or math.inf for contour in shown.contours]
    assert near == sorted(near, reverse=True)
    assert far == sorted(far)
    assert wide == sorted(wide)


def test_a_beam_above_the_horizon_is_open_ahead() -> None:
    shown = footprint(SECTOR, height_m=30.0, tilt_deg=0.0)
    assert shown.centre_m is None
    assert shown.contours[0].near_m == pytest.approx(away(30.0, 4.0), rel=2e-3)
    assert (shown.contours[0].far_m, shown.contours[0].width_m) == (None, None)
    assert float(np.max(np.hypot(shown.contours[0].ahead_m, shown.contours[0].right_m))) <= shown.reach_m * 1.001


def test_an_omni_leaves_rings() -> None:
    shown = footprint(OMNI, height_m=20.0, tilt_deg=-6.0)
    first = shown.contours[0]
    assert shown.is_ring
    assert shown.centre_m == pytest.approx(away(20.0, 9.0), rel=0.01)
    assert first.near_m == pytest.approx(away(20.0, 15.0), rel=3e-3)
    assert first.far_m == pytest.approx(away(20.0, 3.0), rel=5e-3)
    assert np.ptp(np.hypot(first.ahead_m, first.right_m)) < 1e-6


@pytest.mark.parametrize(
    ("changes", "words"),
    [
        ({"height_m": 0.0}, "0 m"),
        ({"tilt_deg": -91.0}, "-91"),
        ({"tilt_deg": 30.0}, "meets no ground"),
        ({"levels_db": (3.0,)}, "3 dB"),
    ],
)
def test_what_cannot_be_is_refused(changes: dict[str, object], words: str) -> None:
    with pytest.raises(AntennaError, match=words):
        footprint(SECTOR, **({"height_m": 30.0, "tilt_deg": -5.0} | changes))
