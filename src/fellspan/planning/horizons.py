"""The skylines from both ends of a planned link, worked out only where they are wanted: they cost about a second an end."""

from dataclasses import replace

from fellspan.errors import FellspanError
from fellspan.links.skyline import Skyline, skyline
from fellspan.planning.plan import Horizons, LinkPlan
from fellspan.terrain.fan import Fan
from fellspan.terrain.terrain import Terrain


def with_horizons(link: LinkPlan, terrain: Terrain) -> LinkPlan:
    """The link with the skyline from each end, at the median k, 30 degrees to either side of the other end.

    Rasters that cannot be used somewhere off the path leave the link without skylines: they are no reason to lose its plan.
    """
    result, ends = link.result, link.result.ends

    def seen(which: str) -> Skyline:
        at_a = which == "a"
        return skyline(
            Fan(terrain, link.link.a.position if at_a else link.link.b.position),
            antenna_amsl_m=ends.a.antenna_amsl_m if at_a else ends.b.antenna_amsl_m,
            bearing_deg=result.bearing_ab_deg if at_a else result.bearing_ba_deg,
            k=result.median_k,
            link_m=result.distance_m,
        )

    try:
        return replace(link, horizons=Horizons(a=seen("a"), b=seen("b")))
    except FellspanError:
        return link
