"""Profiles and links made by hand for the tests of the links room."""

from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray

from fellspan.geodesy.position import Position
from fellspan.links.site import Antenna, Link, Radio, Site
from fellspan.terrain.profile import PathObstacle, PathProfile
from fellspan.vocabulary import COVER_KINDS

METRES_PER_DEGREE = 111_319.49079327357
"""Of longitude on the equator of WGS 84: 6378137 m * pi / 180."""


def profile_of(
    length_m: float,
    ground: Callable[[NDArray[np.float64]], NDArray[np.float64]] | float = 0.0,
    *,
    n: int = 1001,
    cover: Callable[[NDArray[np.float64]], NDArray[np.float64]] | float = 0.0,
    kind: str = "tree",
    obstacles: tuple[PathObstacle, ...] = (),
    sigma_m: float = 0.0,
    measured: int = 0,
    source: str = "made_dtm.tif",
    cell_m: float = 0.0,
    **changes: object,
) -> PathProfile:
    """A path east along the equator; obstacles stand where they reach above the cover."""
    extra = [at for item in obstacles for at in (item.from_m, item.to_m)]
    distance = np.unique(np.concatenate((np.linspace(0.0, length_m, n), extra)))
    level = np.zeros(distance.shape) + (ground(distance) if callable(ground) else ground)
    height = np.zeros(distance.shape) + (cover(distance) if callable(cover) else cover)
    kinds = np.where(height > 0.0, COVER_KINDS.index(kind), 0).astype(np.int8)
    index = np.full(distance.shape, -1, dtype=np.int32)
    for number, item in enumerate(obstacles):
        higher = (distance >= item.from_m) & (distance <= item.to_m) & (item.top_amsl_m > level + height)
        height[higher] = item.top_amsl_m - level[higher]
        kinds[higher] = COVER_KINDS.index(item.kind)
        index[higher] = number
    fields = {
        "a": Position(latitude_deg=0.0, longitude_deg=0.0),
        "b": Position(latitude_deg=0.0, longitude_deg=length_m / METRES_PER_DEGREE),
        "distance_m": distance,
        "latitude_deg": np.zeros(distance.shape),
        "longitude_deg": distance / METRES_PER_DEGREE,
        "ground_m": level,
        "cover_m": height,
        "cover_kind": kinds,
        "obstacle_index": index,
        "surface_m": level + height,
        "source": np.zeros(distance.shape, dtype=np.int16),
        "measured": np.full(distance.shape, measured, dtype=np.int8),
        "sigma_m": np.full(distance.shape, sigma_m),
        "sources": (source,),
        "obstacles": obstacles,
        "gaps": (),
        "step_m": length_m / (n - 1),
        "cell_m": cell_m or 2.0 * length_m / (n - 1),
        "ground_is_bare": True,
        "surface_is_known": False,
        "vertical_datum": None,
    }
    return PathProfile(**(fields | changes))  # type: ignore[arg-type]


def mirrored(profile: PathProfile) -> PathProfile:
    """The same path seen from B."""
    length = profile.length_m
    arrays = "latitude_deg longitude_deg ground_m cover_m cover_kind obstacle_index surface_m source measured sigma_m"
    plain = "sources gaps step_m cell_m ground_is_bare surface_is_known vertical_datum notes"
    turned = {name: getattr(profile, name)[::-1].copy() for name in arrays.split()}
    kept = {name: getattr(profile, name) for name in plain.split()}
    obstacles = tuple(
        PathObstacle(
            name=item.name,
            kind=item.kind,
            from_m=length - item.to_m,
            to_m=length - item.from_m,
            top_amsl_m=item.top_amsl_m,
            height_m=item.height_m,
            source=item.source,
        )
        for item in profile.obstacles
    )
    distance = (length - profile.distance_m)[::-1].copy()
    return PathProfile(a=profile.b, b=profile.a, distance_m=distance, obstacles=obstacles, **turned, **kept)


def obstacle(
    name: str, from_m: float, to_m: float, height_m: float, *, kind: str = "building", ground_m: float = 0.0
) -> PathObstacle:
    return PathObstacle(
        name=name,
        kind=kind,  # type: ignore[arg-type]
        from_m=from_m,
        to_m=to_m,
        top_amsl_m=ground_m + height_m,
        height_m=height_m,
        source="made.csv",
    )


def link_of(
    profile: PathProfile,
    a: dict[str, object] | float = 10.0,
    b: dict[str, object] | float = 10.0,
    *,
    frequency_hz: float = 6e9,
    power_dbm: float | None = None,
    threshold_dbm: float | None = None,
    gain_dbi: float | None = None,
    wanted_margin_db: float = 10.0,
) -> Link:
    """A link over the profile; a number is an antenna height above ground."""

    def site(name: str, given: dict[str, object] | float, position: Position) -> Site:
        fields = {"height_m": given} if isinstance(given, float | int) else given
        return Site(name=name, position=position, **fields)  # type: ignore[arg-type]

    return Link(
        name="Alder - Birch",
        a=site("Alder", a, profile.a),
        b=site("Birch", b, profile.b),
        radio=Radio(frequency_hz=frequency_hz, power_dbm=power_dbm, threshold_dbm=threshold_dbm),
        antenna_a=Antenna(gain_dbi=gain_dbi),
        antenna_b=Antenna(gain_dbi=gain_dbi),
        wanted_margin_db=wanted_margin_db,
    )
