"""The catalogue: generic antennas by name, with size, mass and frontal area, and the user's own added the same way.

    catalogue = load_catalogue("mine.toml")
    antenna = catalogue.find("dish 0.6 m", 5.8e9)
    pattern = antenna.pattern(5.8e9)

The entries are typical of what is sold, from common practice and no one maker's data. The format is described in
docs/antennas.md.
"""

import difflib
import tomllib
from dataclasses import dataclass
from functools import lru_cache
from importlib import resources
from pathlib import Path
from typing import TYPE_CHECKING, Any

from fellspan.antennas.pattern import Pattern
from fellspan.errors import AntennaError

if TYPE_CHECKING:
    from fellspan.antennas.catalogue_schema import Entry

GENERIC = ("dishes", "yagis", "panels", "sectors", "omnis", "small")
"""Families of generic antennas: a file each in the folder generic/."""


@dataclass(frozen=True, slots=True, kw_only=True)
class CatalogueAntenna:
    """One antenna of a catalogue.

    Attributes
    ----------
    name, kind
        As in the file: 'dish 0.6 m', 'dish'.
    lowest_hz, highest_hz
        Where it may be used, Hz.
    width_m, height_m
        Outer size seen from the front, m.
    mass_kg, frontal_area_m2
        For the mast: mass and wind-loaded area from the front (a grid's is that of its rods).
    note
        What a person should know.
    source
        Name of the catalogue file.
    """

    name: str
    kind: str
    lowest_hz: float
    highest_hz: float
    width_m: float
    height_m: float
    mass_kg: float
    frontal_area_m2: float
    note: str
    source: str
    _entry: "Entry"
    _folder: Path | None

    @property
    def is_grid(self) -> bool:
        """Whether it is a dish of rods, which wind passes through."""
        return bool(getattr(self._entry, "grid", False))

    def covers(self, frequency_hz: float) -> bool:
        """True where the frequency lies in its range, both ends included."""
        return self.lowest_hz <= frequency_hz <= self.highest_hz

    def pattern(self, frequency_hz: float) -> Pattern:
        """Its pattern at a frequency, Hz.

        Raises
        ------
        AntennaError
            The frequency is outside its range, or the entry holds values that no antenna can have.
        """
        if not self.covers(frequency_hz):
            raise AntennaError(
                f"antenna '{self.name}' is not for {frequency_hz / 1e9:g} GHz",
                f"it covers {self.lowest_hz / 1e9:g} to {self.highest_hz / 1e9:g} GHz",
            )
        from fellspan.antennas.catalogue_build import build

        try:
            return build(self._entry, frequency_hz, self._folder)
        except AntennaError as problem:
            raise AntennaError(f"{self.source}, antenna '{self.name}': {problem.what}", *problem.details[:3]) from None


@dataclass(frozen=True, slots=True, kw_only=True)
class Catalogue:
    """Antennas by name, in the order of the files."""

    antennas: tuple[CatalogueAntenna, ...]

    @property
    def names(self) -> tuple[str, ...]:
        """Every name."""
        return tuple(antenna.name for antenna in self.antennas)

    def find(self, name: str, frequency_hz: float | None = None) -> CatalogueAntenna:
        """The antenna with this name; capitals and spacing do not matter.

        Raises
        ------
        AntennaError
            There is none (names that are close are said), or it does not cover the frequency.
        """
        known = {_plain(antenna.name): antenna for antenna in self.antennas}
        antenna = known.get(_plain(name))
        if antenna is None:
            close = [known[key].name for key in difflib.get_close_matches(_plain(name), known, n=3, cutoff=0.5)]
            hint = f"did you mean {', '.join(repr(each) for each in close)}?" if close else "look at the list of names"
            raise AntennaError(f"the catalogue has no antenna '{name}'", hint)
        if frequency_hz is not None and not antenna.covers(frequency_hz):
            others = [each.name for each in self.covering(frequency_hz) if each.kind == antenna.kind][:4]
            raise AntennaError(
                f"antenna '{antenna.name}' is not for {frequency_hz / 1e9:g} GHz",
                f"it covers {antenna.lowest_hz / 1e9:g} to {antenna.highest_hz / 1e9:g} GHz",
                *([f"for that frequency there are: {', '.join(others)}"] if others else []),
            )
        return antenna

    def covering(self, frequency_hz: float) -> tuple[CatalogueAntenna, ...]:
        """Those that may be used at a frequency, Hz."""
        return tuple(antenna for antenna in self.antennas if antenna.covers(frequency_hz))


def load_catalogue(path: str | Path | None = None) -> Catalogue:
    """The generic antennas, and those of the user's own file after them.

    Raises
    ------
    AntennaError
        The file cannot be read, or an entry is wrong: the message names the file, the entry and the key.
    """
    own = _generic()
    if path is None:
        return Catalogue(antennas=own)
    path = Path(path)
    try:
        text = path.read_text(encoding="utf-8-sig")
    except (OSError, UnicodeDecodeError) as problem:
        raise AntennaError(f"cannot read antenna catalogue {path.name}: {problem}") from None
    return Catalogue(antennas=_parsed(text, path.name, path.parent, own))


@lru_cache(maxsize=1)
def _generic() -> tuple[CatalogueAntenna, ...]:
    found: tuple[CatalogueAntenna, ...] = ()
    for family in GENERIC:
        text = resources.files("fellspan.antennas").joinpath("generic", f"{family}.toml").read_text(encoding="utf-8")
        found = _parsed(text, f"generic {family}", None, found)
    return found


def _parsed(
    text: str, file: str, folder: Path | None, before: tuple[CatalogueAntenna, ...]
) -> tuple[CatalogueAntenna, ...]:
    try:
        document = tomllib.loads(text)
    except tomllib.TOMLDecodeError as problem:
        raise AntennaError(f"antenna catalogue {file} is not valid TOML: {problem}") from None
    for key in document:
        if key != "antenna":
            raise AntennaError(
                f"antenna catalogue {file} has an unknown key '{key}'", "entries stand under [[antenna]]"
            )
    entries = document.get("antenna", [])
    if not isinstance(entries, list):
        raise AntennaError(f"antenna catalogue {file}: write [[antenna]] with double brackets before each entry")
    found = list(before)
    for number, entry in enumerate(entries, start=1):
        antenna = _antenna(entry, number, file, folder)
        twin = next((each for each in found if _plain(each.name) == _plain(antenna.name)), None)
        if twin is not None:
            raise AntennaError(
                f"antenna catalogue {file}: the name '{antenna.name}' stands twice, here and in {twin.source}",
                "give this one another name",
            )
        found.append(antenna)
    return tuple(found)


def _antenna(data: dict[str, Any], number: int, file: str, folder: Path | None) -> CatalogueAntenna:
    from pydantic import ValidationError

    from fellspan.antennas.catalogue_schema import KINDS

    where = f"antenna catalogue {file}, entry {number} '{data.get('name', 'without a name')}'"
    kind = data.get("kind")
    if not isinstance(kind, str) or kind not in KINDS:
        raise AntennaError(f"{where}: kind {kind!r} is none of {', '.join(KINDS)}")
    model = KINDS[kind]
    try:
        entry = model.model_validate(data)
    except ValidationError as problem:
        first = problem.errors()[0]
        key = str(first["loc"][0])
        if first["type"] == "extra_forbidden":
            keys = list(model.model_fields)
            close = difflib.get_close_matches(key, keys, n=1)
            meant = f"; did you mean '{close[0]}'?" if close else ""
            raise AntennaError(f"{where}: unknown key '{key}'{meant}", f"keys of a {kind}: {', '.join(keys)}") from None
        if first["type"] == "missing":
            raise AntennaError(f"{where}: '{key}' is missing") from None
        told = str(first["msg"]).removeprefix("Value error, ").replace("\n  ", "; ")
        raise AntennaError(f"{where}: {key} = {first['input']!r}: {told}") from None
    if entry.lowest > entry.highest:
        raise AntennaError(f"{where}: lowest {entry.lowest:g} Hz is above highest {entry.highest:g} Hz")
    return CatalogueAntenna(
        name=entry.name,
        kind=entry.kind,
        lowest_hz=entry.lowest,
        highest_hz=entry.highest,
        width_m=entry.width,
        height_m=entry.height,
        mass_kg=entry.mass_kg,
        frontal_area_m2=entry.frontal_area_m2,
        note=entry.note,
        source=file,
        _entry=entry,
        _folder=folder,
    )


def _plain(name: str) -> str:
    return " ".join(name.casefold().split())
