"""What a long run costs beside the engine: memory that does not grow with the pairs, and time in proportion to them."""

import json
import subprocess
from pathlib import Path

import made_runs
import numpy as np
import pytest

MEASURED = """
import fake_engine, json, resource, sys, time
fake_engine.install()
from fellspan.cli.main import run
began = time.perf_counter()
code = run(sys.argv[1:])
peak = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024
print(json.dumps({"code": code, "peak_mb": peak, "seconds": time.perf_counter() - began}), file=sys.stderr)
"""
PLACES = 1000


def measured(folder: Path, hubs: int) -> dict[str, float]:
    """Peak memory and time of a run of `hubs` times a thousand pairs in a process of its own."""
    rng = np.random.default_rng(5)
    latitude, longitude = rng.uniform(36.0665, 36.0975, hubs), rng.uniform(-45.2835, -45.2365, hubs)
    rows = [
        f"hub {n:04d},{y:.6f},{x:.6f},25 m above ground\n"
        for n, (y, x) in enumerate(zip(latitude, longitude, strict=True))
    ]
    (folder / "hubs.csv").write_text("name,latitude,longitude,height\n" + "".join(rows), encoding="utf-8")
    words = made_runs.arguments(f"out{hubs}")
    done = subprocess.run(
        [*made_runs.command(fake=True)[:2], MEASURED, *words],
        cwd=folder, env=made_runs.environment(), capture_output=True, text=True, check=False, timeout=280,
    )  # fmt: skip
    found = json.loads(done.stderr.splitlines()[-1])
    assert found["code"] == 0, done.stderr
    assert json.loads((folder / f"out{hubs}" / "summary.json").read_text(encoding="utf-8"))["pairs"] == hubs * PLACES
    return dict(found)


@pytest.mark.bench
@pytest.mark.timeout(600)
def test_memory_is_bounded_and_time_is_linear_in_pairs(tmp_path: Path) -> None:
    made_runs.write_inputs(tmp_path, places=PLACES)
    small, large = measured(tmp_path, 20), measured(tmp_path, 200)
    per_pair_us = [1e6 * found["seconds"] / (hubs * PLACES) for found, hubs in ((small, 20), (large, 200))]
    print(
        f"20 000 pairs: {small['peak_mb']:.0f} MB, {small['seconds']:.1f} s; "
        f"200 000 pairs: {large['peak_mb']:.0f} MB, {large['seconds']:.1f} s; {per_pair_us[1]:.0f} us a pair beside the engine"
    )
    # SQLite's cache (64 MB) fills once; nothing else may grow with the pairs
    assert large["peak_mb"] - small["peak_mb"] < 120.0
    assert per_pair_us[1] < 1.5 * per_pair_us[0]
