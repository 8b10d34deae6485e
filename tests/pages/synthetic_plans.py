"""Plans made by hand from the dataclasses, with an independent straight NumPy calculation, for the tests of pages.

The land is invented. Nothing here is the proof of the physics: it only has to be consistent, so that pages can be checked.
"""

import datetime as dt
from pathlib import Path

import numpy as np
import rasterio
from pyproj import Geod
from rasterio.transform import Affine

from fellspan.errors import TerrainGapError
from fellspan.geodesy.position import Position
from fellspan.links.levels import PathLevels
from fellspan.links.result import (
    AtEnds,
    CriterionResult,
    EndResult,
    Ends,
    ExtraHeight,
    Ignored,
    LinkResult,
    Losses,
    Obstruction,
)
from fellspan.links.site import Link, Radio, Site
from fellspan.planning.inputs import Study, TerrainInputs
from fellspan.planning.plan import InputFile, LinkFailure, LinkPlan, StudyPlan
from fellspan.terrain.profile import PathObstacle, PathProfile
from fellspan.terrain.sources import RasterSource

GEOD = Geod(ellps="WGS84")
EARTH_M = 6_371_000.0
LIGHT_M_S = 299_792_458.0
TOLMERA = Position(latitude_deg=36.05, longitude_deg=-45.2)


def north_up(west, north, wide, tall):
    """The grid of a raster with north up; rasterio's own helper warns with the newest affine."""
    return Affine(wide, 0.0, west, 0.0, -tall, north)


def land(latitude_deg, longitude_deg, *, at):
    """Heights of an invented island around the position `at`; sea is 0."""
    north = (latitude_deg - at.latitude_deg) * 111.0
    east = ((longitude_deg - at.longitude_deg + 180.0) % 360.0 - 180.0) * 90.0
    hills = 310.0 * np.exp(-(((north - 2.0) / 3.1) ** 2) - ((east + 1.5) / 2.4) ** 2)
    hills += 190.0 * np.exp(-(((north + 3.0) / 1.7) ** 2) - ((east - 3.0) / 3.2) ** 2)
    rough = 6.0 * np.sin(north * 7.1) * np.cos(east * 5.3) + 2.0 * np.sin(north * 31.0 + east * 23.0)
    return np.maximum(0.0, hills + rough - 14.0)


def write_island(path: Path, *, at: Position, cells: int = 400, half_km: float = 12.0, **more) -> Path:
    """A GeoTIFF of `land` in geographic coordinates, open sea as nodata where it lies far out."""
    step = 2 * half_km / 111.0 / cells
    west, north = at.longitude_deg - half_km / 90.0, at.latitude_deg + half_km / 111.0
    wide = 2 * half_km / 90.0 / cells
    rows, columns = np.mgrid[0:cells, 0:cells] + 0.5
    heights = land(north - rows * step, west + columns * wide, at=at).astype("float32")
    heights[:, : cells // 12] = -9999.0
    options = {"driver": "GTiff", "count": 1, "dtype": "float32", "crs": "EPSG:4326", "nodata": -9999.0, "tiled": True}
    with rasterio.open(
        path, "w", width=cells, height=cells, transform=north_up(west, north, wide, step), **options | more
    ) as file:
        file.write(heights, 1)
    return path


def bulge(distance_m, k):
    """Earth bulge, m; common geometry."""
    return distance_m * (distance_m[-1] - distance_m) / (2.0 * k * EARTH_M)


def make_link(
    name, a, b, *, at, frequency_hz=5.8e9, heights_m=(12.0, 12.0), roofs_m=(None, None), names=("Harbour", "North Light"),
    trees=(), obstacles=(), criteria=((4 / 3, 0.6), (1.0, 0.3)), samples=2001, basis="surface raster",
):  # fmt: skip
    """One LinkPlan; `trees` are (from share, to share, height), `obstacles` (name, share, width m, height, kind)."""
    azimuth, back, length = GEOD.inv(a.longitude_deg, a.latitude_deg, b.longitude_deg, b.latitude_deg)
    distance = np.linspace(0.0, length, samples)
    lon, lat, _ = GEOD.fwd(
        np.full(samples, a.longitude_deg), np.full(samples, a.latitude_deg), np.full(samples, azimuth), distance
    )
    ground = land(lat, lon, at=at)
    cover, kind, which, found = np.zeros(samples), np.zeros(samples, np.int8), np.full(samples, -1, np.int32), []
    for start, stop, height in trees:
        inside = (distance >= start * length) & (distance <= stop * length)
        cover[inside] = height * (0.8 + 0.2 * np.sin(distance[inside] / 7.0))
        kind[inside] = 2
    for label, share, width, height, obstacle_kind in obstacles:
        inside = np.abs(distance - share * length) <= max(width / 2, length / samples)
        cover[inside], kind[inside], which[inside] = height, (1 if obstacle_kind == "building" else 3), len(found)
        stretch = distance[inside]
        found.append(
            PathObstacle(
                name=label, kind=obstacle_kind, from_m=float(stretch[0]), to_m=float(stretch[-1]), height_m=height,
                top_amsl_m=float((ground + cover)[inside].max()), source="obstacles.csv",
            )
        )  # fmt: skip
    surface = ground + cover
    tops = [ground[0] + (roofs_m[0] or 0) + heights_m[0], ground[-1] + (roofs_m[1] or 0) + heights_m[1]]
    ray = tops[0] + (tops[1] - tops[0]) * distance / length
    radius = np.sqrt(LIGHT_M_S / frequency_hz * distance * (length - distance) / length)
    results, bulges, needs = [], [], []
    for index, (k, fraction) in enumerate(criteria):
        rise = bulge(distance, k) if k else np.zeros(samples)
        need = surface + rise + fraction * radius
        bulges.append(rise)
        needs.append(need)
        short = need - ray
        inner = slice(1, -1)
        worst = 1 + int(np.argmin(((ray - surface - rise) / np.maximum(radius, 1e-9))[inner]))
        most = 1 + int(np.argmax(short[inner]))
        cause = found[which[worst]].name if which[worst] >= 0 else ("ground", "building", "trees", "cover")[kind[worst]]
        bad = np.flatnonzero(short[inner] > 0) + 1
        stretches = np.split(bad, np.flatnonzero(np.diff(bad) > 1) + 1) if bad.size else []
        results.append(
            CriterionResult(
                criterion=f"rule {index + 1}", k=k, required_fraction=fraction, met=not bad.size,
                worst_fraction=float((ray - surface - rise)[worst] / radius[worst]), worst_at_m=float(distance[worst]),
                clearance_m=float((ray - surface - rise)[worst]), required_m=float(fraction * radius[worst]),
                fresnel_radius_m=float(radius[worst]), surface_m=float(surface[worst]), bulge_m=float(rise[worst]),
                available_m=float(ray[worst]), latitude_deg=float(lat[worst]), longitude_deg=float(lon[worst]),
                shortfall_m=max(0.0, float(short[most])), shortfall_at_m=float(distance[most]), cause=cause,
                extra_height_m=ExtraHeight(
                    a=max(0.0, float(short[most] / (1 - distance[most] / length))), b=None, both=max(0.0, float(short[most]))
                ),
                probability=0.42 if bad.size else 0.993,
                obstructions=tuple(
                    Obstruction(
                        from_m=float(distance[run[0]]), to_m=float(distance[run[-1]]),
                        worst_at_m=float(distance[run[np.argmax(short[run])]]), shortfall_m=float(short[run].max()),
                        cause=cause, cuts_sight=bool(((surface + rise) > ray)[run].any()), measured=False,
                    )
                    for run in stretches
                ),
                source="common practice, no source",
            )
        )  # fmt: skip
    governing = int(np.argmin([item.clearance_m - item.required_m for item in results]))
    cut = any(item.cuts_sight for item in results[0].obstructions)
    verdict = "obstructed" if cut else "clear" if all(item.met for item in results) else "marginal"
    sites = [
        Site(name=n, position=p, height_m=h, height_reference="roof" if r else "ground", roof_m=r)
        for n, p, h, r in zip(names, (a, b), heights_m, roofs_m, strict=True)
    ]
    link = Link(name=name, a=sites[0], b=sites[1], radio=Radio(frequency_hz=frequency_hz, power_dbm=23.0))

    def end(site, index, bearing):
        return EndResult(
            site=site.name, latitude_deg=site.position.latitude_deg, longitude_deg=site.position.longitude_deg,
            ground_m=float(ground[index]), roof_m=site.roof_m, antenna_amsl_m=float(tops[index]),
            antenna_agl_m=float(tops[index] - ground[index]),
            height_as_given=f"{site.height_m:g} m above {site.height_reference}", magnetic_bearing_deg=bearing + 12.0,
            declination_deg=-12.0,
        )  # fmt: skip

    word = {"clear": "Every criterion is met.", "marginal": "The sight line is free, but the required zone is not."}
    reason = word.get(verdict, f"The sight line is cut by {results[governing].cause}.")
    result = LinkResult(
        name=name, a=names[0], b=names[1], verdict=verdict, signal_verdict="meets", basis=basis,
        confidence=min(item.probability for item in results), confidence_asked=0.9,
        reasons=(reason, f"{results[governing].cause} governs at {results[governing].worst_at_m / 1000:.2f} km from A."),
        cautions=("The vertical datum of the raster is not stated.",), distance_m=float(length),
        bearing_ab_deg=azimuth % 360.0, bearing_ba_deg=back % 360.0, tilt_ab_deg=0.4, tilt_ba_deg=-0.5,
        frequency_hz=frequency_hz, polarization="vertical", median_k=4 / 3,
        ends=Ends(a=end(sites[0], 0, azimuth % 360.0), b=end(sites[1], -1, back % 360.0)), clearance=tuple(results),
        governing=governing, ignored=(Ignored(end="a", from_m=0.0, to_m=8.0, height_m=6.0, what="own building"),),
        losses_db=Losses(free_space=128.4, diffraction=0.0 if verdict == "clear" else 7.2),
        received_dbm=AtEnds(at_a=-58.2, at_b=-58.2), margin_db=AtEnds(at_a=14.1, at_b=None), wanted_margin_db=10.0,
        magnetic_model="World Magnetic Model", step_m=float(length / samples), sources=("island.tif",), vertical_datum=None,
    )  # fmt: skip
    profile = PathProfile(
        a=a, b=b, distance_m=distance, latitude_deg=lat, longitude_deg=lon, ground_m=ground, cover_m=cover, cover_kind=kind,
        obstacle_index=which, surface_m=surface, source=np.zeros(samples, np.int16), measured=np.zeros(samples, np.int8),
        sigma_m=np.ones(samples), sources=("island.tif",), obstacles=tuple(found), gaps=(), step_m=float(length / samples),
        cell_m=10.0, ground_is_bare=True, surface_is_known=True, vertical_datum=None,
    )  # fmt: skip
    levels = PathLevels(
        distance_m=distance.copy(), surface_m=surface.copy(), available_m=ray, fresnel_radius_m=radius,
        bulge_m=np.array(bulges), need_m=np.array(needs),
    )  # fmt: skip
    return LinkPlan(link=link, result=result, profile=profile, levels=levels)


def shifted(at: Position, *, north_km: float, east_km: float) -> Position:
    """A position some kilometres away."""
    return Position(latitude_deg=at.latitude_deg + north_km / 111.0, longitude_deg=at.longitude_deg + east_km / 90.0)


HOSTILE = '</script><script>document.title="owned"</script>"><img src=x onerror=alert(1)> {{7*7}} \'&amp;'
HOSTILE_RTL = "\u202eمنارة الشمال\u202c ‎– مرفأ"


def make_study(raster: Path, *, at: Position, hostile: bool = False, tiles_url: str | None = None) -> StudyPlan:
    """A plan of seven links and a failure over the island in `raster`."""

    def p(north_km, east_km):
        return shifted(at, north_km=north_km, east_km=east_km)

    names = (
        (HOSTILE, HOSTILE_RTL, "W" * 300, "x\x00y\ud800z", "Ferry - Light", "Street link", "Far sea crossing")
        if hostile
        else ("Town hall - Clinic", "Over the ridge", "Woods and masts", "Quay - Mill", "Ferry - Light", "Street link",
              "Far sea crossing")
    )  # fmt: skip
    ends = ((HOSTILE, HOSTILE_RTL) if hostile else ("Town hall", "Clinic"), ("Harbour office", "North Light"))
    cranes = [(f"Crane {n}" if not hostile else HOSTILE, 0.16 + 0.06 * n, 30.0, 16.0 + n, "other") for n in range(6)]
    links = (
        make_link(names[0], p(0.2, 1.2), p(-0.9, 2.1), at=at, heights_m=(3.0, 4.0), roofs_m=(9.0, 12.0), names=ends[0],
                  trees=((0.45, 0.5, 13.0), (0.7, 0.74, 9.0))),
        make_link(names[1], p(0.0, -4.0), p(5.0, 3.0), at=at, heights_m=(20.0, 15.0), names=ends[1]),
        make_link(names[2], p(-5.5, -2.0), p(-4.5, 7.0), at=at, heights_m=(30.0, 25.0),
                  names=("West wood", HOSTILE if hostile else "East shore"),
                  trees=((0.3, 0.62, 14.0),), obstacles=tuple(cranes), basis="bare ground only"),
        make_link(names[3], p(-6.0, -6.0), p(-7.0, 6.0), at=at, heights_m=(25.0, 30.0), names=("Quay", "Mill"),
                  obstacles=(("Silo", 0.4, 40.0, 14.0, "building"),)),
        make_link(names[4], p(-8.0, -3.0), p(8.5, 5.0), at=at, heights_m=(14.0, 40.0), frequency_hz=433e6,
                  names=("Ferry", "Light"), criteria=((4 / 3, 0.6), (None, 0.3)), basis="surveyed"),
        make_link(names[5], p(-0.9, 2.1), p(-0.8, 2.4), at=at, heights_m=(4.0, 4.0), roofs_m=(12.0, None), frequency_hz=60e9,
                  names=("Clinic", "Kiosk"), samples=201),
        make_link(names[6], p(-9.0, -8.0), p(-9.5, 40.0), at=at, heights_m=(70.0, 66.0), frequency_hz=7.1e9,
                  names=("South cape", "Outer rock"), criteria=((0.7, 0.0), (4 / 3, 1.0)), samples=6001),
    )  # fmt: skip
    lost = Link(name="Gone - Nowhere", a=links[0].link.a, b=links[1].link.b, radio=Radio(frequency_hz=5.8e9))
    failure = LinkFailure(
        link=lost,
        error=TerrainGapError(
            "terrain has no data from 3.21 km to 4.07 km of 'Gone - Nowhere'",
            "raster: island.tif, which ends at 36.1042 N",
            "add a raster that covers the stretch",
        ),
    )
    study = Study(
        title=HOSTILE if hostile else "Tolmera harbour network", links=(*(item.link for item in links), lost),
        terrain=TerrainInputs(ground=(RasterSource(path=raster),)), date=dt.date(2026, 3, 14),
        planner=HOSTILE if hostile else "Planning desk", revision="B", tiles_url=tiles_url, tiles_credit="Map data <b>desk</b>",
        notes=("Site 'Quay': two decimals place it within 500 m only.",),
    )  # fmt: skip
    files = (
        InputFile(role="ground", name=raster.name, modified="2026-02-01 10:00", size=640_000, sha256="ab12" * 16),
        InputFile(role="obstacles", name="obstacles.csv", modified="2026-02-03 09:30", size=1_200, sha256="cd34" * 16),
    )
    return StudyPlan(
        study=study, links=links, failures=(failure,), files=files, version="0.1.0",
        cautions=("Obstacle heights older than a year were not checked.",),
    )  # fmt: skip
