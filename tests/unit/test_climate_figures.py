"""Climate figures: what wins, where each came from, and what a study may say. With the maps installed."""

import math
import subprocess
import sys

import pytest

from fellspan.climate import GivenClimate, figures_for, maps
from fellspan.errors import QuantityError
from fellspan.geodesy.position import Position
from fellspan.propagation import SOURCES

OCEAN = Position(latitude_deg=36.05, longitude_deg=-45.2)
LONDON = Position(latitude_deg=51.5, longitude_deg=-0.14)


def test_maps_give_the_known_figures_of_a_place() -> None:
    # Computed earlier with itur 0.4.0: rain 26.48 mm/h, dN1 -121.8, median -39.4, 99.9 % +17.9 N/km, roughness 39.94 m.
    figures = figures_for(LONDON)
    for name, value, tolerance in (
        ("rain_rate_001_mm_h", 26.48, 0.005),
        ("dn1_n_per_km", -121.8, 0.05),
        ("gradient_median_n_per_km", -39.4, 0.05),
        ("gradient_tail_n_per_km", 17.9, 0.05),
        ("terrain_roughness_m", 39.94, 0.005),
    ):
        figure = getattr(figures, name)
        assert figure.value == pytest.approx(value, abs=tolerance), name
        assert figure.provenance.startswith("map of Rec. ITU-R P.")
        assert figure.provenance.endswith(" by itur 0.4.0")
    assert figures.rain_rate_001_mm_h is not None
    assert figures.rain_rate_001_mm_h.provenance == "map of Rec. ITU-R P.837-7 by itur 0.4.0"
    assert figures.multipath_edition == "P.530-17 detailed"
    assert figures.notes == ()


def test_what_the_study_gives_wins() -> None:
    given = GivenClimate(
        rain_rate_001_mm_h=42.0,
        monthly_rain_mm=(60.0,) * 12,
        monthly_temperature_c=(10.0,) * 12,
        dn1_n_per_km=-200.0,
        temperature_c=20.0,
        gradient_median_n_per_km=-45.0,
    )
    figures = figures_for(OCEAN, given=given)
    assert figures.rain_rate_001_mm_h is not None
    assert figures.dn1_n_per_km is not None
    for figure, value in (
        (figures.rain_rate_001_mm_h, 42.0),
        (figures.dn1_n_per_km, -200.0),
        (figures.temperature_k, 293.15),
        (figures.gradient_median_n_per_km, -45.0),
    ):
        assert (figure.value, figure.provenance, figure.source_key) == (value, "given in the study", "")


def test_months_win_over_the_map() -> None:
    # Rec. ITU-R P.837-8 by hand: 60 mm and 10 degrees every month make 25.56 mm/h at 0.01 %.
    given = GivenClimate(monthly_rain_mm=(60.0,) * 12, monthly_temperature_c=(10.0,) * 12)
    figure = figures_for(OCEAN, given=given).rain_rate_001_mm_h
    assert figure is not None
    assert figure.value == pytest.approx(25.56, abs=0.006)
    assert figure.provenance == "P.837-8 from monthly rain and temperature"


def test_both_figures_of_the_newer_edition_select_it() -> None:
    assert figures_for(OCEAN, given=GivenClimate(log_k=-5.0, dn75=10.0)).multipath_edition == "P.530-19"
    half = figures_for(OCEAN, given=GivenClimate(log_k=-5.0))
    assert half.multipath_edition == "P.530-17 detailed"
    assert any("climate.log_k alone" in note and "climate.dn75" in note for note in half.notes)


def test_air_hangs_together() -> None:
    given = GivenClimate(altitude_m=800.0, temperature_c=12.0, vapour_g_m3=8.0)
    figures = figures_for(OCEAN, given=given)
    # Rec. ITU-R P.835-6 at 800 m, from memory of standard tables: 921 hPa.
    assert figures.total_pressure_hpa.value == pytest.approx(921.0, abs=1.0)
    # e = rho T / 216.7 by hand.
    vapour_hpa = 8.0 * 285.15 / 216.7
    assert figures.dry_pressure_hpa.value == pytest.approx(figures.total_pressure_hpa.value - vapour_hpa, abs=1e-9)
    assert "800 m" in figures.total_pressure_hpa.provenance


def test_higher_places_have_less_vapour() -> None:
    low = figures_for(OCEAN, given=GivenClimate(altitude_m=0.0)).vapour_g_m3.value
    high = figures_for(OCEAN, given=GivenClimate(altitude_m=800.0)).vapour_g_m3.value
    assert high < low


@pytest.mark.parametrize(
    ("latitude", "longitude"),
    [(90.0, 0.0), (-90.0, 179.99), (0.0, 180.0), (0.0, -180.0), (36.0, 359.9), (-0.001, -0.001)],
)
def test_edges_of_the_maps_have_figures(latitude: float, longitude: float) -> None:
    figures = figures_for(Position(latitude_deg=latitude, longitude_deg=longitude))
    for name in figures.__slots__:
        figure = getattr(figures, name)
        if hasattr(figure, "value"):
            assert math.isfinite(figure.value), name


def test_figures_are_continuous_over_the_date_line() -> None:
    west = figures_for(Position(latitude_deg=10.0, longitude_deg=-179.99))
    east = figures_for(Position(latitude_deg=10.0, longitude_deg=179.99))
    assert west.rain_rate_001_mm_h is not None
    assert east.rain_rate_001_mm_h is not None
    assert west.rain_rate_001_mm_h.value == pytest.approx(east.rain_rate_001_mm_h.value, rel=0.01)


def test_near_places_are_looked_up_once() -> None:
    maps._looked_up.cache_clear()
    figures_for(Position(latitude_deg=36.0501, longitude_deg=-45.2))
    figures_for(Position(latitude_deg=36.0499, longitude_deg=-45.2001))
    assert maps._looked_up.cache_info().misses == 1


def test_looking_up_leaves_the_error_state_of_numpy_alone() -> None:
    # In a program of its own: the package changes that state once, when it is imported.
    code = (
        "import numpy as np; from fellspan.climate import figures_for; from fellspan.geodesy.position import Position;"
        "before = np.geterr(); figures_for(Position(latitude_deg=36.05, longitude_deg=-45.2)); print(np.geterr() == before)"
    )
    done = subprocess.run([sys.executable, "-W", "error", "-c", code], check=True, capture_output=True, text=True)
    assert done.stdout.strip() == "True"


def test_every_source_key_is_in_the_registry() -> None:
    months = GivenClimate(monthly_rain_mm=(60.0,) * 12, monthly_temperature_c=(10.0,) * 12)
    for figures in (figures_for(OCEAN), figures_for(OCEAN, given=months)):
        keys = {
            getattr(figures, name).source_key for name in figures.__slots__ if hasattr(getattr(figures, name), "value")
        }
        assert keys - {""} <= set(SOURCES)


@pytest.mark.parametrize(
    ("wrong", "words"),
    [
        ({"rain_rate_001_mm_h": -1.0}, "rain rate at 0.01 % is -1 mm/h"),
        ({"rain_rate_001_mm_h": float("nan")}, "nan"),
        ({"dn1_n_per_km": 200.0}, "dn1 is 200 N/km"),
        ({"temperature_c": 288.15}, "temperature is 288.15"),
        ({"total_pressure_hpa": 101325.0}, "pressure is 101325 hPa"),
        ({"monthly_rain_mm": (60.0,) * 12}, "monthly temperature is missing"),
        ({"monthly_temperature_c": (60.0,) * 12}, "monthly rain is missing"),
        ({"monthly_rain_mm": (60.0,) * 11, "monthly_temperature_c": (10.0,) * 12}, "11 values"),
        ({"monthly_rain_mm": (60.0,) * 12, "monthly_temperature_c": (283.0,) * 12}, "283"),
        ({"gradient_median_n_per_km": -40.0, "gradient_tail_n_per_km": -60.0}, "-60 N/km"),
    ],
)
def test_what_cannot_be_is_refused_with_its_value(wrong: dict[str, object], words: str) -> None:
    with pytest.raises(QuantityError) as refused:
        GivenClimate(**wrong)  # type: ignore[arg-type]
    assert words in str(refused.value)
    assert len(str(refused.value).splitlines()) <= 4


def test_a_median_above_the_tail_of_the_map_leaves_the_tail_out() -> None:
    figures = figures_for(LONDON, given=GivenClimate(gradient_median_n_per_km=50.0))
    assert figures.gradient_tail_n_per_km is None
    assert any("17.93" in note and "50" in note for note in figures.notes)
