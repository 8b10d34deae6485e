"""Against Rec. ITU-R P.526-16: values worked by hand from its formulas in double precision, and computed with the code that
ITU-R Study Group 3 publishes for P.1812-6 and P.452-17 (which rounds its constants: `practical` below)."""

import numpy as np
import pytest

from fellspan.propagation import (
    bullington_loss_db,
    delta_bullington_loss_db,
    double_edge_loss_db,
    effective_heights_m,
    fresnel_radius_m,
    knife_edge_loss_db,
    knife_edge_loss_exact_db,
    knife_edge_nu,
    rounded_obstacle_extra_db,
    rounded_obstacle_loss_db,
    spherical_earth_loss_db,
)

K_8500 = 8500.0 / 6371.0


@pytest.mark.parametrize(
    ("frequency_hz", "a_km", "b_km", "radius_m"),
    [(5.8e9, 5, 5, 11.368), (2.4e9, 25, 25, 39.515), (11e9, 1, 9, 4.953), (6e9, 10, 40, 19.993)],
)
def test_first_fresnel_zone(frequency_hz: float, a_km: float, b_km: float, radius_m: float) -> None:
    # Equation (2), by hand, 1 mm.
    assert fresnel_radius_m(a_km * 1e3, b_km * 1e3, frequency_hz=frequency_hz) == pytest.approx(radius_m, abs=6e-4)


@pytest.mark.parametrize(
    ("nu", "loss_db"),
    [
        (-1, 0),
        (-0.5, 1.9593),
        (0, 6.0327),
        (0.5, 10.2884),
        (1, 13.926),
        (2, 19.043),
        (2.4, 20.539),
        (3, 22.416),
        (5, 26.814),
        (10, 32.855),
    ],
)
def test_knife_edge_by_equation_31(nu: float, loss_db: float) -> None:
    assert knife_edge_loss_db(nu) == pytest.approx(loss_db, abs=6e-4)


@pytest.mark.parametrize(
    ("nu", "loss_db", "within"),
    [
        (-1, -1.00, 0.006),
        (-0.5, 1.859, 6e-4),
        (0, 6.0206, 6e-5),
        (1, 13.864, 6e-4),
        (5, 26.936, 6e-4),
        (10, 32.954, 6e-4),
    ],
)
def test_knife_edge_by_equation_30(nu: float, loss_db: float, within: float) -> None:
    assert knife_edge_loss_exact_db(nu) == pytest.approx(loss_db, abs=within)


def test_knife_edge_parameter() -> None:
    # Equation (26) by hand: 10 m above the ray, 5 and 10 km, 6 GHz.
    assert knife_edge_nu(10.0, from_a_m=5e3, from_b_m=10e3, frequency_hz=6e9) == pytest.approx(1.0958, abs=6e-5)


def test_double_edge_spacing_term() -> None:
    # Section 4.3 by hand: stretches 5, 10, 5 km make Lc 0.512 dB.
    stretches = {"a_to_first_m": 5e3, "first_to_second_m": 10e3, "second_to_b_m": 5e3}
    total = double_edge_loss_db(60.0, 60.0, **stretches, frequency_hz=2e9)
    # By symmetry each edge stands 60 - 60 * 5/15 = 40 m above its own line of 5 and 10 km.
    one = knife_edge_loss_db(knife_edge_nu(40.0, from_a_m=5e3, from_b_m=10e3, frequency_hz=2e9))
    assert isinstance(total, float)
    assert isinstance(one, float)
    assert total - 2 * one == pytest.approx(0.512, abs=6e-4)


@pytest.mark.parametrize(("radius_m", "loss_db"), [(100, 21.46), (1000, 23.38), (10_000, 27.51)])
def test_rounded_obstacle(radius_m: float, loss_db: float) -> None:
    # Section 4.2 by hand: 5 and 10 km, 20 m, 6 GHz, knife edge by (31).
    loss = rounded_obstacle_loss_db(20.0, from_a_m=5e3, from_b_m=10e3, radius_m=radius_m, frequency_hz=6e9)
    assert loss == pytest.approx(loss_db, abs=0.006)


@pytest.mark.parametrize(("m", "n", "extra_db"), [(0.1, 1, 3.4327), (0.5, 2, 17.664), (1, 5, 73.02)])
def test_roundness_term(m: float, n: float, extra_db: float) -> None:
    assert rounded_obstacle_extra_db(m, n) == pytest.approx(extra_db, rel=5e-5)


SPHERES = [
    # km, h1 = h2 m, GHz, horizontal and vertical by hand in self-consistent units, then practical horizontal, vertical
    (50, 30, 1.0, 21.9574, 21.9583, 21.957, 21.958),
    (20, 10, 5.8, 9.0222, 9.0227, 9.023, 9.023),
    (80, 50, 6.0, 48.0656, 48.0634, 48.059, 48.057),
    (100, 20, 0.45, 63.6419, 63.6313, 63.637, 63.627),
    (40, 30, 2.4, 10.1200, 10.1206, 10.120, 10.121),
]


@pytest.mark.parametrize(("km", "height", "ghz", "horizontal", "vertical", "rounded_h", "rounded_v"), SPHERES)
def test_spherical_earth(
    km: float, height: float, ghz: float, horizontal: float, vertical: float, rounded_h: float, rounded_v: float
) -> None:
    for word, exact, rounded in (("horizontal", horizontal, rounded_h), ("vertical", vertical, rounded_v)):
        loss = spherical_earth_loss_db(
            km * 1e3, a_height_m=height, b_height_m=height, frequency_hz=ghz * 1e9, k=K_8500, polarization=word
        )
        assert loss == pytest.approx(exact, abs=6e-5)
        # The reference code rounds its constants, which costs up to 0.007 dB here.
        assert loss == pytest.approx(rounded, abs=0.008)


def test_sea_differs_from_land_by_little() -> None:
    # Computed with the Study Group 3 codes: less than 0.1 dB at these frequencies and distances.
    paths = {"a_height_m": 30, "b_height_m": 30, "frequency_hz": 1e9, "k": K_8500, "polarization": "vertical"}
    land = spherical_earth_loss_db(50e3, sea_fraction=0.0, **paths)
    sea = spherical_earth_loss_db(50e3, sea_fraction=1.0, **paths)
    half = spherical_earth_loss_db(50e3, sea_fraction=0.5, **paths)
    assert sea != land
    assert sea == pytest.approx(land, abs=0.1)
    assert half == pytest.approx((land + sea) / 2, abs=1e-12)


RIDGE = (200, 150, 120, 160, 240, 330, 250, 180, 150, 160, 180)
PEAKS = (100, 120, 260, 150, 120, 100, 130, 180, 280, 150, 100)
VALLEY = (200, 150, 120, 100, 110, 140, 120, 100, 90, 120, 180)
PROFILES = [
    # heights every 5 km, GHz, smooth-surface level at A and B, Bullington real and smooth, spherical, whole; by hand, the two
    # Bullington terms identical in both Study Group 3 codes
    (RIDGE, 2, 130, 146, 37.3162, 0, 0, 37.3162),
    (RIDGE, 6, 130, 146, 42.1741, 0, 0, 42.1741),
    ((0,) * 11, 2, 0, 0, 16.0240, 16.0240, 21.1064, 21.1064),
    ((0,) * 11, 6, 0, 0, 17.9997, 17.9997, 21.4187, 21.4187),
    (PEAKS, 2, 74.3571, 93.6429, 46.3350, 8.5055, 9.1485, 46.9780),
    (PEAKS, 6, 74.3571, 93.6429, 51.1423, 4.9036, 4.8449, 51.1423),
    (VALLEY, 2, 138.8, 109.2, 0, 0, 0, 0),
    (VALLEY, 6, 138.8, 109.2, 0, 0, 0, 0),
]  # fmt: skip


@pytest.mark.parametrize(("heights", "ghz", "level_a", "level_b", "real", "smooth", "sphere", "whole"), PROFILES)
def test_complete_method_part_by_part(
    heights: tuple[float, ...],
    ghz: float,
    level_a: float,
    level_b: float,
    real: float,
    smooth: float,
    sphere: float,
    whole: float,
) -> None:
    distance, ground = np.arange(11) * 5e3, np.array(heights, dtype=float)
    a, b = ground[0] + 30.0, ground[-1] + 30.0
    wave = {"frequency_hz": ghz * 1e9, "k": K_8500}
    height_a, height_b = effective_heights_m(distance, ground, a_amsl_m=a, b_amsl_m=b)
    assert a - height_a == pytest.approx(level_a, abs=6e-5)
    assert b - height_b == pytest.approx(level_b, abs=6e-5)
    assert bullington_loss_db(distance, ground, a_amsl_m=a, b_amsl_m=b, **wave) == pytest.approx(real, abs=6e-5)
    flat = bullington_loss_db(distance, 0 * ground, a_amsl_m=height_a, b_amsl_m=height_b, **wave)
    assert flat == pytest.approx(smooth, abs=6e-5)
    globe = spherical_earth_loss_db(distance[-1], a_height_m=height_a, b_height_m=height_b, **wave)
    assert globe == pytest.approx(sphere, abs=6e-5)
    loss = delta_bullington_loss_db(distance, ground, a_amsl_m=a, b_amsl_m=b, **wave)
    assert loss == pytest.approx(whole, abs=6e-5)


@pytest.mark.parametrize(("heights", "ghz", "word", "loss_db"), [
    ((0,) * 11, 2, "horizontal", 21.1059),
    ((0,) * 11, 6, "horizontal", 21.4169),
    (PEAKS, 2, "horizontal", 46.9778),
    (PEAKS, 2, "vertical", 46.9783),
])  # fmt: skip
def test_study_group_3_codes(heights: tuple[float, ...], ghz: float, word: str, loss_db: float) -> None:
    # Computed with the Study Group 3 codes, whose rounded constants cost up to 0.002 dB here.
    distance, ground = np.arange(11) * 5e3, np.array(heights, dtype=float)
    loss = delta_bullington_loss_db(
        distance,
        ground,
        a_amsl_m=ground[0] + 30.0,
        b_amsl_m=ground[-1] + 30.0,
        frequency_hz=ghz * 1e9,
        k=K_8500,
        polarization=word,
    )
    assert loss == pytest.approx(loss_db, abs=0.0025)
