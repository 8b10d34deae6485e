"""Names and signatures that other people rely on stay as they are; see docs/architecture.md and docs/results.md."""

import inspect

import pytest

import fellspan
from fellspan import propagation

PUBLIC = {
    "Antenna",
    "FellspanError",
    "Link",
    "LinkPlan",
    "LinkResult",
    "PathProfile",
    "Position",
    "Radio",
    "Site",
    "Study",
    "StudyPlan",
    "Terrain",
    "__version__",
    "assess",
    "load_study",
    "plan_study",
    "propagation",
}

SIGNATURES = {
    "free_space_loss_db": "(distance_m, *, frequency_hz)",
    "fresnel_radius_m": "(from_a_m, from_b_m, *, frequency_hz, zone=1)",
    "earth_bulge_m": "(from_a_m, from_b_m, *, k)",
    "knife_edge_loss_db": "(nu)",
    "delta_bullington_loss_db": (
        "(distance_m, ground_m, *, a_amsl_m, b_amsl_m, frequency_hz, k=1.3333333333333333, "
        "polarization='horizontal', sea_fraction=0.0, surface_m=None)"
    ),
    "gas_attenuation_db_per_km": "(frequency_hz, *, dry_pressure_hpa, temperature_k, vapour_g_m3)",
}


def bare(function: object) -> str:
    """The signature without annotations."""
    signature = inspect.signature(function)  # type: ignore[arg-type]
    plain = [parameter.replace(annotation=inspect.Parameter.empty) for parameter in signature.parameters.values()]
    return str(signature.replace(parameters=plain, return_annotation=inspect.Signature.empty))


def test_the_package_offers_these_names_and_each_loads() -> None:
    assert set(fellspan.__all__) == PUBLIC
    for name in PUBLIC:
        assert getattr(fellspan, name) is not None
    assert set(dir(fellspan)) >= PUBLIC


def test_an_unknown_name_is_an_attribute_error() -> None:
    with pytest.raises(AttributeError, match="no_such_name"):
        _ = fellspan.no_such_name


@pytest.mark.parametrize("name", SIGNATURES)
def test_physics_keeps_its_signatures(name: str) -> None:
    assert bare(getattr(propagation, name)) == SIGNATURES[name]


def test_rain_takes_rate_frequency_and_polarization() -> None:
    parameters = inspect.signature(propagation.rain_attenuation_db_per_km).parameters
    assert next(iter(parameters)) == "rain_rate_mm_h"
    assert {"frequency_hz", "polarization"} <= set(parameters)
    assert parameters["frequency_hz"].kind is inspect.Parameter.KEYWORD_ONLY


def test_terrain_opens_and_profiles_by_these_words() -> None:
    opening = inspect.signature(fellspan.Terrain.open).parameters
    assert list(opening)[:5] == ["ground", "surface", "cover", "obstacles", "survey"]
    assert all(parameter.kind is inspect.Parameter.KEYWORD_ONLY for parameter in opening.values())
    assert list(inspect.signature(fellspan.Terrain.profiles).parameters)[:3] == ["self", "pairs", "step_m"]
    assert list(inspect.signature(fellspan.Terrain.profile).parameters)[:4] == ["self", "a", "b", "step_m"]


def test_planning_and_assessing_take_these_words() -> None:
    assert next(iter(inspect.signature(fellspan.load_study).parameters)) == "path"
    assert next(iter(inspect.signature(fellspan.plan_study).parameters)) == "study"
    assert list(inspect.signature(fellspan.assess).parameters)[:2] == ["link", "terrain"]
    assert set(inspect.signature(fellspan.Position).parameters) == {"latitude_deg", "longitude_deg"}


def test_importing_the_package_loads_no_numpy() -> None:
    import subprocess
    import sys

    code = "import sys, fellspan; sys.exit('numpy' in sys.modules)"
    assert subprocess.run([sys.executable, "-c", code], check=False).returncode == 0
