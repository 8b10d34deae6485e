"""Small rasters, studies and runs of the real command for the command-line tests; in open ocean, invented."""

import os
import re
import subprocess
import sys
from pathlib import Path

import numpy as np
import rasterio
from numpy.typing import NDArray
from rasterio.transform import Affine

WEST, NORTH = 474_000.0, 3_997_000.0
CELL_M = 20.0
A, B = "36.09000 N, 45.28000 W", "36.09000 N, 45.25000 W"
"""Two places on the raster, some 2.7 km apart, ten metres above the sea."""

STUDY = """
[study]
title = "Trial"
date = 2026-05-01

[terrain]
ground = "ground.tif"

[criteria]
preset = "sixty-percent"

[[site]]
name = "West"
at = "36.09000 N, 45.28000 W"
height = "30 m above ground"

[[site]]
name = "East"
at = "36.09000 N, 45.25000 W"
height = "30 m above ground"

[[radio]]
name = "radio"
frequency = "5.8 GHz"
power = "20 dBm"
threshold = "-75 dBm"

[[antenna]]
name = "dish"
gain = "25 dBi"

[[link]]
name = "West - East"
a = "West"
b = "East"
radio = "radio"
antenna = "dish"
"""


def write_ground(path: Path, *, hill_m: float = 0.0, crs: str | None = "EPSG:32623+3855", hole: bool = False) -> Path:
    """A plain at 10 m with a ridge across its middle and, if wanted, a hole there."""
    heights: NDArray[np.float32] = np.full((200, 300), 10.0, dtype=np.float32)
    heights[:, 105:125] += hill_m
    if hole:
        heights[:, 105:125] = -9999.0
    profile = {
        "driver": "GTiff", "height": 200, "width": 300, "count": 1, "dtype": "float32", "crs": crs,
        "transform": Affine(CELL_M, 0.0, WEST, 0.0, -CELL_M, NORTH), "nodata": -9999.0,
    }  # fmt: skip
    with rasterio.open(path, "w", **profile) as raster:
        raster.write(heights, 1)
    return path


def write_study(folder: Path, text: str = STUDY, *, hill_m: float = 0.0) -> Path:
    """A study file with its raster."""
    write_ground(folder / "ground.tif", hill_m=hill_m)
    path = folder / "trial.toml"
    path.write_text(text, encoding="utf-8")
    return path


def unwrapped(message: str) -> str:
    """A message of the terminal as it was before its lines were broken: what runs on stands four blanks in."""
    return re.sub(r"\n {4}(?=\S)", " ", message)


def run_command(*arguments: str, folder: Path, env: dict[str, str] | None = None) -> subprocess.CompletedProcess[str]:
    """Run the real command in a pipe, with nothing on its standard input."""
    return subprocess.run(
        [sys.executable, "-c", "from fellspan.cli.main import main; main()", *arguments],
        cwd=folder,
        env={**os.environ, "PYTHONWARNINGS": "error", **(env or {})},
        stdin=subprocess.DEVNULL,
        capture_output=True,
        text=True,
        timeout=60,
        check=False,
    )
