"""What one path profile shows, prepared for drawing: levels with the Earth bulge added, decimated by keeping peaks."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fellspan.links.causes import SEA_WITHIN_M, is_sea_level
from fellspan.links.result import CriterionResult, LinkResult
from fellspan.links.words import is_two_points
from fellspan.planning.plan import LinkPlan
from fellspan.report.scales import Scale, keep_peaks
from fellspan.terrain.profile import PathProfile

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True, kw_only=True)
class Sheet:
    """Sizes of one way of drawing; widths and heights in SVG units."""

    name: str
    width: float
    plot_height: float
    axis_width: float
    dimension_width: float
    right_width: float
    font: float
    stations: int
    station_gap: float
    lanes: int
    columns: int
    roomy: bool

    @property
    def small(self) -> float:
        """Size of secondary text."""
        return self.font * 0.92

    @property
    def line_height(self) -> float:
        """Height of one line of text."""
        return self.font * 1.38

    @property
    def left(self) -> float:
        """Where the path begins."""
        return self.axis_width + self.dimension_width

    @property
    def right(self) -> float:
        """Where the path ends."""
        return self.width - self.right_width


FULL = Sheet(
    name="full", width=920, plot_height=330, axis_width=48, dimension_width=102, right_width=100, font=13,
    stations=11, station_gap=58, lanes=4, columns=640, roomy=True,
)  # fmt: skip
PANEL = Sheet(
    name="panel", width=940, plot_height=152, axis_width=48, dimension_width=102, right_width=100, font=13,
    stations=11, station_gap=58, lanes=2, columns=340, roomy=True,
)  # fmt: skip
NARROW = Sheet(
    name="narrow", width=366, plot_height=200, axis_width=32, dimension_width=58, right_width=58, font=11.5,
    stations=4, station_gap=52, lanes=3, columns=220, roomy=False,
)  # fmt: skip


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Section:
    """Arrays at the kept samples, m above sea level, Earth bulge of the governing criterion added where named `_drawn`."""

    sheet: Sheet
    plan: LinkPlan
    criterion: CriterionResult
    kept: NDArray[np.intp]
    governing: int
    distance_m: Array
    ground_drawn: Array
    surface_drawn: Array
    checked_drawn: Array
    cover_kind: NDArray[np.int8]
    sea: NDArray[np.bool_]
    """Where the surface is called the sea, by the rule that names causes."""
    bulge_m: Array
    ray_m: Array
    radius_m: Array
    doubt_m: Array | None
    """How far the surface may stand above or below as drawn, 5 to 95 % of cases; None where that cannot be seen."""
    x: Scale
    y: Scale

    @property
    def result(self) -> LinkResult:
        """The result that is drawn."""
        return self.plan.result

    @property
    def profile(self) -> PathProfile:
        """Terrain, all samples."""
        return self.plan.profile

    @property
    def other_shortfall(self) -> bool:
        """True where the greatest shortfall stands elsewhere than the governing point."""
        return is_two_points(self.criterion, length_m=self.profile.length_m)

    @property
    def level_arc_m(self) -> Array | None:
        """A level surface with the bulge, to show the curve of the Earth; None where it would look flat."""
        if float(np.max(self.bulge_m)) * self.y.px_per_unit < 4.0:
            return None
        flat = self.ground_drawn - self.bulge_m
        level = 0.0 if self.y.from_value < 0.0 <= float(flat.max()) else float(flat.min())
        return level + self.bulge_m

    @property
    def exaggeration(self) -> float:
        """How much steeper the drawing is than the land."""
        return self.y.px_per_unit / self.x.px_per_unit


_SEEN_PX = 1.5


def _doubt_m(plan: LinkPlan, sheet: Sheet, at_m: Array, y: Scale) -> Array | None:
    """Half the width of the band of clearance; on the small panels of the overview it would be in the way."""
    if plan.confidence is None or sheet is PANEL:
        return None
    known = plan.confidence.band
    half = np.array(known.middle_m) - np.array(known.low_m)
    reach = np.interp(at_m, known.distance_m, half)
    return reach if float(reach.max()) * y.px_per_unit >= _SEEN_PX else None


def nearest_index(distance_m: Array, at_m: float) -> int:
    """Index of the sample nearest to `at_m`."""
    return int(np.argmin(np.abs(distance_m - at_m)))


def prepare(plan: LinkPlan, sheet: Sheet, *, plot_top: float) -> Section:
    """Choose the samples to draw and the scales; nothing of the physics is worked out again."""
    profile, levels, result = plan.profile, plan.levels, plan.result
    criterion = result.clearance[result.governing]
    bulge = levels.bulge_m[result.governing]
    governing = nearest_index(levels.distance_m, criterion.worst_at_m)
    exact = {governing, nearest_index(levels.distance_m, criterion.shortfall_at_m), 0, levels.distance_m.size - 1}
    for obstruction in criterion.obstructions:
        for place in (obstruction.from_m, obstruction.to_m, obstruction.worst_at_m):
            exact.add(nearest_index(levels.distance_m, place))
    for obstacle in profile.obstacles:
        exact.add(nearest_index(levels.distance_m, obstacle.from_m))
        exact.add(nearest_index(levels.distance_m, obstacle.to_m))
    kept = keep_peaks(
        levels.distance_m,
        columns=sheet.columns,
        peaks=(profile.surface_m, profile.ground_m, levels.need_m[result.governing]),
        exact=tuple(sorted(exact)),
    )
    kept = kept[np.isfinite(profile.surface_m[kept]) & np.isfinite(profile.ground_m[kept])]
    sea = is_sea_level(profile) | (np.abs(profile.ground_m) <= SEA_WITHIN_M)
    ground = profile.ground_m[kept] + bulge[kept]
    surface = profile.surface_m[kept] + bulge[kept]
    zone_top = float(np.nanmax(levels.available_m + levels.fresnel_radius_m))
    high = max(float(surface.max()), zone_top, float(levels.available_m.max()))
    low = min(float(ground.min()), float(levels.available_m.min()))
    span = max(high - low, 6.0)
    low -= 0.12 * span
    high = low + 1.17 * span
    y = Scale(from_value=low, to_value=high, from_px=plot_top + sheet.plot_height, to_px=plot_top)
    return Section(
        sheet=sheet,
        plan=plan,
        criterion=criterion,
        kept=kept,
        governing=governing,
        distance_m=levels.distance_m[kept],
        ground_drawn=ground,
        surface_drawn=surface,
        checked_drawn=levels.surface_m[kept] + bulge[kept],
        cover_kind=profile.cover_kind[kept],
        sea=sea[kept],
        bulge_m=bulge[kept],
        ray_m=levels.available_m[kept],
        radius_m=levels.fresnel_radius_m[kept],
        doubt_m=_doubt_m(plan, sheet, levels.distance_m[kept], y),
        x=Scale(from_value=0.0, to_value=float(levels.distance_m[-1]), from_px=sheet.left, to_px=sheet.right),
        y=y,
    )
