"""Links and results made by hand for the tests of neighbours; invented places in open ocean, no terrain unless asked for."""

import math
from dataclasses import replace

from fellspan.antennas.pattern import Pattern
from fellspan.geodesy import geodesic
from fellspan.geodesy.position import Position
from fellspan.links.interference import study_interference
from fellspan.links.interference_result import InterferenceResult, StudyInterference
from fellspan.links.radio import Radio
from fellspan.links.result import AtEnds, EndResult, Ends, LinkResult, Losses
from fellspan.links.site import Antenna, Link, Site
from fellspan.terrain.terrain import Terrain

HOME = Position(latitude_deg=36.05, longitude_deg=-45.2)
K = 4.0 / 3.0
LIGHT_M_S = 299_792_458.0
EARTH_M = 6_371_000.0


def east_north(east_m: float, north_m: float, *, start: Position = HOME) -> Position:
    """So far along the geodesic that leaves `start` in that direction."""
    return geodesic.destination(start, math.degrees(math.atan2(east_m, north_m)), math.hypot(east_m, north_m))


def free_space(distance_m: float, frequency_hz: float) -> float:
    """20 log10(4 pi d f / c), dB (Rec. ITU-R P.525)."""
    return 20.0 * math.log10(4.0 * math.pi * distance_m * frequency_hz / LIGHT_M_S)


def lobe(*, gain_dbi: float = 30.0, floor_db: float = 40.0, cross_db: float = 30.0, size_m: float = 0.6) -> Pattern:
    """A round beam: 12 (angle / 6 degrees)^2 dB down to a floor; cross polarization a stated step below it everywhere."""
    import numpy as np

    def co(azimuth_rad, elevation_rad):
        angle = np.degrees(np.arccos(np.clip(np.cos(azimuth_rad) * np.cos(elevation_rad), -1.0, 1.0)))
        return 10.0 ** (-np.minimum(12.0 * (angle / 6.0) ** 2, floor_db) / 20.0)

    return Pattern(
        name="made dish", kind="dish", frequency_hz=6e9, peak_gain_dbi=gain_dbi, co_amplitude=co,
        cross_amplitude=lambda azimuth, elevation: co(azimuth, elevation) * 10.0 ** (-cross_db / 20.0),
        size_m=size_m, efficiency=0.6, source="made for a test",
    )  # fmt: skip


def radio(**given: object) -> Radio:
    fields = {
        "frequency_hz": 6e9,
        "power_dbm": 20.0,
        "threshold_dbm": -80.0,
        "bandwidth_hz": 20e6,
        "noise_figure_db": 6.0,
    }
    return Radio(**(fields | given))  # type: ignore[arg-type]


def planned(
    name: str,
    a: Position,
    b: Position,
    *,
    sites: tuple[str, str] | None = None,
    heights_m: tuple[float, float] = (30.0, 30.0),
    own_radio: Radio | None = None,
    antennas: tuple[Antenna, Antenna] | None = None,
    carrier_dbm: float | None = -50.0,
) -> tuple[Link, LinkResult]:
    """A link with a result of which only what neighbours need is worth anything; heights above the sea, k 4/3."""
    names = sites or (f"{name} west", f"{name} east")
    ends = [
        Site(name=site, position=at, height_m=high, height_reference="sea")
        for site, at, high in zip(names, (a, b), heights_m, strict=True)
    ]
    dish = Antenna(pattern=lobe(), name="dish")
    link = Link(
        name=name, a=ends[0], b=ends[1], radio=own_radio or radio(), antenna_a=(antennas or (dish, dish))[0],
        antenna_b=(antennas or (dish, dish))[1],
    )  # fmt: skip
    way = geodesic.inverse(a, b)
    sunk = math.degrees(0.5 * way.distance_m / (4.0 / 3.0 * EARTH_M))
    rise = math.degrees((heights_m[1] - heights_m[0]) / way.distance_m)
    results = [
        EndResult(
            site=site.name, latitude_deg=site.position.latitude_deg, longitude_deg=site.position.longitude_deg, ground_m=0.0,
            roof_m=None, antenna_amsl_m=site.height_m, antenna_agl_m=site.height_m, height_as_given="",
            magnetic_bearing_deg=None, declination_deg=None,
        )
        for site in ends
    ]  # fmt: skip
    margin = None if carrier_dbm is None else carrier_dbm + 80.0
    return link, LinkResult(
        name=name, a=names[0], b=names[1], verdict="clear", signal_verdict=None, basis="bare ground only", confidence=1.0,
        confidence_asked=0.9, reasons=(), cautions=(), distance_m=way.distance_m, bearing_ab_deg=way.bearing_ab_deg,
        bearing_ba_deg=way.bearing_ba_deg, tilt_ab_deg=rise - sunk, tilt_ba_deg=-rise - sunk, frequency_hz=6e9,
        polarization="vertical", median_k=4.0 / 3.0, ends=Ends(a=results[0], b=results[1]), clearance=(), governing=0,
        ignored=(), losses_db=Losses(free_space=0.0, diffraction=0.0), received_dbm=AtEnds(at_a=carrier_dbm, at_b=carrier_dbm),
        margin_db=AtEnds(at_a=margin, at_b=margin), wanted_margin_db=10.0, magnetic_model=None, step_m=10.0, sources=(),
        vertical_datum=None,
    )  # fmt: skip


def study(*links: object, terrain: Terrain | None = None, **more: object) -> StudyInterference:
    return study_interference(links, terrain=terrain, median_k=K, **more)  # type: ignore[arg-type]


def receiver(found: StudyInterference, link: str, end: str) -> InterferenceResult:
    return next(one for one in found.receivers if (one.link, one.end) == (link, end))


def two_parallel(apart_m: float = 500.0, **more: object):
    north = east_north(0.0, apart_m)
    return (
        planned("South", HOME, east_north(5_000.0, 0.0), **more),
        planned("North", north, east_north(5_000.0, 0.0, start=north), **more),
    )


def replace_radio(given, **changes: object):
    link, result = given
    return replace(link, radio=replace(link.radio, **changes)), result


def at_one_mast(low_first: bool, heights: tuple[float, float] = (30.0, 34.0), **more: object):
    """Two links of frequency division that leave one mast in opposite directions."""
    high, low = 6.1e9, 5.9e9
    pairs = ((high, low), (low, high) if low_first else (high, low))
    return [
        planned(
            name, HOME, east_north(side * 5_000.0, 0.0), sites=("Hill", name), heights_m=(height, 30.0),
            own_radio=radio(duplex="frequency", frequency_a_hz=pair[0], frequency_b_hz=pair[1]), **more,
        )
        for name, side, pair, height in zip(("East", "West"), (1.0, -1.0), pairs, heights, strict=True)
    ]  # fmt: skip
