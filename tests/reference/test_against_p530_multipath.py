"""Against Rec. ITU-R P.530-19, and P.2001-6 for older forms: multipath, diversity and cross-polar outage.

Numbers without another source were worked by hand from the printed formulas, independently of any program.
"""

import math

import numpy as np
import pytest

from fellspan.propagation import (
    amplitude_correlation,
    clear_air_cross_polar_outage_percent,
    clear_air_outage_percent,
    composite_fade_margin_db,
    diversity_improvement,
    diversity_outage_percent,
    enhancement_exceeded_percent,
    fade_exceeded_percent,
    fade_for_percent_db,
    frequency_correlation_squared,
    mean_echo_delay_s,
    multipath_activity,
    multipath_clearance_m,
    multipath_events_per_year,
    multipath_occurrence_detailed_percent,
    multipath_occurrence_percent,
    multipath_occurrence_quick_percent,
    older_space_improvement,
    rain_cross_polar_outage_percent,
    rain_discrimination_db,
    selective_correlation_squared,
    selective_outage_normalised_percent,
    selective_outage_percent,
    shorter_worst_period_factor,
    space_correlation_squared,
    tandem_outage_percent,
    transition_fade_db,
)


def digits(value: float, count: int) -> object:
    """Approx to half a unit in the last of so many significant digits."""
    return pytest.approx(value, abs=0.501 * 10.0 ** (math.floor(math.log10(abs(value))) + 1 - count), rel=0)


# log K, dN75, antennas and ground (m), km, GHz -> hc, p0. Equations (5) to (11); the code of a Study Group 3 author agrees.
EDITION_19 = [
    (-5.0, 0, 300, 350, 150, 40, 6, 159.314, 7.8788),
    (-5.0, 10, 300, 350, 150, 40, 6, 159.314, 7.8795),
    (-5.0, 20, 120, 130, 60, 50, 8, 40.490, 159.742),
    (-4.5, 40, 60, 60, 10, 30, 18, 41.176, 444.664),
]


@pytest.mark.parametrize(("log_k", "dn75", "a", "b", "ground", "km", "ghz", "clearance", "percent"), EDITION_19)
def test_occurrence_by_edition_19(
    log_k: float,
    dn75: float,
    a: float,
    b: float,
    ground: float,
    km: float,
    ghz: float,
    clearance: float,
    percent: float,
) -> None:
    heights = {"a_amsl_m": a, "b_amsl_m": b, "mean_ground_amsl_m": ground}
    assert multipath_clearance_m(km * 1e3, **heights) == pytest.approx(clearance, abs=6e-4)
    found = multipath_occurrence_percent(km * 1e3, frequency_hz=ghz * 1e9, log_k=log_k, dn75=dn75, **heights)
    assert found == pytest.approx(percent, abs=0.6e-3 if percent > 100 else 0.6e-4)


def test_surface_layer_has_its_limit() -> None:
    # By hand: 10 km, 1 GHz, both antennas 9.98 m above the mean ground at sea level, dN75 50: hc 9, so that the
    # exponential is 0.3203 and vlim = 50 x 10^1.5 / 24730 = 0.063935 takes over. p0 = 1e-5 x 10^3.51 x
    # 14^0.447 x 10^(0.376 x 0.80138 - 0.00027 x 9.98 + 17.85 x 0.063935).
    height = 9.0 + 100.0 / 102.0
    found = multipath_occurrence_percent(
        10e3, frequency_hz=1e9, a_amsl_m=height, b_amsl_m=height, mean_ground_amsl_m=0.0, log_k=-5.0, dn75=50.0
    )
    limit = 50.0 * 10.0**1.5 / 24730.0
    exponent = 0.376 * math.tanh(138.0 / 125.0) - 0.00027 * height + 17.85 * limit
    assert found == pytest.approx(1e-5 * 10.0**3.51 * 14.0**0.447 * 10.0**exponent, rel=1e-12)


def test_occurrence_by_edition_17() -> None:
    # 40 km, 6 GHz, 300 and 350 m, dN1 -200: quick by P.2001-6 (B.1), (B.6); detailed with a roughness of 40 m.
    path = {"frequency_hz": 6e9, "a_amsl_m": 300.0, "b_amsl_m": 350.0, "dn1_n_per_km": -200.0}
    assert multipath_occurrence_quick_percent(40e3, **path) == digits(6.4208, 5)
    detailed = multipath_occurrence_detailed_percent(40e3, terrain_roughness_m=40.0, **path)
    assert detailed == digits(6.8747, 5)
    assert fade_exceeded_percent(30.0, occurrence_percent=detailed) == digits(0.0068747, 5)


@pytest.mark.parametrize("metres", [0.0, 100.0, 5000.0])
def test_no_multipath_up_to_five_kilometres(metres: float) -> None:
    # Section 2.3: only above 5 km.
    path = {"frequency_hz": 6e9, "a_amsl_m": 300.0, "b_amsl_m": 350.0}
    assert multipath_occurrence_quick_percent(metres, dn1_n_per_km=-200.0, **path) == 0.0
    assert multipath_occurrence_detailed_percent(metres, dn1_n_per_km=-200.0, terrain_roughness_m=4.0, **path) == 0.0
    assert multipath_occurrence_percent(metres, mean_ground_amsl_m=100.0, log_k=-5.0, dn75=10.0, **path) == 0.0
    beyond = multipath_occurrence_quick_percent(5000.1, dn1_n_per_km=-200.0, **path)
    assert isinstance(beyond, float)
    assert beyond > 0.0


# p0 %, At dB, then percent at 5, 10, 20, 25 and 30 dB; None where the hand calculation has none. Equations (12) to (18).
FADE_DEPTHS = [
    (4.0, 25.7225, (2.0795, 0.35878, 0.035616, 0.012446, 0.004)),
    (20.0, 26.5612, (4.4090, 1.1743, 0.16749, 0.061001, 0.02)),
    (0.5, None, (None, 0.07709, None, None, 0.0005)),
    (100.0, None, (None, 3.8174, 0.78835, None, 0.1)),
]


@pytest.mark.parametrize(("occurrence", "transition", "percents"), FADE_DEPTHS)
def test_every_fade_depth(occurrence: float, transition: float | None, percents: tuple[float | None, ...]) -> None:
    if transition is not None:
        assert transition_fade_db(occurrence) == digits(transition, 6)
    for fade, percent in zip((5.0, 10.0, 20.0, 25.0, 30.0), percents, strict=True):
        if percent is not None:
            assert fade_exceeded_percent(fade, occurrence_percent=occurrence) == pytest.approx(percent, rel=3e-5)
            assert fade_for_percent_db(percent, occurrence_percent=occurrence) == pytest.approx(fade, abs=3e-4)
    assert fade_exceeded_percent(0.0, occurrence_percent=occurrence) == pytest.approx(63.212, abs=1e-3)


def test_enhancement() -> None:
    # Equation (19) by hand: 100 - pw = 10^((-1.7 + 0.2 x 30 - 12)/3.5) = 10^-2.2 %.
    assert enhancement_exceeded_percent(12.0, fade_001_db=30.0) == pytest.approx(10.0**-2.2, rel=1e-12)


def test_periods_events_and_hops() -> None:
    # Equation (31); equations (25) to (27) must give 1 for a month of 720 h, and do to their rounded factors.
    assert multipath_events_per_year(0.001) == digits(5.16, 3)
    assert multipath_events_per_year(0.01) == digits(45.95, 4)
    for relief in ("flat", "hilly", "hilly land"):
        assert shorter_worst_period_factor(720.0, relief=relief) == pytest.approx(1.0, abs=0.005)  # type: ignore[arg-type]
    # Equation (30): 30 dB, 40 and 50 km give C = 0.881, so for 0.01 % each: 2e-4 - (1e-8)^0.881, in per cent.
    both = tandem_outage_percent([0.01, 0.01], distance_m=[40e3, 50e3], fade_db=30.0)
    assert both == pytest.approx(100.0 * (2e-4 - 1e-8**0.881), rel=1e-9)


def test_selective_fading() -> None:
    # Equations (102), (116), (117): p0 10 %, 50 km, 28 MHz, 20 dB; and 5 %, 40 km, 30 MHz, 18 dB; both kinds of echo alike.
    assert multipath_activity(10.0) == digits(0.034941, 5)
    assert mean_echo_delay_s(50e3) == pytest.approx(0.7e-9, rel=1e-12)
    assert mean_echo_delay_s(40e3) == digits(0.52374e-9, 5)
    one = selective_outage_percent(10.0, distance_m=50e3, signature_width_hz=28e6, signature_depth_db=20.0)
    assert one == digits(3.272e-3, 4)
    two = selective_outage_percent(5.0, distance_m=40e3, signature_width_hz=30e6, signature_depth_db=18.0)
    assert two == digits(1.4796e-3, 5)


def test_normalised_signature_is_the_same_law() -> None:
    # (118) equals (117) where 2 Kn / T^2 = 2 W 10^(-B/20) / tau_r.
    width_hz, depth_db, delay_s, baud_s = 30e6, 18.0, 6.3e-9, 40e-9
    kn = (baud_s * 1e9) ** 2 * width_hz / 1e9 * 10 ** (-depth_db / 20) / (delay_s * 1e9)
    by_kn = selective_outage_normalised_percent(5.0, distance_m=40e3, kn=kn, baud_period_s=baud_s)
    assert by_kn == digits(1.4796e-3, 5)


def test_other_echo_has_its_own_signature() -> None:
    both = selective_outage_percent(5.0, distance_m=40e3, signature_width_hz=30e6, signature_depth_db=18.0)
    half = selective_outage_percent(
        5.0, distance_m=40e3, signature_width_hz=30e6, signature_depth_db=18.0, other_width_hz=0.0
    )
    assert half == pytest.approx(float(both) / 2.0, rel=1e-12)


# spacing m, GHz, km, p0 %, fade dB, level difference dB -> eta, kns2, I, I in the older form. Equations (155) to (162).
SPACE = [
    (10, 6, 50, 20, 30, 0, 0.058060, 0.787471, 62.485, 67.010),
    (10, 6, 45, 5, 35, 2, 0.020925, 0.513667, 406.43, 485.47),
    (15, 4, 60, 50, 25, 3, 0.112122, 0.823262, 6.694, 6.763),
]


@pytest.mark.parametrize(("spacing", "ghz", "km", "p0", "fade", "unequal", "eta", "kns2", "gain", "older"), SPACE)
def test_space_diversity(
    spacing: float,
    ghz: float,
    km: float,
    p0: float,
    fade: float,
    unequal: float,
    eta: float,
    kns2: float,
    gain: float,
    older: float,
) -> None:
    path = {"distance_m": km * 1e3, "frequency_hz": ghz * 1e9, "occurrence_percent": p0}
    assert multipath_activity(p0) == digits(eta, 5)
    found = space_correlation_squared(spacing, **path)
    assert found == digits(kns2, 6)
    improvement = diversity_improvement(found, occurrence_percent=p0, fade_db=fade, level_difference_db=-unequal)
    assert improvement == digits(gain, 4 if gain < 10 else 5)
    in_older = older_space_improvement(spacing, fade_db=fade, level_difference_db=unequal, **path)
    assert in_older == digits(older, 4 if older < 10 else 5)


def test_space_diversity_chain() -> None:
    # 10 m, 6 GHz, 50 km, p0 20 %, 35 dB, 30 MHz signature of 20 dB at 6.3 ns; fractions in the hand calculation.
    flat = fade_exceeded_percent(35.0, occurrence_percent=20.0)
    assert flat == digits(6.3246e-3, 5)
    selective = selective_outage_percent(20.0, distance_m=50e3, signature_width_hz=30e6, signature_depth_db=20.0)
    assert selective == digits(5.8254e-3, 5)
    kns2 = space_correlation_squared(10.0, distance_m=50e3, frequency_hz=6e9, occurrence_percent=20.0)
    improvement = diversity_improvement(kns2, occurrence_percent=20.0, fade_db=35.0)
    assert improvement == digits(195.89, 5)
    assert amplitude_correlation(kns2) == digits(0.86045, 5)
    assert selective_correlation_squared(amplitude_correlation(kns2)) == digits(0.87361, 5)

    def outage(flat_percent: object, selective_percent: object) -> object:
        return diversity_outage_percent(
            flat_percent,  # type: ignore[arg-type]
            selective_percent=selective_percent,  # type: ignore[arg-type]
            correlation_squared=kns2,
            improvement=improvement,
            occurrence_percent=20.0,
        )

    assert outage(flat, 0.0) == digits(3.2286e-5, 5)
    assert outage(0.0, selective) == digits(4.6244e-5, 5)
    assert outage(flat, selective) == digits(9.8548e-5, 5)


def test_frequency_diversity() -> None:
    # (163) by hand: p0 20 % has eta 0.058060; 50 MHz at 6 GHz make exp(-0.07/0.058060 x 0.05/6) = 0.990003.
    found = frequency_correlation_squared(50e6, frequency_hz=6e9, occurrence_percent=20.0)
    assert found == digits(0.990003, 6)


@pytest.mark.parametrize(("rw", "ks2"), [(0.3, 0.8238), (0.6, 0.831704), (0.8, 0.858638), (0.97, 0.934655)])
def test_selective_correlation(rw: float, ks2: float) -> None:
    assert selective_correlation_squared(rw) == pytest.approx(ks2, abs=6e-7)


def test_cross_polar_outage() -> None:
    # Sections 4.1 and 4.2: p0 10 %, XPDg 30 dB, C0/I 24 dB; 18 GHz, U0 15 dB, C0/I 20 dB, 30 dB of rain at 0.01 %.
    clear = clear_air_cross_polar_outage_percent(10.0, antenna_discrimination_db=30.0, required_ratio_db=24.0)
    assert clear == digits(0.19428, 5)
    # Two transmitting antennas 500 wavelengths apart: kXP = 1 - 0.3/e = 0.88964 in place of 0.7.
    apart = clear_air_cross_polar_outage_percent(
        10.0, antenna_discrimination_db=30.0, required_ratio_db=24.0, transmit_spacing_wavelengths=500.0
    )
    assert apart == pytest.approx(0.19428 * 0.88964 / 0.7, rel=1e-4)
    rain = rain_cross_polar_outage_percent(30.0, frequency_hz=18e9, required_ratio_db=20.0)
    assert rain == digits(1.015e-2, 4)
    # U = 52.658, V = 22.167: at 29.735 dB of rain the discrimination is the 20 dB asked for.
    assert rain_discrimination_db(29.735, frequency_hz=18e9) == pytest.approx(20.0, abs=1e-3)


def test_sums() -> None:
    # (177) is a plain sum; the composite of 30 and 40 dB: common practice, no source, by hand.
    assert clear_air_outage_percent(0.01, selective_percent=0.02, cross_polar_percent=0.03) == pytest.approx(0.06)
    assert composite_fade_margin_db(30.0, 40.0) == digits(29.586, 5)
    assert np.isinf(composite_fade_margin_db())
