"""The horizon sketch: words beside their lines, and none on the line to the far site."""

from xml.etree import ElementTree

import numpy as np
import pytest

from fellspan.links.skyline import Landmark, Skyline, SkylineLayer
from fellspan.report.horizon_drawing import Target, draw_horizon

LABEL_PX = 150.0
"""What the drawing allows for the words of a landmark."""
TARGET = Target(
    name="Far",
    tilt_deg=0.0,
    distance_m=9000.0,
    hidden_by=None,
    declination_deg=None,
    width_deg=(5.0, 5.0),
    boresight_deg=(90.0, 0.0),
)


def drawn(*offsets_deg: float) -> list[ElementTree.Element]:
    """Texts of the sketch with a hill at each offset from the bearing of the link."""
    rays = np.linspace(-30.0, 30.0, 601)
    far = np.full(rays.shape, 4000.0)
    seen = Skyline(
        antenna_amsl_m=30.0,
        k=4.0 / 3.0,
        bearing_deg=90.0,
        offset_deg=rays,
        elevation_deg=np.zeros(rays.shape),
        distance_m=far,
        reach_m=far + 9000.0,
        wanted_reach_m=13000.0,
        layers=(SkylineLayer(name="middle", elevation_deg=np.zeros(rays.shape), distance_m=far),),
        landmarks=tuple(
            Landmark(bearing_deg=90.0 + offset, elevation_deg=0.5, distance_m=4000.0, top_amsl_m=60.0, what="hill")
            for offset in offsets_deg
        ),
        notes=(),
    )
    root = ElementTree.fromstring(draw_horizon(seen, TARGET, uid="h", title="Horizon"))
    return [one for one in root.iter() if one.tag.endswith("text")]


def span(text: ElementTree.Element) -> tuple[float, float]:
    at = float(text.get("x", "nan"))
    return (at - LABEL_PX, at) if text.get("text-anchor") == "end" else (at, at + LABEL_PX)


@pytest.mark.parametrize("offset_deg", [-9.0, -3.0, -1.8, -0.2, 0.0, 0.2, 0.4, 3.0])
def test_no_words_stand_on_the_line_to_the_far_site(offset_deg: float) -> None:
    texts = drawn(offset_deg)
    axis = next(float(one.get("x", "nan")) for one in texts if one.text == "Far")
    (mark,) = [one for one in texts if one.get("class") == "mark"]
    low, high = span(mark)
    assert not low < axis < high
    assert abs(axis - (high if high <= axis else low)) < LABEL_PX + 10.0


def test_landmarks_on_both_sides_of_the_line_keep_apart() -> None:
    marks = [one for one in drawn(-14.0, -9.0, -2.0, 0.1, 5.0) if one.get("class") == "mark"]
    assert len(marks) >= 4
    for index, one in enumerate(marks):
        for other in marks[index + 1 :]:
            apart = span(one)[1] <= span(other)[0] or span(other)[1] <= span(one)[0]
            assert apart or one.get("y") != other.get("y")


def test_words_of_the_key_stand_beside_their_lines() -> None:
    assert all(one.get("text-anchor") is None for one in drawn(5.0) if one.text in ("1 to 5 km", "beyond 5 km"))
