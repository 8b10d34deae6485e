"""The compiled loops as plain Python, so that coverage and debuggers see them, and so that compiling them changes no answer."""

import os
import subprocess
import sys
from pathlib import Path

import pytest

HERE = Path(__file__).parent


@pytest.mark.parametrize(
    "file", ["test_screening_kernels.py", "test_errors_kernel.py", "test_sweep_kernel.py", "test_sheet_kernel.py"]
)
def test_the_loops_pass_their_tests_uncompiled(file: str) -> None:
    ran = subprocess.run(
        [sys.executable, "-m", "pytest", "-n", "0", "-q", "-p", "no:cacheprovider", "-m", "not slow", str(HERE / file)],
        env={**os.environ, "NUMBA_DISABLE_JIT": "1"},
        check=False,
        capture_output=True,
        text=True,
        cwd=HERE,
    )
    assert ran.returncode == 0, ran.stdout[-2000:]
    assert " passed" in ran.stdout
