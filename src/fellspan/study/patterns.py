"""Antennas of a study file: models of the catalogue, pattern files and data-sheet numbers become patterns, once each.

Opens pattern files and the user's catalogue. How a pattern is made is the `antennas` room's business.
"""

from pathlib import Path
from typing import TYPE_CHECKING

from fellspan.antennas.data_sheet import from_data_sheet
from fellspan.antennas.files import read_pattern
from fellspan.antennas.pattern import Pattern
from fellspan.errors import FellspanError
from fellspan.links.site import Aim, Antenna, PatternOrigin
from fellspan.study.messages import Problem
from fellspan.study.schema import AntennasTable, AntennaTable

if TYPE_CHECKING:
    from fellspan.antennas.catalogue import Catalogue

OFF_FREQUENCY = 0.1
"""A pattern measured further than this share from the radio's frequency draws a note (common practice, no source)."""


class Patterns:
    """Makes the `Antenna` of a table at a frequency; adds what is wrong to `problems` and what is doubtful to `notes`."""

    def __init__(self, table: AntennasTable, folder: Path, *, problems: list[Problem], notes: list[str]) -> None:
        self.folder = folder
        self.problems = problems
        self.notes = notes
        self.catalogue_path = None if table.catalogue is None else folder / Path(table.catalogue).expanduser()
        self._catalogue: Catalogue | None = None
        self._made: dict[tuple[str, float], Pattern | None] = {}
        if self.catalogue_path is not None:
            # Read even where no antenna names a model: a wrong file is told at once.
            self._read_catalogue()

    def _read_catalogue(self) -> "Catalogue | None":
        if self._catalogue is None:
            path = self.catalogue_path
            if path is not None and not path.exists():
                self.problems.append(_no_file("antennas.catalogue", path))
                return None
            from fellspan.antennas.catalogue import load_catalogue

            try:
                self._catalogue = load_catalogue(path)
            except FellspanError as error:
                self.problems.append(Problem("antennas.catalogue", error.what, error.details))
        return self._catalogue

    def antenna(self, table: AntennaTable, *, frequency_hz: float, feeder_loss_db: float) -> Antenna | None:
        """The antenna of one end at the frequency of its radio; None where its pattern cannot be made."""
        origin, pattern = self._origin(table), None
        if origin is not None:
            key = (table.name, frequency_hz)
            if key not in self._made:
                self._made[key] = self._pattern(table, origin, frequency_hz)
            pattern = self._made[key]
            if pattern is None:
                return None
        aim = Aim(
            bearing_deg=table.bearing, tilt_deg=table.tilt, polarization=table.polarization, roll_deg=table.roll or 0.0
        )
        return Antenna(
            name=table.name,
            gain_dbi=table.gain,
            feeder_loss_db=feeder_loss_db,
            pattern=pattern,
            mounting=None if aim == Aim() else aim,
            origin=origin,
        )

    def _origin(self, table: AntennaTable) -> PatternOrigin | None:
        if table.model is not None:
            return PatternOrigin(model=table.model)
        if table.pattern is not None:
            return PatternOrigin(file=self.folder / Path(table.pattern).expanduser())
        if table.elevation_width is not None:
            return PatternOrigin(
                azimuth_width_deg=table.azimuth_width,
                elevation_width_deg=table.elevation_width,
                front_to_back_db=table.front_to_back,
                cross_polar_db=table.cross_polar,
            )
        return None

    def _pattern(self, table: AntennaTable, origin: PatternOrigin, frequency_hz: float) -> Pattern | None:
        try:
            if origin.model is not None:
                catalogue = self._read_catalogue()
                return None if catalogue is None else catalogue.find(origin.model, frequency_hz).pattern(frequency_hz)
            if origin.file is not None:
                return self._from_file(table, origin.file, frequency_hz)
            omni = origin.azimuth_width_deg is None or origin.azimuth_width_deg == 360.0
            return from_data_sheet(
                name=table.name,
                frequency_hz=frequency_hz,
                gain_dbi=table.gain or 0.0,
                azimuth_width_deg=None if omni else origin.azimuth_width_deg,
                elevation_width_deg=origin.elevation_width_deg or 0.0,
                front_to_back_db=origin.front_to_back_db,
                cross_polar_db=25.0 if origin.cross_polar_db is None else origin.cross_polar_db,
            )
        except FellspanError as error:
            self.problems.append(Problem(f"antenna '{table.name}'", error.what, error.details))
            return None

    def _from_file(self, table: AntennaTable, path: Path, frequency_hz: float) -> Pattern | None:
        if not path.exists():
            self.problems.append(_no_file(f"antenna '{table.name}', pattern", path))
            return None
        pattern = read_pattern(path)
        if abs(pattern.frequency_hz / frequency_hz - 1.0) > OFF_FREQUENCY:
            self.notes.append(
                f"antenna '{table.name}': its pattern was measured at {pattern.frequency_hz / 1e9:g} GHz and is used at "
                f"{frequency_hz / 1e9:g} GHz"
            )
        return pattern


def _no_file(where: str, path: Path) -> Problem:
    return Problem(
        where,
        f"there is no file '{path.name}'",
        (f"looked for at {path.absolute()}", "paths are relative to the study file"),
    )
