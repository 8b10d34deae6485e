"""What raster heights are counted in and from: vertical units and vertical datums, from files and from people.

Knows CRS objects and texts; opens no file.
"""

import re
from dataclasses import dataclass
from functools import lru_cache
from typing import Final

from pyproj import CRS

from fellspan.errors import RasterError, VerticalDatumError
from fellspan.geodesy.transforms import crs_of
from fellspan.vocabulary import LengthUnit

METRES_PER: Final[dict[LengthUnit, float]] = {"m": 1.0, "ft": 0.3048, "us-ft": 1200.0 / 3937.0}
"""International foot: exact by the 1959 agreement; US survey foot: 1200/3937 m exactly (NIST SP 811, appendix B)."""

_SPELLINGS: Final[dict[str, float]] = {
    "m": 1.0,
    "metre": 1.0,
    "meter": 1.0,
    "metres": 1.0,
    "meters": 1.0,
    "mm": 1e-3,
    "millimetre": 1e-3,
    "millimeter": 1e-3,
    "cm": 1e-2,
    "centimetre": 1e-2,
    "centimeter": 1e-2,
    "dm": 1e-1,
    "decimetre": 1e-1,
    "decimeter": 1e-1,
    "km": 1e3,
    "ft": METRES_PER["ft"],
    "foot": METRES_PER["ft"],
    "feet": METRES_PER["ft"],
    "internationalfoot": METRES_PER["ft"],
    "footinternational": METRES_PER["ft"],
    "ftus": METRES_PER["us-ft"],
    "usft": METRES_PER["us-ft"],
    "ussurveyfoot": METRES_PER["us-ft"],
    "ussurveyfeet": METRES_PER["us-ft"],
    "footus": METRES_PER["us-ft"],
    "surveyfoot": METRES_PER["us-ft"],
}


def metres_per_unit(text: str) -> float | None:
    """Metres in one unit as a file spells it ('m', 'US survey foot' ...); None where the text is no length known here."""
    return _SPELLINGS.get(re.sub(r"[^a-z]", "", text.casefold()))


def unit_name(metres: float) -> str:
    """What people call a unit of so many metres."""
    names = {1.0: "metres", METRES_PER["ft"]: "feet", METRES_PER["us-ft"]: "US survey feet"}
    return names.get(metres, f"units of {metres:g} m")


def datum_key(name: str) -> str:
    """A vertical datum's name without what varies between files: 'NAVD88 height (ftUS)' and 'NAVD 88' are one."""
    bare = re.sub(r"\(.*?\)", "", name.casefold())
    bare = re.sub(r"\b(height|heights|geoid|vertical|datum|depth)\b", "", bare)
    return re.sub(r"[^a-z0-9]", "", bare)


_ELLIPSOIDAL_KEYS: Final = frozenset(("wgs84", "wgs843d", "wgs1984", "etrs89", "grs80", "hae", "epsg4979", "epsg4937"))
"""What people and files write for a vertical datum when they mean the ellipsoid itself."""


def is_ellipsoidal(datum: str | None) -> bool:
    """True where a vertical datum is an ellipsoid, so that heights above it are not heights above sea level.

    None, a datum that nobody states, is not taken for one.
    """
    if datum is None:
        return False
    return "ellipso" in datum.casefold() or datum_key(datum) in _ELLIPSOIDAL_KEYS


def common_datum(stated: dict[str, str | None]) -> str | None:
    """The one vertical datum that several files state, by file name; None where nobody states any.

    Raises
    ------
    VerticalDatumError
        Two files state different datums.
    """
    first: tuple[str, str] | None = None
    for name, datum in stated.items():
        if datum is None:
            continue
        if first is None:
            first = (name, datum)
        elif datum_key(first[1]) != datum_key(datum):
            raise VerticalDatumError(
                f"heights of different vertical datums would be mixed: '{first[1]}' and '{datum}'",
                f"'{first[1]}' is that of {first[0]}, '{datum}' that of {name}",
                "convert the rasters to one vertical datum, or state it with datum if a file states it wrongly",
            )
    return None if first is None else first[1]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class ReferenceSystem:
    """A raster's CRS taken apart.

    `horizontal` is the text (WKT) of the part in the plane, `period` the value of a full turn in its units for
    geographic systems and None for others; datum and unit of the vertical part are None where there is none.
    """

    name: str
    horizontal: str
    period: float | None
    vertical_datum: str | None
    vertical_unit_m: float | None


def reference_system(wkt: str, raster: str) -> ReferenceSystem:
    """Take the CRS of the raster named `raster` apart.

    Raises
    ------
    RasterError
        The CRS is a local one without a place on Earth, or heights are counted downwards.
    """
    system = _taken_apart(wkt)
    if isinstance(system, ReferenceSystem):
        return system
    problem, remedy = system
    raise RasterError(f"{raster} {problem}", remedy)


@lru_cache(maxsize=256)
def _taken_apart(wkt: str) -> ReferenceSystem | tuple[str, str]:
    """The parts, else problem and remedy: thousands of tiles share a CRS, and each has a name of its own."""
    whole = crs_of(wkt)
    crs = whole.source_crs if whole.is_bound and whole.source_crs is not None else whole
    datum: str | None = None
    unit: float | None = None
    plane: CRS = whole
    if crs.is_compound:
        plane, vertical = crs.sub_crs_list[:2]
        if vertical.is_bound and vertical.source_crs is not None:
            vertical = vertical.source_crs
        if vertical.axis_info and vertical.axis_info[0].direction == "down":
            return (
                f"counts depth downwards ('{vertical.name}'), not height upwards",
                "convert it to heights above a vertical datum first",
            )
        datum = vertical.name
        unit = vertical.axis_info[0].unit_conversion_factor if vertical.axis_info else None
    elif len(crs.axis_info) == 3:
        plane = whole.to_2d()
        geodetic = crs.geodetic_crs
        datum = f"ellipsoid of {geodetic.name if geodetic is not None else crs.name}"
        unit = crs.axis_info[2].unit_conversion_factor
    bare = plane.source_crs if plane.is_bound and plane.source_crs is not None else plane
    if not (bare.is_geographic or bare.is_projected):
        return (
            f"has a coordinate reference system without a place on Earth: '{bare.name}'",
            "assign the real one, for instance with: gdal_edit.py -a_srs EPSG:CODE FILE",
        )
    turn: float | None = None
    if bare.is_geographic:
        turn = 2.0 * 3.141592653589793 / (bare.axis_info[0].unit_conversion_factor or 0.017453292519943295)
    return ReferenceSystem(
        name=whole.name, horizontal=plane.to_wkt(), period=turn, vertical_datum=datum, vertical_unit_m=unit
    )
