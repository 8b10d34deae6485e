"""Files for runs over pairs: a study with a small raster, hubs with sectors, places around them; in open ocean, invented."""

import os
import subprocess
import sys
from pathlib import Path

import numpy as np
import rasterio
from rasterio.transform import Affine

HERE = Path(__file__).resolve().parent
OUTPUTS = ("candidates.csv", "candidates.geojson", "best.csv", "best.geojson", "summary.json", "index.html")

STUDY = """
[study]
title = "Trial run"
date = 2026-05-01

[terrain]
ground = "ground.tif"

[criteria]
preset = "sixty-percent"

[[radio]]
name = "radio"
frequency = "5.8 GHz"
power = "20 dBm"
threshold = "-75 dBm"

[[antenna]]
name = "dish"
gain = "25 dBi"

[candidates]
antenna_place = "dish"
"""

HUBS = """name,latitude,longitude,height,sector,gain,azimuth_width,elevation_width,front_to_back,bearing
North,36.08500,-45.26000,25 m above ground,,14 dBi,90,7,25 dB,180
South,36.06500,-45.25500,25 m above ground,east,14 dBi,90,7,25 dB,90
South,36.06500,-45.25500,25 m above ground,west,14 dBi,90,7,25 dB,270
"""


def write_ground(path: Path) -> None:
    """A plain at 10 m with a ridge of 30 m across it."""
    heights = np.full((250, 250), 10.0, dtype=np.float32)
    heights[:, 150:155] = 40.0
    profile = {
        "driver": "GTiff", "height": 250, "width": 250, "count": 1, "dtype": "float32", "crs": "EPSG:32623+3855",
        "transform": Affine(20.0, 0.0, 474_000.0, 0.0, -20.0, 3_996_000.0), "nodata": -9999.0,
    }  # fmt: skip
    with rasterio.open(path, "w", **profile) as raster:
        raster.write(heights, 1)


def places_text(count: int, *, seed: int = 7) -> str:
    """Places on the raster, names in an order that is not theirs."""
    rng = np.random.default_rng(seed)
    latitude, longitude = rng.uniform(36.0665, 36.0975, count), rng.uniform(-45.2835, -45.2365, count)
    number = rng.permutation(count)
    rows = [
        f"place {n:05d},{y:.6f},{x:.6f},6 m above ground\n" for n, y, x in zip(number, latitude, longitude, strict=True)
    ]
    return "name,latitude,longitude,height\n" + "".join(rows)


def write_inputs(folder: Path, *, places: int = 40) -> Path:
    """Study, raster, hubs and places in a folder."""
    folder.mkdir(parents=True, exist_ok=True)
    write_ground(folder / "ground.tif")
    (folder / "study.toml").write_text(STUDY, encoding="utf-8")
    (folder / "hubs.csv").write_text(HUBS, encoding="utf-8")
    (folder / "places.csv").write_text(places_text(places), encoding="utf-8")
    return folder


def arguments(out: str = "out", *more: str) -> list[str]:
    """The command line of a run over the inputs of `write_inputs`."""
    return [
        "candidates", "study.toml", "--hubs", "hubs.csv", "--places", "places.csv", "--out", out, *more,
    ]  # fmt: skip


def command(*words: str, fake: bool) -> list[str]:
    """The command in a process of its own, with the real engine or the fake one."""
    code = "import fake_engine; fake_engine.install(); " if fake else ""
    return [sys.executable, "-c", f"{code}from fellspan.cli.main import main; main()", *words]


def environment(**more: str) -> dict[str, str]:
    """The environment of such a process."""
    return {**os.environ, "PYTHONPATH": str(HERE), "PYTHONWARNINGS": "error", **more}


def run_here(folder: Path, *words: str, fake: bool = True, **more: str) -> subprocess.CompletedProcess[str]:
    """Run it to its end."""
    return subprocess.run(
        command(*words, fake=fake),
        cwd=folder,
        env=environment(**more),
        stdin=subprocess.DEVNULL,
        capture_output=True,
        text=True,
        timeout=250,
        check=False,
    )


def outputs(folder: Path) -> dict[str, bytes]:
    """The files of a finished run."""
    return {name: (folder / name).read_bytes() for name in OUTPUTS}
