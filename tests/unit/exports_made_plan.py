"""A small plan made by hand, so that the exports are tested without rasters or physics; the numbers are invented."""

import datetime as dt
from typing import Any

import numpy as np

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

COUNT, LENGTH_M, WORST = 101, 4_000.0, 40


def made_criterion(index: int, cause: str, position: tuple[float, float]) -> CriterionResult:
    return CriterionResult(
        criterion=f"rule {index}",
        k=(4.0 / 3.0, 0.6)[index],
        required_fraction=(1.0, 0.3)[index],
        met=False,
        worst_fraction=0.25,
        worst_at_m=1_600.0,
        clearance_m=1.5,
        required_m=6.0,
        fresnel_radius_m=6.0,
        surface_m=30.0,
        bulge_m=0.3,
        available_m=31.8,
        latitude_deg=position[0],
        longitude_deg=position[1],
        shortfall_m=4.5,
        shortfall_at_m=1_600.0,
        cause=cause,
        extra_height_m=ExtraHeight(a=7.5, b=None, both=4.5),
        probability=0.04,
        obstructions=(
            Obstruction(
                from_m=1_500.0,
                to_m=1_720.0,
                worst_at_m=1_600.0,
                shortfall_m=4.5,
                cause=cause,
                cuts_sight=False,
                measured=False,
            ),
        ),
        source="Rec. ITU-R P.530-19",
    )


def made_link(
    *,
    name: str = "Quay - Tower",
    a: str = "Quay",
    b: str = "Tower",
    cause: str = "lime tree",
    longitude_deg: float = -45.2,
) -> LinkPlan:
    share = np.linspace(0.0, 1.0, COUNT)
    distance = share * LENGTH_M
    latitude = 36.05 + share * 0.01
    longitude = (longitude_deg + share * 0.0427 + 180.0) % 360.0 - 180.0
    ground, cover = np.full(COUNT, 8.0), np.zeros(COUNT)
    cover[WORST] = 22.0
    kind, which = np.zeros(COUNT, dtype=np.int8), np.full(COUNT, -1, dtype=np.int32)
    kind[WORST], which[WORST] = 2, 0
    profile = PathProfile(
        a=Position(latitude_deg=36.05, longitude_deg=longitude_deg),
        b=Position(latitude_deg=float(latitude[-1]), longitude_deg=float(longitude[-1])),
        distance_m=distance,
        latitude_deg=latitude,
        longitude_deg=longitude,
        ground_m=ground,
        cover_m=cover,
        cover_kind=kind,
        obstacle_index=which,
        surface_m=ground + cover,
        source=np.zeros(COUNT, dtype=np.int16),
        measured=np.zeros(COUNT, dtype=np.int8),
        sigma_m=np.full(COUNT, 1.5),
        sources=("ground.tif",),
        obstacles=(
            PathObstacle(
                name=cause, kind="tree", from_m=1590.0, to_m=1610.0, top_amsl_m=30.0, height_m=22.0, source="trees.csv"
            ),
        ),
        gaps=(),
        step_m=40.0,
        cell_m=10.0,
        ground_is_bare=True,
        surface_is_known=False,
        vertical_datum="EGM2008",
    )
    fresnel = 12.0 * np.sqrt(share * (1.0 - share))
    bulge = np.stack([distance * (LENGTH_M - distance) / (2.0 * k * 6371e3) for k in (4.0 / 3.0, 0.6)])
    levels = PathLevels(
        distance_m=distance.copy(),
        surface_m=ground + cover,
        available_m=28.0 + share * 9.5,
        fresnel_radius_m=fresnel,
        bulge_m=bulge,
        need_m=(ground + cover) + bulge + np.array([[1.0], [0.3]]) * fresnel,
    )
    spot = (float(latitude[WORST]), float(longitude[WORST]))
    end: dict[str, Any] = {"roof_m": None, "antenna_agl_m": 20.0, "declination_deg": -12.5}
    result = LinkResult(
        name=name,
        a=a,
        b=b,
        verdict="marginal",
        signal_verdict="meets",
        basis="bare ground only",
        confidence=0.04,
        confidence_asked=0.9,
        reasons=(f"Marginal: {cause} is in the way.", "Raise A by 7.5 m."),
        cautions=("nothing was measured",),
        distance_m=LENGTH_M,
        bearing_ab_deg=73.9,
        bearing_ba_deg=253.9,
        tilt_ab_deg=0.12,
        tilt_ba_deg=-0.16,
        frequency_hz=5.8e9,
        polarization="vertical",
        median_k=4.0 / 3.0,
        ends=Ends(
            a=EndResult(
                site=a,
                latitude_deg=36.05,
                longitude_deg=longitude_deg,
                ground_m=8.0,
                antenna_amsl_m=28.0,
                height_as_given="20 m above ground",
                magnetic_bearing_deg=86.4,
                **end,
            ),
            b=EndResult(
                site=b,
                latitude_deg=float(latitude[-1]),
                longitude_deg=float(longitude[-1]),
                ground_m=17.5,
                antenna_amsl_m=37.5,
                height_as_given="20 m above ground",
                magnetic_bearing_deg=None,
                **end,
            ),
        ),
        clearance=(made_criterion(0, cause, spot), made_criterion(1, cause, spot)),
        governing=0,
        ignored=(Ignored(end="A", from_m=0.0, to_m=4.0, height_m=9.0, what="own roof"),),
        losses_db=Losses(free_space=119.8, diffraction=2.1),
        received_dbm=AtEnds(at_a=-55.0, at_b=-55.0),
        margin_db=AtEnds(at_a=17.0, at_b=17.0),
        wanted_margin_db=10.0,
        magnetic_model=None,
        step_m=40.0,
        sources=("ground.tif",),
        vertical_datum="EGM2008",
    )
    return LinkPlan(link=_link(name, a, b, longitude_deg), result=result, profile=profile, levels=levels)


def _link(name: str, a: str, b: str, longitude_deg: float = -45.2) -> Link:
    sites = [
        Site(
            name=site, position=Position(latitude_deg=36.05 + shift, longitude_deg=longitude_deg + shift), height_m=20.0
        )
        for site, shift in ((a, 0.0), (b, 0.01))
    ]
    return Link(name=name, a=sites[0], b=sites[1], radio=Radio(frequency_hz=5.8e9))


def made_plan(*links: LinkPlan, title: str = "Harbour study", failed: str = "Quay - Reef") -> StudyPlan:
    failure = LinkFailure(
        link=_link(failed, "Quay", "Reef"),
        error=TerrainGapError("terrain has no data from 3.21 km to 4.00 km", "raster: ground.tif", "add a raster"),
    )
    planned = links or (made_link(),)
    return StudyPlan(
        study=Study(
            title=title,
            links=tuple(one.link for one in planned),
            terrain=TerrainInputs(),
            date=dt.date(2026, 5, 1),
            planner="A. Planner",
            revision="B",
        ),
        links=planned,
        failures=(failure,),
        files=(
            InputFile(
                role="ground", name="ground.tif", modified="2026-04-01T12:00:00+00:00", size=1234, sha256="0" * 64
            ),
        ),
        version="0.1.0",
        cautions=("vertical datum of ground.tif is not stated",),
    )
