"""How a result shows itself in a notebook: the result asks here, and whoever can draw it has said so here; knows neither.

Results stand in rooms below the drawings and must not import them. The package's own `__init__`, which knows every room, says
where the writers are; they load when a notebook first asks.
"""

from collections.abc import Callable, Mapping
from typing import Any

Writers = Mapping[type, Callable[[Any], str]]
"""For each kind of result what makes its HTML."""

_find_writers: Callable[[], Writers] | None = None


def writers_are_found_by(find: Callable[[], Writers]) -> None:
    """Say where the writers are; `find` is called when a notebook asks."""
    global _find_writers  # noqa: PLW0603
    _find_writers = find


class Shown:
    """A result that a notebook shows as HTML; elsewhere its dataclass `repr` stands."""

    __slots__ = ()

    def _repr_html_(self) -> str | None:
        """HTML that needs no other file, or None where nobody can write it: the notebook then shows the `repr`."""
        writer = None if _find_writers is None else _find_writers().get(type(self))
        return None if writer is None else writer(self)
