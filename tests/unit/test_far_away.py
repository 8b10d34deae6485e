"""Obstacles and survey rows that lie nowhere near a link are told, with the likely slip; those near one are not."""

import numpy as np
import pytest

from fellspan.geodesy.position import Position
from fellspan.links.site import Link, Radio, Site
from fellspan.planning.far_away import far_cautions
from fellspan.terrain.listed import Listed


def link(a: tuple[float, float], b: tuple[float, float]) -> Link:
    ends = [
        Site(name=name, position=Position(latitude_deg=at[0], longitude_deg=at[1]), height_m=10.0)
        for name, at in (("A", a), ("B", b))
    ]
    return Link(name="A - B", a=ends[0], b=ends[1], radio=Radio(frequency_hz=5.8e9))


def listed(*places: tuple[float, float]) -> Listed:
    return Listed(
        kind="obstacle",
        names=tuple(f"mast {number}" for number in range(len(places))),
        latitude_deg=np.array([at[0] for at in places]),
        longitude_deg=np.array([at[1] for at in places]),
    )


TOLMERA = link((36.09, -45.28), (36.09, -45.25))


def test_swapped_places_are_told_as_swapped() -> None:
    (said,) = far_cautions([listed((36.08, -45.26), (-45.26, 36.08), (-45.27, 36.08))], [TOLMERA])
    assert said == (
        "2 of 3 obstacles lie more than 50 km from every link and change nothing: 'mast 1', 'mast 2'; "
        "swapped, they would lie near: latitude comes first"
    )
    (one,) = far_cautions([listed((-45.26, 36.08))], [TOLMERA])
    assert one.startswith(
        "the only obstacle lies more than 50 km from every link and changes nothing: 'mast 0'; swapped, it"
    )


def test_what_is_far_and_not_swapped_is_only_asked_about() -> None:
    (said,) = far_cautions([listed(*[(10.0, 170.0 + number) for number in range(5)])], [TOLMERA])
    assert "'mast 2' and 2 more; are their coordinates right?" in said


@pytest.mark.parametrize(
    ("path", "place"),
    [
        (TOLMERA, (36.4, -45.25)),  # 34 km
        (link((36.0, 0.0), (36.0, 4.0)), (36.1, 2.0)),  # beside the middle of 360 km
        (link((10.0, 179.9), (10.0, -179.9)), (10.1, -179.99)),  # across the antimeridian
    ],
)
def test_what_is_near_any_part_of_a_link_is_not_told(path: Link, place: tuple[float, float]) -> None:
    assert list(far_cautions([listed(place), listed()], [path])) == []
