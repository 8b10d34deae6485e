"""Climate figures where the optional package with the maps is absent, or broken: never an error, always a sentence."""

import subprocess
import sys

import pytest

from fellspan.climate import CLIMATE_KEYS, GivenClimate, assembling, figures_for, maps_available
from fellspan.geodesy.position import Position

OCEAN = Position(latitude_deg=36.05, longitude_deg=-45.2)


@pytest.fixture
def no_maps(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("fellspan.climate.maps.MAP_PACKAGE", "a_package_that_is_not_there")


@pytest.mark.usefixtures("no_maps")
def test_nothing_known_is_said_with_keys_and_usual_values() -> None:
    assert not maps_available()
    figures = figures_for(OCEAN)
    assert figures.rain_rate_001_mm_h is None
    assert figures.dn1_n_per_km is None
    assert figures.multipath_edition is None
    text = "\n".join(figures.notes)
    assert "'climate' is not installed" in text
    for name in ("rain_rate_001_mm_h", "dn1_n_per_km", "gradient_tail_n_per_km"):
        assert CLIMATE_KEYS[name].key in text
        assert CLIMATE_KEYS[name].typical in text
    assert "availability, is not computed" in text
    assert "climate.monthly_rain" in text


@pytest.mark.usefixtures("no_maps")
def test_defaults_say_that_they_are() -> None:
    figures = figures_for(OCEAN)
    # k = 4/3 is a gradient of 157 (3/4 - 1) = -39.25 N/km; sea level air 288.15 K, 1013.25 hPa, 7.5 g/m3 (P.835).
    for figure, value in (
        (figures.gradient_median_n_per_km, -39.25),
        (figures.temperature_k, 288.15),
        (figures.total_pressure_hpa, 1013.25),
        (figures.vapour_g_m3, 7.5),
    ):
        assert figure.value == pytest.approx(value, abs=1e-9)
        assert figure.provenance.startswith("default: ")
    # P.676 checks use 1003.277 hPa for this air: 1013.25 less 9.9729 hPa of vapour.
    assert figures.dry_pressure_hpa.value == pytest.approx(1003.277, abs=1e-3)


@pytest.mark.usefixtures("no_maps")
def test_a_gradient_alone_is_enough_for_the_quick_method() -> None:
    figures = figures_for(OCEAN, given=GivenClimate(dn1_n_per_km=-200.0, rain_rate_001_mm_h=42.0))
    assert figures.multipath_edition == "P.530-17 quick"
    assert any("quick method" in note and "climate.terrain_roughness" in note for note in figures.notes)
    assert not any("no rain rate" in note for note in figures.notes)


@pytest.mark.usefixtures("no_maps")
def test_a_full_study_lacks_nothing() -> None:
    given = GivenClimate(rain_rate_001_mm_h=42.0, log_k=-5.0, dn75=10.0, gradient_tail_n_per_km=20.0)
    figures = figures_for(OCEAN, given=given)
    assert figures.multipath_edition == "P.530-19"
    assert len(figures.notes) == 1
    assert "not installed" in figures.notes[0]


def test_a_broken_package_is_a_note_too(monkeypatch: pytest.MonkeyPatch) -> None:
    def fails(**_: object) -> None:
        raise RuntimeError("no such file\nsecond line")

    monkeypatch.setattr(assembling, "map_figures", fails)
    figures = figures_for(OCEAN, given=GivenClimate(rain_rate_001_mm_h=42.0))
    assert figures.notes[0] == "climate figures: the maps cannot be read: RuntimeError: no such file"


def test_a_hole_in_a_map_is_a_missing_figure(monkeypatch: pytest.MonkeyPatch) -> None:
    hole = assembling.MapFigures(
        rain_rate_001_mm_h=float("nan"),
        dn1_n_per_km=-100.0,
        gradient_median_n_per_km=-40.0,
        gradient_tail_n_per_km=10.0,
        terrain_roughness_m=float("inf"),
        rain_height_m=3000.0,
        temperature_k=290.0,
        vapour_g_m3=9.0,
        version="0.4.0",
    )
    monkeypatch.setattr(assembling, "map_figures", lambda **_: hole)
    monkeypatch.setattr(assembling, "maps_available", lambda: True)
    figures = figures_for(OCEAN)
    assert figures.rain_rate_001_mm_h is None
    assert figures.multipath_edition == "P.530-17 quick"
    assert any("climate.rain_rate" in note for note in figures.notes)


def test_the_room_does_not_import_the_maps_by_itself() -> None:
    code = "import sys, fellspan.climate; print('itur' in sys.modules, 'astropy' in sys.modules)"
    done = subprocess.run([sys.executable, "-c", code], check=True, capture_output=True, text=True)
    assert done.stdout.split() == ["False", "False"]
