"""Trees are counted once, by the cheaper way past them; and low k, which lifts the Earth into the way."""

import itertools
from dataclasses import replace

import numpy as np
import pytest
from made_profiles import profile_of
from signal_links import CLIMATE, over, radio, result_of, signal_of, working

from fellspan.climate.given import GivenClimate
from fellspan.links.radio import CoChannel
from fellspan.links.site import Antenna, Diversity
from fellspan.propagation import woodland_loss_db, woodland_saturation_db, woodland_specific_db_per_m


def climate(**changes: object) -> GivenClimate:
    return replace(CLIMATE, **changes)  # type: ignore[arg-type]


# Trees


def _wood(depth_m: float, height_m: float, *, frequency_hz: float = 450e6):  # type: ignore[no-untyped-def]
    """Flat 10 km with a wood of that depth in the middle, antennas at 20 m."""
    profile = profile_of(10e3, cover=lambda d: np.where(np.abs(d - 5e3) <= depth_m / 2.0, height_m, 0.0), n=2001)
    result = result_of(over(profile, height_m=20.0, equipment=radio(frequency_hz=frequency_hz)), profile)
    return result, signal_of(result).trees


def test_thin_trees_cost_the_way_through() -> None:
    result, trees = _wood(20.0, 40.0)
    assert trees.way == "through"
    assert trees.depth_m == pytest.approx(20.0, abs=5.0)
    woods = woodland_loss_db(
        trees.depth_m,
        specific_db_per_m=woodland_specific_db_per_m(450e6),
        saturation_db=woodland_saturation_db(450e6),
    )
    assert result.losses_db.vegetation == pytest.approx(woods)
    assert result.losses_db.diffraction + woods == pytest.approx(trees.through_db)
    assert trees.least_through_db < trees.through_db < trees.most_through_db
    assert any("m of wood" in caution for caution in result.cautions)


def test_deep_trees_cost_the_way_over() -> None:
    result, trees = _wood(3000.0, 25.0, frequency_hz=6e9)
    assert trees.way == "over"
    assert result.losses_db.vegetation == 0.0
    assert result.losses_db.diffraction == pytest.approx(trees.over_db)
    assert trees.through_db > trees.over_db


def test_trees_are_counted_once_whatever_they_are() -> None:
    for depth, height, frequency in itertools.product((10.0, 100.0, 2000.0), (15.0, 25.0, 45.0), (450e6, 5.8e9)):
        result, trees = _wood(depth, height, frequency_hz=frequency)
        vegetation = result.losses_db.vegetation
        assert vegetation is not None
        assert result.losses_db.diffraction + vegetation == pytest.approx(min(trees.through_db, trees.over_db))


def test_buildings_are_never_passed_through() -> None:
    profile = profile_of(10e3, cover=lambda d: np.where(np.abs(d - 5e3) <= 50.0, 40.0, 0.0), kind="building")
    result = result_of(over(profile, height_m=20.0), profile)
    assert signal_of(result).trees.way == "no trees"
    assert result.losses_db.vegetation == 0.0
    assert result.losses_db.diffraction > 10.0


# Low k


def _grazing(power_dbm: float, **figures: float):  # type: ignore[no-untyped-def]
    """A ridge up to the ray in the middle of 40 km, where low k lifts it into the way."""
    profile = profile_of(40e3, lambda d: np.maximum(0.0, 66.0 - np.abs(d - 20e3) / 50.0))
    given = climate(rain_rate_001_mm_h=0.0, **figures)
    link = over(profile, height_m=90.0, equipment=radio(power_dbm=power_dbm, frequency_hz=6e9))
    return signal_of(result_of(link, profile, climate=given)).a_to_b


def test_low_k_takes_a_grazing_link_down_and_a_wider_spread_more_often() -> None:
    shares = []
    for tail in (20.0, 60.0, 120.0):
        row = _grazing(0.0, gradient_tail_n_per_km=tail).modulations[0]
        assert row.year is not None
        assert row.worst_month is not None
        assert row.year.diffraction is not None
        assert row.worst_month.diffraction is not None
        assert row.year.diffraction <= row.worst_month.diffraction <= 12.0 * row.year.diffraction + 1e-12
        shares.append(row.year.diffraction)
    assert shares == sorted(shares)
    assert shares[0] < shares[-1]
    assert shares[-1] > 1e-3


def test_low_k_leaves_what_the_level_counts_already_alone() -> None:
    """Where diffraction at the median costs 10 dB and the margin is 1 dB, the link is down for half the time, not all."""
    there = _grazing(-10.0, gradient_tail_n_per_km=60.0)
    median = working(there, "diffraction").value
    assert median is not None
    assert median > 3.0
    margin = there.modulations[0].margin_db
    assert margin is not None
    slight = _grazing(-10.0 - margin + 0.05, gradient_tail_n_per_km=60.0).modulations[0]
    assert slight.margin_db == pytest.approx(0.05)
    assert slight.year is not None
    assert slight.year.diffraction == pytest.approx(50.0, abs=5.0)


def test_without_a_tail_low_k_rests_on_the_worst_month() -> None:
    profile = profile_of(40e3, lambda d: np.maximum(0.0, 66.0 - np.abs(d - 20e3) / 50.0))
    link = over(profile, height_m=90.0, equipment=radio(power_dbm=0.0, frequency_hz=6e9))
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr("fellspan.climate.maps.MAP_PACKAGE", "a_package_that_is_not_there")
        given = GivenClimate(rain_rate_001_mm_h=0.0, dn1_n_per_km=-200.0)
        row = signal_of(result_of(link, profile, climate=given)).a_to_b.modulations[0]
    assert row.year is not None
    assert row.worst_month is not None
    assert 0.0 < (row.year.diffraction or 0.0) < (row.worst_month.diffraction or 0.0)


def test_at_low_k_too_the_cheaper_way_past_trees_counts() -> None:
    """Thin trees that reach the ray at low k only: through them costs a decibel or so, over them takes the link down."""

    def row(kind: str) -> float:
        profile = profile_of(
            40e3, lambda d: np.zeros(d.shape), cover=lambda d: np.where(np.abs(d - 20e3) < 20.0, 45.0, 0.0), kind=kind
        )
        link = over(profile, height_m=75.0, equipment=radio(power_dbm=-10.0, frequency_hz=2e9))
        there = signal_of(result_of(link, profile, climate=climate(gradient_tail_n_per_km=120.0))).a_to_b
        year = there.modulations[0].year
        assert year is not None
        assert year.diffraction is not None
        return year.diffraction

    assert row("tree") < 0.5 * row("building")


def test_a_ray_over_the_trees_passes_through_none() -> None:
    _, trees = _wood(100.0, 5.0, frequency_hz=6e9)
    assert trees.depth_m == 0.0
    assert trees.through_db == trees.over_db


def test_a_second_antenna_takes_cross_polar_outage_down_with_the_rest() -> None:
    one = Antenna(gain_dbi=38.0)
    two = replace(one, diversity=Diversity(spacing_m=10.0))
    equipment = radio(frequency_hz=6e9, co_channel=CoChannel(required_ratio_db=30.0), dual_polarization=True)
    dry = climate(rain_rate_001_mm_h=0.0)
    profile = profile_of(50e3)
    shares = []
    for antenna in (one, two):
        link = over(profile, equipment=equipment, height_m=120.0, antenna_b=antenna)
        row = signal_of(result_of(link, profile, climate=dry)).a_to_b.modulations[0]
        assert row.worst_month is not None
        shares.append(row.worst_month.multipath or 0.0)
    assert shares[1] < 0.2 * shares[0]


def test_a_worst_month_holds_no_more_than_all_of_the_year() -> None:
    """Over open sea the gradient hardly spreads: what the temperate worst month would say does not fit in such a year."""
    row = _grazing(2.0, gradient_tail_n_per_km=-20.0).modulations[0]
    assert row.year is not None
    assert row.worst_month is not None
    assert row.worst_month.diffraction == pytest.approx(12.0 * (row.year.diffraction or 0.0))
