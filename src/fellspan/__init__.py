"""Fellspan plans outdoor point-to-point radio links over real terrain.

Names load when first used (PEP 562), so that importing the package, and with it `fellspan --help`, loads no NumPy.
"""

from importlib import import_module
from typing import TYPE_CHECKING, Any

from fellspan import showing

if TYPE_CHECKING:
    from fellspan.errors import FellspanError
    from fellspan.geodesy.position import Position
    from fellspan.links.assess import assess
    from fellspan.links.result import LinkResult
    from fellspan.links.site import Antenna, Link, Radio, Site
    from fellspan.planning.inputs import Study
    from fellspan.planning.plan import LinkPlan, StudyPlan
    from fellspan.planning.planner import plan_study
    from fellspan.study.reading import load_study
    from fellspan.terrain.profile import PathProfile
    from fellspan.terrain.terrain import Terrain

__version__ = "0.1.0"

_HOMES = {
    "Antenna": "fellspan.links.site",
    "FellspanError": "fellspan.errors",
    "Link": "fellspan.links.site",
    "LinkPlan": "fellspan.planning.plan",
    "LinkResult": "fellspan.links.result",
    "PathProfile": "fellspan.terrain.profile",
    "Position": "fellspan.geodesy.position",
    "Radio": "fellspan.links.site",
    "Site": "fellspan.links.site",
    "Study": "fellspan.planning.inputs",
    "StudyPlan": "fellspan.planning.plan",
    "Terrain": "fellspan.terrain.terrain",
    "assess": "fellspan.links.assess",
    "load_study": "fellspan.study.reading",
    "plan_study": "fellspan.planning.planner",
}

__all__ = [
    "Antenna",
    "FellspanError",
    "Link",
    "LinkPlan",
    "LinkResult",
    "PathProfile",
    "Position",
    "Radio",
    "Site",
    "Study",
    "StudyPlan",
    "Terrain",
    "__version__",
    "assess",
    "load_study",
    "plan_study",
    "propagation",
]


# A result in a notebook asks for its HTML; only here is every room known, so only here can the drawings be named to it.
showing.writers_are_found_by(lambda: import_module("fellspan.report.notebook").WRITERS)


def __getattr__(name: str) -> Any:
    if name == "propagation":
        return import_module("fellspan.propagation")
    try:
        home = _HOMES[name]
    except KeyError:
        raise AttributeError(f"module 'fellspan' has no attribute {name!r}") from None
    return getattr(import_module(home), name)


def __dir__() -> list[str]:
    return sorted(__all__)
