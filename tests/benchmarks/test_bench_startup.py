"""How long `fellspan --help` takes beside a bare `import typer`: what a person waits for before anything happens."""

import statistics
import subprocess
import sys
import time

import pytest

RUNS = 15


def seconds(code: str) -> float:
    start = time.perf_counter()
    subprocess.run([sys.executable, "-c", code], check=True, capture_output=True, timeout=60)
    return time.perf_counter() - start


@pytest.mark.bench
def test_help_takes_little_more_than_importing_typer() -> None:
    bare, with_help = (
        "import typer",
        "from fellspan.cli.main import main; import sys; sys.argv = ['fellspan', '--help']; main()",
    )
    pairs = [(seconds(bare), seconds(with_help)) for _ in range(RUNS + 1)][1:]  # the first fills the disk cache
    bare_s, help_s = (statistics.median(times) for times in zip(*pairs, strict=True))
    print(f"import typer {bare_s * 1000:.0f} ms, fellspan --help {help_s * 1000:.0f} ms: {help_s / bare_s:.2f}")
    assert help_s < 1.5 * bare_s
