"""A raster far larger than memory: a 56 km diagonal over 40 000 x 40 000 cells of 1 m, in a process of its own.

Time is judged as a ratio to reading the same blocks with rasterio alone, imports included, measured in the same run;
absolute figures are printed (pytest -s).
"""

import json
import statistics
import subprocess
import sys
from pathlib import Path

import numpy as np
import pytest
import rasterio
import rasterio.warp
from affine import Affine
from rasterio.windows import Window

from fellspan.geodesy.geodesic import GeodesicPath
from fellspan.geodesy.position import Position

SIDE, BLOCK = 40_000, 512
TRANSFORM = Affine(1.0, 0.0, 460_000.0, 0.0, -1.0, 4_010_000.0)
A = Position(latitude_deg=36.234, longitude_deg=-45.443)
B = Position(latitude_deg=35.876, longitude_deg=-45.001)

PEAK_LIMIT_MB = 250.0
TIME_LIMIT_RATIO = 1.5

ENGINE = """
import sys
import numpy as np
from fellspan.geodesy.geodesic import GeodesicPath
from fellspan.geodesy.position import Position
from fellspan.terrain.sources import RasterSource
from fellspan.terrain.stack import RasterStack
stack = RasterStack.open([RasterSource(path=sys.argv[1])], role="ground")
a, b = (Position(latitude_deg=float(sys.argv[i]), longitude_deg=float(sys.argv[i + 1])) for i in (2, 4))
path = GeodesicPath.between(a, b)
got = stack.sample(path, np.arange(0.0, path.length_m, 0.5))
answer = {"samples": got.value_m.size, "gaps": int((got.source < 0).sum()), "scipy": "scipy" in sys.modules}
answer["mean"] = float(got.value_m.mean())
"""
BARE = """
import sys
import numpy, pyproj, rasterio
from rasterio.windows import Window
answer = {}
with rasterio.open(sys.argv[1]) as dataset:
    for block in json.loads(sys.stdin.read()):
        dataset.read(1, window=Window(*block))
"""
# ru_maxrss would carry over the peak of the parent that forked; VmHWM is this program's own
MEASURED = """
import json, time
begun = time.perf_counter()
{body}
answer["seconds"] = time.perf_counter() - begun
answer["peak_mb"] = next(int(line.split()[1]) for line in open("/proc/self/status") if line.startswith("VmHWM")) / 1024
print(json.dumps(answer))
"""


def path_blocks() -> list[tuple[int, int]]:
    """Blocks (column, row) that the path crosses or touches."""
    line = GeodesicPath.between(A, B)
    latitude, longitude = line.positions(np.arange(0.0, line.length_m, 5.0))
    x, y = rasterio.warp.transform("EPSG:4326", "EPSG:32623", longitude, latitude)
    column, row = ~TRANSFORM @ (np.array(x), np.array(y))
    assert column.min() > 0
    assert max(column.max(), row.max()) < SIDE
    found = {
        (int(c), int(r))
        for dc in (-6, 6)
        for dr in (-6, 6)
        for c, r in zip((column + dc) // BLOCK, (row + dr) // BLOCK, strict=True)
    }
    return sorted(found)


def make_raster(path: Path) -> Path:
    """Write only the blocks along the diagonal; the rest of the file is sparse."""
    rng = np.random.default_rng(8)
    hills = rng.normal(0.0, 0.3, (BLOCK, BLOCK)).cumsum(axis=0).astype(np.float32)
    profile = {"driver": "GTiff", "count": 1, "dtype": "float32", "crs": "EPSG:32623", "transform": TRANSFORM}
    layout = {"tiled": True, "blockxsize": BLOCK, "blockysize": BLOCK, "compress": "deflate", "SPARSE_OK": True}
    with rasterio.open(path, "w", height=SIDE, width=SIDE, nodata=-9999.0, **profile, **layout) as dataset:
        for column, row in path_blocks():
            wide, high = min(BLOCK, SIDE - column * BLOCK), min(BLOCK, SIDE - row * BLOCK)
            cells = np.round(300.0 + hills[:high, :wide] + column, 2)
            dataset.write(cells, 1, window=Window(column * BLOCK, row * BLOCK, wide, high))
    return path


def run(body: str, *arguments: str, given: str = "") -> dict[str, float]:
    done = subprocess.run(
        [sys.executable, "-c", MEASURED.format(body=body), *arguments],
        input=given,
        capture_output=True,
        text=True,
        check=True,
    )
    return dict(json.loads(done.stdout))


@pytest.mark.bench
@pytest.mark.skipif(not Path("/proc/self/status").exists(), reason="peak memory is read from /proc")
def test_a_diagonal_over_a_huge_raster_is_cheap(tmp_path: Path) -> None:
    raster = str(make_raster(tmp_path / "big.tif"))
    ends = [str(v) for p in (A, B) for v in (p.latitude_deg, p.longitude_deg)]
    blocks = json.dumps([[c * BLOCK, r * BLOCK, BLOCK, BLOCK] for c, r in path_blocks()])
    ours, bare = [], []
    for _ in range(5):
        ours.append(run(ENGINE, raster, *ends))
        bare.append(run(BARE, raster, given=blocks))
    seconds, bare_seconds = (statistics.median(r["seconds"] for r in runs) for runs in (ours, bare))
    peak = max(r["peak_mb"] for r in ours)
    print(
        f"\n56 km at 0.5 m: {ours[0]['samples']} samples, {seconds:.2f} s, peak {peak:.0f} MB; "
        f"rasterio alone {bare_seconds:.2f} s; {len(path_blocks())} blocks"
    )
    assert ours[0]["samples"] > 110_000
    assert ours[0]["gaps"] == 0
    assert not ours[0]["scipy"]
    assert peak < PEAK_LIMIT_MB
    assert seconds < TIME_LIMIT_RATIO * bare_seconds
