"""Comparing equipment on a link of a study, or over a distance without terrain: opens what it needs and asks `design`.

Reads no study file and prints nothing.
"""

from collections.abc import Sequence
from dataclasses import dataclass, field, replace

from fellspan.climate.assembling import figures_for
from fellspan.climate.given import GivenClimate
from fellspan.design.equip import EquipPath, compare_equipment, path_over
from fellspan.design.equip_result import EquipResult, EquipSettings
from fellspan.design.offers import Offer
from fellspan.geodesy import geodesic
from fellspan.links.assess import Assessment, AssessSettings, assess_in_full
from fellspan.links.budget import tilt_deg
from fellspan.links.radio import Radio
from fellspan.links.signal_path import Weather, free_path
from fellspan.links.site import Link
from fellspan.planning.inputs import Study
from fellspan.planning.planner import open_terrain, settings_of


@dataclass(frozen=True, slots=True, kw_only=True)
class FreeWay:
    """A distance without terrain, clear at every k.

    `height_m` is that of both antennas above level ground at `ground_amsl_m`; `maps` says whether the place of the link may
    be looked up in maps of climate (it is meaningless where nobody said where the link is).
    """

    height_m: float = 30.0
    ground_amsl_m: float = 0.0
    median_k: float = 4.0 / 3.0
    given: GivenClimate = field(default_factory=GivenClimate)
    maps: bool = False


def equip_link(
    study: Study,
    link: Link,
    offers: Sequence[Offer],
    radios: Sequence[Radio] = (),
    *,
    settings: EquipSettings | None = None,
) -> EquipResult:
    """Compare antennas and radios on a link over the terrain of its study.

    Raises
    ------
    LinkError, TerrainError
        As planning the link would, or as `compare_equipment`.
    """
    judged = settings_of(study)
    with open_terrain(study) as terrain:

        def way(of: Link) -> EquipPath:
            return over_terrain(of, assess_in_full(of, terrain=terrain, settings=judged), judged)

        return compare_equipment(link, offers, radios, way=way, weather=judged.weather, settings=settings)


def over_terrain(link: Link, assessment: Assessment, judged: AssessSettings) -> EquipPath:
    """The path of a link that was assessed by `judged`."""
    return path_over(link, assessment, median_k=judged.median_k, weather=judged.weather)


def equip_distance(
    link: Link,
    offers: Sequence[Offer],
    radios: Sequence[Radio] = (),
    *,
    free: FreeWay,
    settings: EquipSettings | None = None,
) -> EquipResult:
    """Compare antennas and radios over the distance between the sites of a link, as if nothing stood in the way."""
    line = geodesic.inverse(link.a.position, link.b.position)
    level = free.ground_amsl_m + free.height_m
    tilt = tilt_deg(distance_m=line.distance_m, from_amsl_m=level, to_amsl_m=level, k=free.median_k)
    given = free.given if free.given.altitude_m is not None else replace(free.given, altitude_m=level)
    figures = figures_for(link.a.position, given=given, maps=free.maps)

    def way(of: Link) -> EquipPath:
        path = free_path(
            of,
            figures,
            length_m=line.distance_m,
            a_amsl_m=level,
            b_amsl_m=level,
            mean_ground_m=free.ground_amsl_m,
            median_k=free.median_k,
        )
        return EquipPath(path=path, bearings_deg=(line.bearing_ab_deg, line.bearing_ba_deg), tilts_deg=(tilt, tilt))

    return compare_equipment(link, offers, radios, way=way, weather=Weather(given=given), settings=settings)
