"""A look into the cells of rasters: gaps, range of heights, and whether roofs and crowns seem to be in them.

Reads whole small rasters and a grid of windows of large ones. What it says of surface or bare ground is a guess.
"""

import math
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from typing import Final, Literal

import numpy as np
from numpy.typing import NDArray

from fellspan.terrain.blocks import window_heights
from fellspan.terrain.handles import gdal, open_dataset
from fellspan.terrain.raster_file import RasterFile
from fellspan.terrain.zeros import ZeroHoles, zero_holes

Look = Literal["surface model", "bare ground", "unclear"]

_WHOLE_CELLS = 8_000_000
_TILE_CELLS = 1024
_WINDOW_CELLS = 96
_WINDOWS_EACH_WAY = 8
_MOST_FILES = 16

_COARSEST_M: Final = 12.0
"""Coarser cells blur houses and trees into the ground: nothing to see."""
_ABRUPT_SLOPE: Final = 0.8
_ABRUPT_M: Final = 1.5
"""A cell is abrupt where the slope changes by more than 0.8 (39 degrees from level) and the kink is over 1.5 m high."""
_SURFACE_SHARE, _GROUND_SHARE = 0.01, 0.002
"""More abrupt cells than 1 % look like roofs and crowns, fewer than 0.2 % like bare ground; our own judgement, no source."""


@dataclass(frozen=True, slots=True, kw_only=True)
class CellSurvey:
    """What was seen in the cells that were read; heights are None where all of these are gaps."""

    read_share: float
    gap_share: float
    low_m: float | None
    high_m: float | None
    abrupt_share: float | None
    zeros: ZeroHoles

    def looks_like(self, cell_m: float) -> Look:
        """A guess from the share of abrupt cells; 'unclear' for coarse cells and level ground."""
        if self.abrupt_share is None or self.low_m is None or self.high_m is None:
            return "unclear"
        if cell_m > _COARSEST_M or self.high_m - self.low_m < 2.0:
            return "unclear"
        if self.abrupt_share > _SURFACE_SHARE:
            return "surface model"
        return "bare ground" if self.abrupt_share < _GROUND_SHARE else "unclear"


def survey_cells(files: Sequence[RasterFile]) -> CellSurvey:
    """Read some cells of each of some files.

    Raises
    ------
    RasterError
        A block cannot be read.
    """
    chosen = [files[i] for i in np.unique(np.linspace(0, len(files) - 1, min(len(files), _MOST_FILES)).astype(int))]
    cells = gaps = abrupt = judged = 0
    low, high = math.inf, -math.inf
    zeros = ZeroHoles()
    for file in chosen:
        for heights in _windows(file, each_way=max(1, round(_WINDOWS_EACH_WAY / math.sqrt(len(chosen))))):
            known = np.isfinite(heights)
            cells += heights.size
            gaps += heights.size - int(known.sum())
            zeros += zero_holes(heights)
            if known.any():
                low, high = min(low, float(np.nanmin(heights))), max(high, float(np.nanmax(heights)))
            for kinks, cell in ((_kinks(heights), file.cell_x_m), (_kinks(heights.T), file.cell_y_m)):
                judged += kinks.size
                abrupt += int((kinks > max(_ABRUPT_SLOPE * cell, _ABRUPT_M, 2.5 * _grain_m(file))).sum())
    return CellSurvey(
        read_share=cells / sum(file.width * file.height for file in files),
        gap_share=gaps / cells,
        low_m=low if gaps < cells else None,
        high_m=high if gaps < cells else None,
        abrupt_share=abrupt / judged if judged else None,
        zeros=zeros,
    )


def _windows(file: RasterFile, *, each_way: int) -> Iterator[NDArray[np.float64]]:
    whole = file.width * file.height <= _WHOLE_CELLS
    side = _TILE_CELLS if whole else _WINDOW_CELLS
    columns, rows = (
        range(0, length, side)
        if whole
        else np.unique(np.linspace(0, max(length - side, 0), each_way + 2)[1:-1].astype(int)).tolist()
        for length in (file.width, file.height)
    )
    with gdal(), open_dataset(file.path, file.name) as dataset:
        for row in rows:
            for column in columns:
                width, height = min(side, file.width - column), min(side, file.height - row)
                yield window_heights(dataset, file, column=column, row=row, width=width, height=height)


def _kinks(heights: NDArray[np.float64]) -> NDArray[np.float64]:
    """How far each cell stands off the line through its neighbours along a row, twice, m; gaps left out."""
    kinks = np.abs(heights[:, :-2] - 2.0 * heights[:, 1:-1] + heights[:, 2:])
    return np.asarray(kinks[np.isfinite(kinks)])


def _grain_m(file: RasterFile) -> float:
    """The smallest step that the cells can express, m: whole numbers make stairs that are no walls."""
    return 0.0 if np.dtype(file.dtype).kind == "f" else abs(file.scale) * file.unit_m
