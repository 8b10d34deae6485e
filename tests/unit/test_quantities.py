"""Quantities in the units of the trade, in and out."""

import math
import subprocess
import sys
from collections.abc import Callable

import pytest
from hypothesis import given
from hypothesis import strategies as st

from fellspan.errors import QuantityError
from fellspan.quantities import (
    format_bearing,
    format_db,
    format_distance,
    format_frequency,
    format_height,
    format_percent,
    parse_antenna_height,
    parse_frequency_hz,
    parse_gain_dbi,
    parse_length_m,
    parse_level_dbm,
    parse_loss_db,
    parse_percent,
    parse_power_dbm,
    parse_probability,
    parse_threshold_dbm,
    parse_transmit_power_dbm,
)
from fellspan.vocabulary import HeightReference

PARSERS: list[Callable[[str], object]] = [
    parse_frequency_hz,
    parse_length_m,
    parse_power_dbm,
    parse_threshold_dbm,
    parse_transmit_power_dbm,
    parse_gain_dbi,
    parse_loss_db,
    parse_level_dbm,
    parse_percent,
    parse_probability,
    parse_antenna_height,
]


@pytest.mark.parametrize(
    ("parse", "text", "value"),
    [
        (parse_frequency_hz, "5.8 GHz", 5.8e9),
        (parse_frequency_hz, "5800 MHz", 5.8e9),
        (parse_frequency_hz, "5800mhz", 5.8e9),
        (parse_frequency_hz, "5.8e9 Hz", 5.8e9),
        (parse_frequency_hz, "30 MHz", 30e6),
        (parse_frequency_hz, "300 GHz", 300e9),
        (parse_length_m, "12 m", 12.0),
        (parse_length_m, "12m", 12.0),
        (parse_length_m, "40 ft", 12.192),  # international foot, 0.3048 m exactly
        (parse_length_m, "40'", 12.192),
        (parse_length_m, "40\u2032", 12.192),
        (parse_length_m, "5 ft 6 in", 1.6764),
        (parse_length_m, "5'6\"", 1.6764),
        (parse_length_m, "1.2 km", 1200.0),
        (parse_length_m, "3 mi", 4828.032),
        (parse_length_m, "1 nmi", 1852.0),
        (parse_length_m, "3937 us-ft", 1200.0),  # US survey foot, 1200/3937 m exactly
        (parse_power_dbm, "23 dBm", 23.0),
        (parse_power_dbm, "-7 dBW", 23.0),
        (parse_power_dbm, "200 mW", 23.0103),
        (parse_power_dbm, "1 W", 30.0),
        (parse_power_dbm, "100 \u00b5W", -10.0),
        (parse_gain_dbi, "23 dBi", 23.0),
        (parse_gain_dbi, "20.85 dBd", 23.0),
        (parse_gain_dbi, "-3dBi", -3.0),
        (parse_loss_db, "1.5 dB", 1.5),
        (parse_level_dbm, "-72 dBm", -72.0),
        (parse_threshold_dbm, "-20 dBm", -20.0),
        (parse_transmit_power_dbm, "1 kW", 60.0),
        (parse_level_dbm, "\u221272 dBm", -72.0),
        (parse_level_dbm, "-102 dBW", -72.0),
        (parse_percent, "90 %", 90.0),
        (parse_percent, "99.999%", 99.999),
        (parse_probability, "90 %", 0.9),
        (parse_probability, "0.9", 0.9),
        (parse_probability, 0.9, 0.9),
        (parse_probability, 1, 1.0),
    ],
)
def test_values(parse: Callable[[object], float], text: object, value: float) -> None:
    assert parse(text) == pytest.approx(value, rel=1e-6)


@pytest.mark.parametrize(
    ("parse", "text", "said"),
    [
        (parse_frequency_hz, "5800", "has no unit"),
        (parse_frequency_hz, "5,8 GHz", "decimals with a point"),
        (parse_frequency_hz, "5.8 THz", "Hz, kHz, MHz, GHz"),
        (parse_frequency_hz, "29.9 MHz", "30 MHz to 300 GHz"),
        (parse_frequency_hz, "301 GHz", "30 MHz to 300 GHz"),
        (parse_frequency_hz, "-5.8 GHz", "30 MHz to 300 GHz"),
        (parse_frequency_hz, "1e999 GHz", "finite"),
        (parse_length_m, "12", "has no unit"),
        (parse_length_m, "-3 m", "0 m to 20 000 km"),
        (parse_length_m, "12 parsec", "us-ft"),
        (parse_power_dbm, "23", "dBm or 200 mW"),
        (parse_power_dbm, "0 W", "above 0"),
        (parse_power_dbm, "-1 mW", "above 0"),
        (parse_power_dbm, "200 MW", "milliwatts are written mW"),
        (parse_power_dbm, "23 dBi", "not a unit of power"),
        (parse_transmit_power_dbm, "61 dBm", "60 dBm (1 kW)"),
        (parse_transmit_power_dbm, "2 kW", "'2 kW' is 63 dBm"),
        (parse_threshold_dbm, "72 dBm", "did you mean '-72 dBm'"),
        (parse_threshold_dbm, "-10 dBm", "thresholds are negative"),
        (parse_gain_dbi, "23 dB", "above what"),
        (parse_gain_dbi, "230 dBi", "-50 to 90 dBi"),
        (parse_loss_db, "-1.5 dB", "positive"),
        (parse_level_dbm, "-72", "has no unit"),
        (parse_percent, "0.9", "has no unit"),
        (parse_percent, "120 %", "0 % to 100 %"),
        (parse_probability, "90", "0 to 1"),
        (parse_probability, "nan", "0 to 1"),
        (parse_probability, "-1 %", "0 % to 100 %"),
        (parse_antenna_height, "12", "has no unit"),
        (parse_antenna_height, "12 above ground", "has no unit"),
        (parse_antenna_height, "-2 m", "0 to 9000 m"),
        (parse_antenna_height, "-2 m agl", "0 to 1000 m above ground"),
        (parse_antenna_height, "-2 m above roof", "0 to 1000 m above roof"),
        (parse_antenna_height, "5000 m above ground", "0 to 1000 m above ground"),
        (parse_antenna_height, "-900 m amsl", "-500 to 9000 m above sea"),
        (parse_antenna_height, "12 m above moon", "'moon'"),
        (parse_antenna_height, "moon + 12 m", "'moon'"),
        (parse_antenna_height, "12 m HAE", "ellipsoid"),
        (parse_antenna_height, "12 m above the ellipsoid", "ellipsoid"),
        (parse_antenna_height, "above ground", "above ground"),
        (parse_antenna_height, "nan m agl", "nan"),
    ],
)
def test_refusals_name_the_value_and_the_remedy(parse: Callable[[str], object], text: str, said: str) -> None:
    with pytest.raises(QuantityError) as caught:
        parse(text)
    assert said in str(caught.value)
    assert text in str(caught.value)
    assert len(str(caught.value).splitlines()) <= 4


@pytest.mark.parametrize("parse", PARSERS)
@pytest.mark.parametrize(
    "text", ["", " ", "x", "m", "nan", "inf m", "1 2 m", "--3 m", "1e m", "y" * 3000, "1\n2\n3\n4\n5"]
)
def test_garbage_is_refused_everywhere(parse: Callable[[str], object], text: str) -> None:
    with pytest.raises(QuantityError) as caught:
        parse(text)
    assert len(str(caught.value).splitlines()) <= 4
    assert len(str(caught.value)) < 500


@pytest.mark.parametrize(
    ("text", "height_m", "reference"),
    [
        ("12 m", 12.0, None),
        ("40 ft", 12.192, None),
        ("12 m above ground", 12.0, "ground"),
        ("12 m above the ground", 12.0, "ground"),
        ("12 m above ground level", 12.0, "ground"),
        ("8 m agl", 8.0, "ground"),
        ("8m AGL", 8.0, "ground"),
        ("40 ft above roof", 12.192, "roof"),
        ("40' above rooftop", 12.192, "roof"),
        ("3 m above the roof", 3.0, "roof"),
        ("3 m over roof level", 3.0, "roof"),
        ("roof + 3 m", 3.0, "roof"),
        ("roof+3m", 3.0, "roof"),
        ("310 m amsl", 310.0, "sea"),
        ("310 m asl", 310.0, "sea"),
        ("310 m above sea level", 310.0, "sea"),
        ("310 m above mean sea level", 310.0, "sea"),
        ("-2 m amsl", -2.0, "sea"),
    ],
)
def test_antenna_heights(text: str, height_m: float, reference: HeightReference | None) -> None:
    got = parse_antenna_height(text)
    assert got.height_m == pytest.approx(height_m)
    assert got.reference == reference


def test_formats() -> None:
    assert [format_frequency(f) for f in (5.8e9, 433.92e6, 71.125e9)] == ["5.8 GHz", "433.92 MHz", "71.125 GHz"]
    assert [format_distance(d) for d in (0.0, -0.2, 850.4, 999.6, 4172.3, 57312.2)] == [
        "0 m", "0 m", "850 m", "1.000 km", "4.172 km", "57.31 km",
    ]  # fmt: skip
    assert format_height(12.5, "ground") == "12.5 m above ground"
    assert format_height(-0.01, "sea") == "0.0 m above sea level"
    assert format_height(3.0) == "3.0 m"
    assert [format_db(-72.44, "dBm"), format_db(-0.04)] == ["-72.4 dBm", "0.0 dB"]
    assert [format_bearing(b) for b in (45.26, 359.97, 0.0, -1.0, 7.0)] == [
        "045.3°", "000.0°", "000.0°", "359.0°", "007.0°",
    ]  # fmt: skip


def test_availability_never_reads_as_a_full_hundred() -> None:
    shown = [format_percent(p) for p in (90.0, 99.99, 99.9995, 99.99999999, 100.0, 0.001, 1e-9, 0.0)]
    assert shown == ["90 %", "99.99 %", "99.9995 %", "99.999999 %", "100 %", "0.001 %", "0.000001 %", "0 %"]


@given(st.floats(30e6, 300e9))
def test_frequency_survives_a_round_trip(frequency_hz: float) -> None:
    try:
        again = parse_frequency_hz(format_frequency(frequency_hz))
    except QuantityError:
        pytest.fail(format_frequency(frequency_hz))
    assert again == pytest.approx(frequency_hz, abs=500.1)


@given(st.floats(0.0, 2e7))
def test_distance_survives_a_round_trip(distance_m: float) -> None:
    assert parse_length_m(format_distance(distance_m)) == pytest.approx(distance_m, abs=5.01)


@given(st.floats(0.0, 1000.0), st.sampled_from([None, "ground", "roof", "sea"]))
def test_height_survives_a_round_trip(height_m: float, reference: HeightReference | None) -> None:
    again = parse_antenna_height(format_height(height_m, reference))
    assert again.reference == reference
    assert again.height_m == pytest.approx(height_m, abs=0.0501)


@given(st.floats(-250.0, 100.0))
def test_level_survives_a_round_trip(level_dbm: float) -> None:
    assert parse_level_dbm(format_db(level_dbm, "dBm")) == pytest.approx(level_dbm, abs=0.0501)


@given(st.floats(0.0, 100.0))
def test_percent_survives_a_round_trip(percent: float) -> None:
    again = parse_percent(format_percent(percent))
    assert math.isclose(again, percent, abs_tol=1.1e-6 + 0.06 * min(percent, 100.0 - percent))
    assert (again == 100.0) == (percent == 100.0)


@given(st.sampled_from(PARSERS), st.text(alphabet="0123456789.,eE+-' mftkdBiWGHz%abovergnds\n", max_size=30))
def test_any_text_gives_a_finite_value_or_our_own_error(parse: Callable[[str], object], text: str) -> None:
    try:
        got = parse(text)
    except QuantityError:
        return
    assert math.isfinite(got if isinstance(got, float) else got.height_m)  # type: ignore[attr-defined]


def test_quantities_import_no_numpy() -> None:
    code = "import sys, fellspan.quantities; sys.exit('numpy' in sys.modules)"
    assert subprocess.run([sys.executable, "-c", code], check=False).returncode == 0
