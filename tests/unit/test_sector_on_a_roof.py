"""One sector above a roof that an outline gives: its level is read on each path, and it is one sector all the same."""

from dataclasses import replace
from pathlib import Path

import pytest
from made_neighbours import HOME, east_north, lobe, planned, study

from fellspan.links.site import Aim, Antenna
from fellspan.planning.planner import plan_study
from fellspan.study.reading import load_study

SAMPLE = Path(__file__).parents[2] / "sample_terrain"
STUDY = f"""
[terrain]
ground = {{ path = "{SAMPLE / "tolmera_ground.tif"}", datum = "EGM2008", error = "0.5 m" }}
obstacles = [{{ path = "{SAMPLE / "buildings.geojson"}", complete = ["building"] }}]
gaps = "sea"

[[site]]
name = "Harbour Office"
at = "36.038172 N, 45.155982 W"
height = "5 m above roof"

[[site]]
name = "Calder Cottage"
at = "36.042978 N, 45.163502 W"
height = "5 m above ground"

[[site]]
name = "Otter House"
at = "36.038204 N, 45.169821 W"
height = "8 m above ground"

[[radio]]
name = "sector radio"
frequency = "5.795 GHz"
power = "17 dBm"
channel_width = "20 MHz"
noise_figure = "6 dB"
threshold = "-84 dBm"

[[antenna]]
name = "sector"
model = "sector 5 GHz, 90 degrees"
bearing = 290

[[antenna]]
name = "panel"
gain = "19 dBi"
azimuth_width = 17
elevation_width = 17
front_to_back = "30 dB"
"""
LINK = """
[[link]]
name = "to {b}"
a = "Harbour Office"
b = "{b}"
radio = "sector radio"
antenna_a = "sector"
antenna_b = "panel"
"""


def test_a_sector_above_the_roof_of_an_outline_does_not_disturb_itself(tmp_path: Path) -> None:
    path = tmp_path / "hub.toml"
    path.write_text(STUDY + LINK.format(b="Calder Cottage") + LINK.format(b="Otter House"))
    plan = plan_study(load_study(path))
    levels = [one.result.ends.a.antenna_amsl_m for one in plan.links]
    # Else the case is not the one at hand: the roof stands on the highest ground under each path.
    assert 0.01 < abs(levels[0] - levels[1]) < 0.3
    assert plan.interference is not None
    assert plan.interference.near == ()
    assert all(not one.interferers for one in plan.interference.receivers)


@pytest.mark.parametrize(("typed", "one_sector"), [((5.0, 5.0), True), ((5.0, 5.2), False)])
def test_heights_above_one_roof_are_one_if_typed_alike(typed: tuple[float, float], one_sector: bool) -> None:
    sector = Antenna(pattern=lobe(), name="sector", mounting=Aim(bearing_deg=90.0, tilt_deg=0.0))
    links = []
    for name, north_m, height_m, read_m in (("Quay", 300.0, typed[0], 24.9), ("Mill", -300.0, typed[1], 25.0)):
        link, result = planned(
            name,
            HOME,
            east_north(4_000.0, north_m),
            sites=("Hub", name),
            antennas=(sector, Antenna(pattern=lobe(), name="dish")),
        )
        link = replace(link, a=replace(link.a, height_m=height_m, height_reference="roof"))
        end = replace(result.ends.a, antenna_amsl_m=read_m)
        links.append((link, replace(result, ends=replace(result.ends, a=end))))
    assert all(not one.interferers for one in study(*links).receivers) is one_sector
