"""Declination against the published test values of the World Magnetic Model."""

import datetime

import pytest

from fellspan.errors import MagneticModelError
from fellspan.geodesy.magnetic import declination, magnetic_bearing_deg
from fellspan.geodesy.position import Position

# WMM-2020 test values (the file of that name in NOAA NCEI's distribution), from memory:
# decimal year, height km, latitude, longitude, declination; published to 0.01 degree
WMM2020 = [
    (2020.0, 28, 89, -121, -112.41),
    (2020.0, 48, 80, -96, -37.40),
    (2020.0, 54, 82, 87, 51.30),
    (2020.0, 65, 43, 93, 0.71),
    (2020.0, 51, -33, 109, -5.78),
    (2020.0, 39, -59, -8, -15.79),
    (2020.0, 3, -50, -103, 28.10),
    (2020.0, 94, -29, -110, 15.82),
    (2020.0, 66, 14, 143, 0.12),
    (2020.0, 18, 0, 21, 1.05),
    (2020.5, 6, -36, -137, 20.16),
    (2020.5, 63, 26, 81, 0.43),
    (2020.5, 69, 38, -144, 13.39),
    (2020.5, 50, -70, -133, 57.40),
    (2020.5, 8, -52, -75, 15.39),
    (2020.5, 8, -66, 17, -32.56),
    (2020.5, 22, -37, 140, 9.15),
    (2020.5, 40, -12, -129, 10.83),
    (2020.5, 44, 33, -118, 11.46),
    (2020.5, 50, -81, -67, 28.65),
]
# The World Magnetic Model 2025 technical report, table of test values, from memory; published to 0.01 degree
WMM2025 = [
    (2025.0, 0, 80, 0, 1.28),
    (2025.0, 0, 0, 120, -0.16),
    (2025.0, 0, -80, 240, 68.78),
    (2025.0, 100, 80, 0, 0.85),
    (2025.0, 100, 0, 120, -0.15),
    (2025.0, 100, -80, 240, 68.21),
    (2027.5, 0, 80, 0, 2.59),
    (2027.5, 0, 0, 120, -0.24),
    (2027.5, 0, -80, 240, 68.49),
    (2027.5, 100, 80, 0, 2.16),
]


def day(decimal_year: float) -> datetime.date:
    """The nearest date; half a day of drift is under 0.001 degree but for the first point, 0.03 degree from the pole."""
    year = int(decimal_year)
    days = 366 if year % 4 == 0 else 365
    return datetime.date(year, 1, 1) + datetime.timedelta(days=round((decimal_year - year) * days))


@pytest.mark.parametrize(
    ("model", "row"), [("WMM-2020", row) for row in WMM2020] + [("WMM-2025", row) for row in WMM2025]
)
def test_published_declinations(model: str, row: tuple[float, ...]) -> None:
    decimal_year, height_km, latitude, longitude, published = row
    got = declination(
        Position(latitude_deg=latitude, longitude_deg=longitude), day(decimal_year), height_m=height_km * 1000.0
    )
    assert got.model == model
    assert got.declination_deg == pytest.approx(
        published, abs=0.0055
    )  # half of the last digit published, and half a day


@pytest.mark.parametrize(
    ("latitude", "longitude", "date", "published"),
    [
        (23.35, 40.0, datetime.date(2025, 12, 6), 3.6678175),
        (24.5, 45.0, datetime.date(2026, 1, 15), 3.2466589),
    ],
)
def test_another_implementation_of_the_model(
    latitude: float, longitude: float, date: datetime.date, published: float
) -> None:
    # printed in the README of wmm-calculator 1.4.4 (CIRES), height 21 km above mean sea level there
    got = declination(Position(latitude_deg=latitude, longitude_deg=longitude), date, height_m=21_000.0)
    assert got.declination_deg == pytest.approx(published, abs=2e-4)  # geoid against ellipsoid is worth that much


def test_uncertainty_of_the_published_error_model() -> None:
    # WMM-2025: sqrt(0.26^2 + (5417 / H)^2); H is 39 677.9 nT at 0, 120 in 2025 (report's table, from memory)
    got = declination(Position(latitude_deg=0.0, longitude_deg=120.0), datetime.date(2025, 1, 1))
    assert got.uncertainty_deg == pytest.approx((0.26**2 + (5417.0 / 39677.9) ** 2) ** 0.5, abs=1e-4)
    assert got.caution is None


def test_weak_field_near_the_magnetic_poles_is_said() -> None:
    pole = declination(Position(latitude_deg=86.0, longitude_deg=150.0), datetime.date(2026, 1, 1))
    assert pole.uncertainty_deg is None
    assert pole.caution is not None
    assert "no compass" in pole.caution
    near = declination(Position(latitude_deg=78.0, longitude_deg=-95.0), datetime.date(2026, 1, 1))
    assert near.uncertainty_deg is not None
    assert near.caution is not None
    assert "no compass" not in near.caution


@pytest.mark.parametrize("date", [datetime.date(2019, 12, 31), datetime.date(2030, 1, 1), datetime.date(1, 1, 1)])
def test_dates_outside_every_model(date: datetime.date) -> None:
    with pytest.raises(MagneticModelError) as caught:
        declination(Position(latitude_deg=36.0, longitude_deg=-45.0), date)
    message = str(caught.value)
    assert date.isoformat() in message
    assert "2020-01-01 to 2029-12-31" in message
    assert len(message.splitlines()) <= 4


def test_models_meet_where_one_takes_over() -> None:
    place = Position(latitude_deg=36.05, longitude_deg=-45.2)
    last, first = (declination(place, date) for date in (datetime.date(2024, 12, 31), datetime.date(2025, 1, 1)))
    assert (last.model, first.model) == ("WMM-2020", "WMM-2025")
    assert last.declination_deg == pytest.approx(first.declination_deg, abs=0.3)  # within either model's uncertainty
    assert declination(place, datetime.date(2029, 12, 31)).model == "WMM-2025"


def test_magnetic_bearing() -> None:
    # declination west (negative): the compass shows more than the true bearing (common practice, no source)
    assert magnetic_bearing_deg(90.0, -13.2) == pytest.approx(103.2)
    assert magnetic_bearing_deg(5.0, 13.0) == pytest.approx(352.0)
    assert magnetic_bearing_deg(359.0, -1.0) == 0.0
