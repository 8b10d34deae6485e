"""Machine code: kept on disk where that is allowed, made anew where it is not, and never loaded before it is called for."""

import subprocess
import sys
from collections.abc import Callable
from types import SimpleNamespace
from typing import Any

import numba
import pytest

from fellspan.terrain import compiling


def test_it_works_where_no_cache_may_be_written(monkeypatch: pytest.MonkeyPatch) -> None:
    asked: list[dict[str, Any]] = []
    real = numba.njit

    def njit(**options: Any) -> Callable[..., Any]:
        asked.append(options)
        if options.get("cache"):
            raise RuntimeError("cannot cache function: no locator available for file")  # numba's own words
        return real(**options)  # type: ignore[no-any-return]

    monkeypatch.setattr(compiling, "numba", SimpleNamespace(njit=njit))

    @compiling.compiled
    def twice(value: float) -> float:
        return 2.0 * value

    assert twice(4.0) == 8.0
    assert [options.get("cache", False) for options in asked] == [True, False]
    assert all(options["nogil"] for options in asked)


def test_the_engine_loads_without_it() -> None:
    """numba takes half a second to load: a plan does not need it."""
    rooms = "fellspan.planning.around, fellspan.design.sweep, fellspan.planning.planner"
    code = f"import sys, {rooms}; print('numba' in sys.modules)"
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "False"
