"""What a raster or a folder of tiles holds, in facts for a person who decides whether to plan with it.

States what files say, measures what they do not, and marks guesses as such. Prints nothing.
"""

import itertools
import os
import warnings
from collections.abc import Iterable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from pyproj.transformer import TransformerGroup

from fellspan.errors import VerticalDatumError
from fellspan.geodesy.transforms import WGS84, transformer
from fellspan.terrain.error_model import default_error_source
from fellspan.terrain.looks import CellSurvey, Look, survey_cells
from fellspan.terrain.raster_file import RasterFile, base_name, on_plane
from fellspan.terrain.seams import Seam
from fellspan.terrain.sources import CoverSource, RasterSource
from fellspan.terrain.stack import RasterStack
from fellspan.terrain.tiles import open_source
from fellspan.terrain.units import common_datum, is_ellipsoidal, unit_name
from fellspan.terrain.zeros import ZeroHoles
from fellspan.vocabulary import RasterRole

_SLOW_STRIP_CELLS = 4096
_SLOW_BLOCK_BYTES = 16_000_000
_TEXT_DRIVERS = ("AAIGrid", "XYZ", "GRASSASCIIGrid")
_MOST_PAIRS = 40
_EDGE_POINTS = 21


@dataclass(frozen=True, slots=True, kw_only=True)
class RasterFacts:
    """One declared source: a raster, or the tiles of a folder together.

    Longitudes run on from `west_deg` to `east_deg`, which may pass 180. `unit` and `vertical_datum` are None where nobody
    states them (heights are then taken as metres). `read_percent` is how much was read for gaps, heights and look.
    """

    path: str
    name: str
    role: RasterRole
    files: int
    driver: str
    columns: int
    rows: int
    dtype: str
    blocks: str
    crs: str
    south_deg: float
    north_deg: float
    west_deg: float
    east_deg: float
    cell_x_m: float
    cell_y_m: float
    unit: str | None
    vertical_datum: str | None
    read_percent: float
    gap_percent: float
    lowest_m: float | None
    highest_m: float | None
    error_m: float
    error_source: str
    looks_like: Look
    abrupt_percent: float | None
    slow_because: str | None
    remedy: str | None
    cautions: tuple[str, ...]


def inspect_raster(source: RasterSource | CoverSource) -> RasterFacts:
    """The facts of one source; its cells are read in part only where it is large.

    Raises
    ------
    RasterError
        It cannot serve as heights; the message says why and what helps.
    VerticalDatumError
        Tiles of a folder state different vertical datums.
    """
    role: RasterRole = "cover" if isinstance(source, CoverSource) else source.role
    files = open_source(source, role=role)
    survey = survey_cells(files)
    finest = min(files, key=lambda file: file.cell_m)
    edges = [_edge(file) for file in files]
    west, east = _longitudes(edges)
    slow, remedy = _slowness(finest, single=len(files) == 1)
    units = {unit_name(file.unit_m) if file.unit_is_stated else None for file in files}
    return RasterFacts(
        path=os.fspath(source.path),
        name=base_name(os.fspath(source.path)),
        role=role,
        files=len(files),
        driver=_one_or_many(file.driver for file in files),
        columns=finest.width,
        rows=finest.height,
        dtype=_one_or_many(file.dtype for file in files),
        blocks=f"{finest.block_width} x {finest.block_height}",
        crs=_one_or_many(file.crs_name for file in files),
        south_deg=min(float(lat.min()) for lat, _ in edges),
        north_deg=max(float(lat.max()) for lat, _ in edges),
        west_deg=west,
        east_deg=east,
        cell_x_m=finest.cell_x_m,
        cell_y_m=finest.cell_y_m,
        unit=None if units == {None} else " or ".join(sorted(unit or "not stated" for unit in units)),
        vertical_datum=common_datum({file.name: file.vertical_datum for file in files}),
        read_percent=100.0 * survey.read_share,
        gap_percent=100.0 * survey.gap_share,
        lowest_m=survey.low_m,
        highest_m=survey.high_m,
        error_m=max(file.sigma_m for file in files),
        error_source="as declared" if finest.sigma_is_stated else default_error_source(finest.cell_m, role),
        looks_like=survey.looks_like(finest.cell_m) if role != "cover" else "unclear",
        abrupt_percent=None if survey.abrupt_share is None else 100.0 * survey.abrupt_share,
        slow_because=slow,
        remedy=remedy,
        cautions=tuple(_cautions(files, survey, finest, role)),
    )


def inspect_seams(sources: Sequence[RasterSource | CoverSource], *, role: RasterRole) -> tuple[Seam, ...]:
    """The steps between overlapping rasters, each pair compared at up to 25 places of what they share.

    Raises
    ------
    RasterError, VerticalDatumError
        As `RasterStack.open`.
    """
    stack = RasterStack.open(sources, role=role)
    try:
        boxes = [_box(_edge(file)) for file in stack.files]
        shared = []
        for one, other in itertools.combinations(boxes, 2):
            turn = 360.0 * round((one[2] - other[2]) / 360.0)
            south, north = max(one[0], other[0]), min(one[1], other[1])
            west, east = max(one[2], other[2] + turn), min(one[3], other[3] + turn)
            if south < north and west < east:
                shared.append((south, north, west, east))
        points: list[tuple[NDArray[np.float64], NDArray[np.float64]]] = []
        for i in np.unique(np.linspace(0, len(shared) - 1, min(len(shared), _MOST_PAIRS)).astype(int)):
            south, north, west, east = shared[i]
            at = np.linspace(0.1, 0.9, 5)
            lat, lon = np.meshgrid(south + at * (north - south), west + at * (east - west))
            points.append((lat.ravel(), lon.ravel()))
        if not points:
            return ()
        return stack.seams_at(np.concatenate([lat for lat, _ in points]), np.concatenate([lon for _, lon in points]))
    finally:
        stack.close()


def datum_conflict(facts: Sequence[RasterFacts]) -> VerticalDatumError | None:
    """The error that planning with these sources together would raise for their vertical datums, if any."""
    try:
        common_datum({fact.name: fact.vertical_datum for fact in facts})
    except VerticalDatumError as error:
        return error
    return None


def _edge(file: RasterFile) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Latitudes and longitudes along the outline, the latter running on without jumps."""
    along = np.linspace(0.0, 1.0, _EDGE_POINTS)
    first, last = np.zeros(_EDGE_POINTS), np.ones(_EDGE_POINTS)
    columns = np.concatenate((along, last, along[::-1], first)) * file.width
    rows = np.concatenate((first, along, last, along[::-1])) * file.height
    x, y = on_plane(file.transform, columns, rows)
    lon, lat = (np.asarray(v) for v in transformer(file.crs_text, WGS84).transform(x, y))
    known = np.isfinite(lon) & np.isfinite(lat)
    if not known.any():
        return np.array([-90.0, 90.0]), np.array([-180.0, 180.0])
    if file.period is not None and file.bounds[2] - file.bounds[0] > 0.9 * file.period:
        return lat[known], np.array([file.bounds[0], file.bounds[2]]) * (360.0 / file.period)
    return lat[known], np.unwrap(lon[known], period=360.0)


def _box(edge: tuple[NDArray[np.float64], NDArray[np.float64]]) -> tuple[float, float, float, float]:
    lat, lon = edge
    return float(lat.min()), float(lat.max()), float(lon.min()), float(lon.max())


def _longitudes(edges: Sequence[tuple[NDArray[np.float64], NDArray[np.float64]]]) -> tuple[float, float]:
    """West and east of all outlines, each turned to lie next to the first."""
    middle = float(edges[0][1].mean())
    turned = [lon + 360.0 * np.round((middle - lon.mean()) / 360.0) for _, lon in edges]
    west, east = min(float(lon.min()) for lon in turned), max(float(lon.max()) for lon in turned)
    turn = 360.0 * np.floor((west + 180.0) / 360.0)
    return float(west - turn), float(east - turn)


def _slowness(file: RasterFile, *, single: bool) -> tuple[str | None, str | None]:
    """Why reading a path would be slow, and what helps."""
    block_bytes = file.block_width * file.block_height * np.dtype(file.dtype).itemsize
    if file.driver in _TEXT_DRIVERS and file.width * file.height > _SLOW_STRIP_CELLS**2 / 4:
        why = "a text format must be read from its start to each row"
    elif file.block_width >= file.width > _SLOW_STRIP_CELLS:
        why = f"cut into strips of {file.block_height} x {file.width} cells, so that a path reads most of the file"
    elif block_bytes > _SLOW_BLOCK_BYTES:
        why = f"cut into blocks of {block_bytes / 1e6:.0f} MB, each read whole"
    else:
        return None, None
    name = file.name if single else "TILE"
    return (
        why,
        f"gdal_translate -co TILED=YES -co COMPRESS=DEFLATE -co PREDICTOR=YES -co BIGTIFF=IF_SAFER {name} OUT.tif",
    )


def _cautions(files: Sequence[RasterFile], survey: CellSurvey, finest: RasterFile, role: RasterRole) -> list[str]:
    found = []
    if any(not file.unit_is_stated for file in files):
        found.append("vertical unit not stated: taken as metres; if it is feet, declare unit = 'ft'")
    if role != "cover" and any(file.vertical_datum is None for file in files):
        found.append("vertical datum not stated: heights are taken as above sea level; declare datum if you know it")
    if any(is_ellipsoidal(file.vertical_datum) for file in files):
        found.append("heights are above the ellipsoid, not above sea level: they differ by up to about 100 m")
    if len({file.unit_m for file in files}) > 1:
        found.append("tiles count heights in different units; each is converted by what it states")
    shift = _shift_caution(finest)
    if shift is not None:
        found.append(shift)
    if survey.gap_share > 0.0:
        found.append("it has gaps: a path over one is refused unless another raster fills it or the study calls it sea")
    if role != "cover" and survey.zeros.holes:
        found.append(_zero_caution(survey.zeros))
    if any(file.nodata is None and not file.has_mask for file in files):
        found.append("no nodata value is declared: -9999, -32767, -32768 and impossible heights are taken for gaps")
    if role == "ground" and survey.looks_like(finest.cell_m) == "surface model":
        found.append(
            "declared as bare ground, yet it looks like a surface model: roofs and trees would pass for ground"
        )
    if role == "surface" and survey.looks_like(finest.cell_m) == "bare ground":
        found.append("declared as a surface model, yet it looks like bare ground: roofs and trees may be missing")
    return found


def _zero_caution(zeros: ZeroHoles) -> str:
    where = "one hole" if zeros.holes == 1 else f"{zeros.holes} holes"
    return (
        f"{zeros.cells} cells of exactly 0 lie in {where} amid land of {zeros.rim_m:.0f} m or higher: no sea, but gaps filled "
        "with 0? A path over them would read clear; make them gaps (nodata)"
    )


def _shift_caution(file: RasterFile) -> str | None:
    """How well the horizontal datum is tied to WGS 84, where that matters for cells of this size."""
    with warnings.catch_warnings():
        # PROJ's word that a better grid exists comes as a warning; the figure below says what that means
        warnings.simplefilter("ignore", UserWarning)
        ways = TransformerGroup(WGS84, file.crs_text, always_xy=True)
    accuracy_m = ways.transformers[0].accuracy if ways.transformers else -1.0
    if accuracy_m < 0.0:
        return "how its horizontal datum lies to WGS 84 is not known: everything may be shifted sideways; check a known spot"
    if accuracy_m <= max(1.0, file.cell_m / 2.0):
        return None
    return f"its horizontal datum is tied to WGS 84 to about {accuracy_m:g} m only: check a known spot"


def _one_or_many(texts: Iterable[str]) -> str:
    different = sorted(set(texts))
    return different[0] if len(different) == 1 else f"{different[0]} and {len(different) - 1} more"
