"""Coordinates as people write them: what is read, what is refused, what is doubted."""

import pyproj
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from pyproj.network import is_network_enabled

from fellspan.errors import CoordinateError
from fellspan.geodesy.coordinates import format_position, parse_pair, parse_position
from fellspan.geodesy.geodesic import inverse
from fellspan.geodesy.position import Position
from fellspan.geodesy.transforms import transformer


@pytest.mark.parametrize(
    "text",
    [
        "36.04217 -45.19876",
        "36.04217,-45.19876",
        "36.04217, -45.19876",
        "36.04217; -45.19876",
        "(36.04217, -45.19876)",
        "+36.04217 -45.19876",
        "36.04217 N, 45.19876 W",
        "36.04217N 45.19876W",
        "36.04217n45.19876w",
        "N 36.04217 W 45.19876",
        "N36.04217, W45.19876",
        "45.19876 W, 36.04217 N",
        "W45.19876 N36.04217",
        "36.04217° N 45.19876° W",
        "36.04217°, -45.19876°",
        "36.04217 north, 45.19876 west",
        "lat 36.04217 lon -45.19876",
        "latitude: 36.04217, longitude: -45.19876",
        "lon=-45.19876, lat=36.04217",
        "36,04217 -45,19876",
        "36,04217, -45,19876",
        "36,04217; -45,19876",
        "36,04217,-45,19876",
        "36,04217 N 45,19876 W",
        "36.04217\u00a0N, 45.19876\u00a0W",
        "36°02'31.812\"N 45°11'55.536\"W",
        "36° 02' 31.812\" N, 45° 11' 55.536\" W",
        "36°02′31.812″N 45°11′55.536″W",
        "36º02’31.812”N, 45º11’55.536”W",
        "36°02'31.812'' N 45°11'55.536'' W",
        "36 02 31.812 N 45 11 55.536 W",
        "N 36 02 31.812 W 45 11 55.536",
        "36 02 31.812 -45 11 55.536",
        "36:02:31.812 -45:11:55.536",
        "36:02:31.812N,45:11:55.536W",
        "36d02m31.812s N 45d11m55.536s W",
        "36d02m31.812s, -45d11m55.536s",
        "36deg 02min 31.812sec N 45deg 11min 55.536sec W",
        "36°2.5302'N 45°11.9256'W",
        "36 2.5302 N, 45 11.9256 W",
        "45°11'55.536\"W, 36°02'31.812\"N",
        "EPSG:4326 36.04217 -45.19876",
        "epsg:4326, 36.04217, -45.19876",
    ],
)
def test_one_place_written_many_ways(text: str) -> None:
    got = parse_position(text)
    assert got.position.latitude_deg == pytest.approx(36.04217, abs=1e-9)
    assert got.position.longitude_deg == pytest.approx(-45.19876, abs=1e-9)
    assert got.caution is None


def test_decimal_commas_are_not_taken_for_separators() -> None:
    got = parse_position("36,04217 45,19876").position
    assert (got.latitude_deg, got.longitude_deg) == (36.04217, 45.19876)


def test_south_and_small_negative_values() -> None:
    got = parse_position("36 02 31 S 45 11 55 W").position
    assert (got.latitude_deg, got.longitude_deg) == pytest.approx((-36.0419444, -45.1986111), abs=1e-6)
    got = parse_position("-0 30 00 -0 15 00").position
    assert (got.latitude_deg, got.longitude_deg) == pytest.approx((-0.5, -0.25))
    got = parse_position("\u221236.12345, \u221245.12345").position
    assert (got.latitude_deg, got.longitude_deg) == (-36.12345, -45.12345)


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("", "empty"),
        ("   ", "empty"),
        ("harbour", "'harbour' is not a position"),
        ("36.04217", "'36.04217' is not a position"),
        ("nan 45", "'nan 45'"),
        ("inf, inf", "'inf, inf'"),
        ("36.5.5 45.2", "36.5.5"),
        ("36.04217 -45.19876 12", "12"),
        ("1e5 2", "exponent"),
        ("91.00000 0.00000", "latitude 91"),
        ("135.12345, 36.12345", "did you mean 36.12345, 135.12345"),
        ("36.12345 200.5", "the same meridian is -159.5"),
        ("480000 3990000", "name their system"),
        ("36 75 00 N 45 00 00 W", "75 minutes"),
        ("36 10 61 N 45 00 00 W", "61 seconds"),
        ("36 60 N 45 00 W", "60 minutes"),
        ("36.5 30 N 45.5 30 W", "36.5 30"),
        ("-36.1 S 45.1 W", "both a minus and a letter"),
        ("36.1 N 45.1 N", "same axis"),
        ("lat 36.1 E, lon 45.1 E", "contradict"),
        ("36,5,45", "more than one way"),
        ("36 N 45", "more than one way"),
        ("36D02M31S 45D11M02S", "seconds or south"),
        ("x" * 5000, "xxx..."),
        ("1 " * 300, "1 1"),
        ("36.1\n45.1\nboo", "boo"),
        ("EPSG:32623", "EPSG:32623"),
        ("EPSG:99999 1 2", "EPSG:99999"),
        ("EPSG:5773 1 2", "EGM96 height is not a system of map coordinates"),
        ("EPSG:4979 1 2", "not a system of map coordinates"),
        ("EPSG:32623 3990000 480000", "did you mean 480000, 3990000"),
        ("EPSG:32623 480000 E 3990000 E", "same axis"),
        ("EPSG:32623 480000 W 3990000 N", "480000 W"),
        ("EPSG:32623 1e30 5", "1e30"),
        ("EPSG:32623 99999999999999999999 5", "1e+20"),
    ],
)
def test_what_is_no_position_is_refused_in_at_most_four_lines(text: str, said: str) -> None:
    with pytest.raises(CoordinateError) as caught:
        parse_position(text)
    assert said in str(caught.value)
    assert len(str(caught.value).splitlines()) <= 4
    assert max(map(len, str(caught.value).splitlines())) < 160


@pytest.mark.parametrize(
    "text",
    [
        "EPSG:32623 480000 3990000",
        "480000 3990000 EPSG:32623",
        "EPSG:32623 3990000 N 480000 E",
        "EPSG:32623 E 480000 N 3990000",
        "EPSG:32623 480000.0, 3990000.0",
        "EPSG:32623 480000,0 3990000,0",
        "epsg:32623: 480000m 3990000m",
        "EPSG:32623 480000mE 3990000mN",
    ],
)
def test_easting_and_northing(text: str) -> None:
    longitude, latitude = pyproj.Transformer.from_crs(32623, 4326, always_xy=True).transform(480000.0, 3990000.0)
    got = parse_position(text)
    assert (got.position.latitude_deg, got.position.longitude_deg) == pytest.approx((latitude, longitude), abs=1e-11)
    assert got.caution is None


def test_axis_order_of_the_system_itself_does_not_matter() -> None:
    # EPSG:3035 states northing first; its natural origin, 52 N 10 E, is 4 321 000 E, 3 210 000 N (EPSG dataset)
    for text in ("EPSG:3035 4321000 3210000", "EPSG:3035 3210000 N 4321000 E"):
        got = parse_position(text).position
        assert (got.latitude_deg, got.longitude_deg) == pytest.approx((52.0, 10.0), abs=1e-9)


def test_system_given_beside_the_text() -> None:
    beside = parse_position("480000 3990000", crs="EPSG:32623")
    assert beside == parse_position("EPSG:32623 480000 3990000", crs="EPSG:32623")
    with pytest.raises(CoordinateError, match="EPSG:32622"):
        parse_position("EPSG:32623 480000 3990000", crs="EPSG:32622")


def test_far_outside_the_area_of_the_system_is_doubted() -> None:
    got = parse_position("EPSG:32623 1500000 3990000")
    assert got.caution is not None
    assert "outside the area" in got.caution


@pytest.mark.parametrize(
    ("text", "off"),
    [
        ("36.04, -45.20", "560 m"),
        ("36.0 N, 45.2 W", "5.6 km"),
        ("36 -45", "55.7 km"),
        ("36°02'N 45°11'W", "930 m"),
        ("36.04217, -45.2", "4.5 km"),
    ],
)
def test_coarse_values_are_doubted(text: str, off: str) -> None:
    caution = parse_position(text).caution
    assert caution is not None
    assert off in caution


@pytest.mark.parametrize("text", ["36.042, -45.199", "36°02.5'N 45°11.9'W", "36 02 31 N 45 11 55 W"])
def test_fine_enough_values_are_not(text: str) -> None:
    assert parse_position(text).caution is None


def test_pairs_of_numbers() -> None:
    assert parse_pair(36.04217, -45.19876).caution is None
    assert parse_pair(1.5e-7, -45.19876).caution is None
    assert "560 m" in (parse_pair(36.04, -45.12).caution or "")
    assert "55.7 km" in (parse_pair(36, -45).caution or "")
    for latitude, longitude, said in (
        (135.0, 36.0, "did you mean 36, 135"),
        (float("nan"), 0.0, "nan"),
        (0.0, 400.0, "400"),
    ):
        with pytest.raises(CoordinateError, match=said):
            parse_pair(latitude, longitude)


def test_formats() -> None:
    place = Position(latitude_deg=36.04217, longitude_deg=-45.19876)
    assert format_position(place) == "36.04217 N, 45.19876 W"
    assert format_position(place, "dms") == "36°02'31.81\" N, 45°11'55.54\" W"
    carried = Position(latitude_deg=-(36 + 59 / 60 + 59.999 / 3600), longitude_deg=0.0)
    assert format_position(carried, "dms") == "37°00'00.00\" S, 0°00'00.00\" E"


@settings(max_examples=200, deadline=None, derandomize=True)
@given(st.floats(-90.0, 90.0), st.floats(-180.0, 179.99), st.sampled_from(["decimal", "dms"]))
def test_what_is_written_can_be_read_again(latitude: float, longitude: float, style: str) -> None:
    place = Position(latitude_deg=latitude, longitude_deg=longitude)
    again = parse_position(format_position(place, style))  # type: ignore[arg-type]
    assert again.caution is None
    assert inverse(place, again.position).distance_m < (0.9 if style == "decimal" else 0.25)


@settings(max_examples=300, deadline=None, derandomize=True)
@given(st.text(alphabet="0123456789.,;:/ -+NSEWnsewdm°'\"\n", max_size=40) | st.text(max_size=40))
def test_any_text_gives_a_position_or_our_own_error(text: str) -> None:
    message = ""
    try:
        got = parse_position(text).position
    except CoordinateError as error:
        message = str(error)
    else:
        assert -90.0 <= got.latitude_deg <= 90.0
        assert -180.0 <= got.longitude_deg < 180.0
    assert len(message.splitlines()) <= 4


def test_proj_stays_off_the_network_and_is_cached() -> None:
    assert is_network_enabled() is False
    assert transformer("EPSG:32623", "EPSG:4326") is transformer("EPSG:32623", "EPSG:4326")


def test_ballpark_heights_are_refused() -> None:
    # the EGM96 grid does not come with pyproj; without it only a ballpark shift would be left
    with pytest.raises(CoordinateError, match="EGM96"):
        transformer("EPSG:4326+5773", "EPSG:4979")
