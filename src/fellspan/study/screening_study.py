"""A study file with files of hubs and places becomes `Candidates`: what every pair of a long run is judged by.

The study needs no sites and no links here. Antennas, radio, rule and criteria are made by the same reading as those of links.
"""

import dataclasses
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Final, get_args

import numpy as np
from numpy.typing import NDArray
from pydantic import ValidationError

from fellspan.errors import FellspanError, SitesFileError, StudyError
from fellspan.links.site import Aim, Antenna, Link
from fellspan.planning.inputs import Study
from fellspan.planning.planner import settings_of
from fellspan.quantities import AntennaHeight
from fellspan.screening.pairs import Candidates, Sector
from fellspan.study.assembling import assemble
from fellspan.study.far_places import SiteRows
from fellspan.study.messages import Problem, did_you_mean, problems_of, raise_problems
from fellspan.study.places import PlaceFile, SectorRow, read_hubs, read_pairs, read_places
from fellspan.study.reading import study_table
from fellspan.study.schema import AntennaTable, CandidatesTable, LinkTable, SiteTable, StudyFile
from fellspan.terrain.tables import shown
from fellspan.vocabulary import MountedPolarization

_HUB, _PLACE = "hub", "place"
_ITSELF: Final = ("antenna", "model", "gain", "azimuth_width", "elevation_width", "front_to_back")
"""Columns that say what a sector's antenna is; the others say how it hangs."""


class LooseStudyFile(StudyFile):
    """A study file that may have no sites and no links of its own."""

    site: tuple[SiteTable, ...] = ()
    link: tuple[LinkTable, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class Wishes:
    """What the command line says instead of the study's [candidates]; None leaves it to the study."""

    radio: str | None = None
    antenna_hub: str | None = None
    antenna_place: str | None = None
    height_hub: AntennaHeight | None = None
    height_place: AntennaHeight | None = None
    min_distance_m: float | None = None
    max_distance_m: float | None = None
    crs: str | None = None


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Screening:
    """A study without links, its candidates, and the pairs that are meant: those listed, else all within reach."""

    study: Study
    templates: tuple[Link, ...]
    """A link for each kind of antenna at the hubs, as the study describes it: for the files that they rest on."""
    candidates: Candidates
    pairs: tuple[NDArray[np.int64], NDArray[np.int64]] | None
    min_distance_m: float
    max_distance_m: float
    notes: tuple[str, ...]
    hub_rows: SiteRows
    place_rows: SiteRows


def load_screening(
    path: Path, *, hubs: Path, places: Path, pairs: Path | None = None, wishes: Wishes | None = None
) -> Screening:
    """Read a study file and the files of hubs and places.

    Raises
    ------
    StudyError
        The study file is wrong, or does not say which radio or antenna is meant.
    SitesFileError
        A file of hubs, places or pairs has a wrong row.
    """
    data = study_table(path)
    try:
        file = LooseStudyFile.model_validate(data)
    except ValidationError as error:
        raise_problems(path.name, problems_of(error.errors(include_url=False), data))
    asked = wishes or Wishes()
    table = _with_wishes(file.candidates, asked)
    hub_file = read_hubs(hubs, crs=asked.crs, height=table.height_hub)
    place_file = read_places(places, crs=asked.crs, height=table.height_place)
    kinds = _Kinds(file, table, hub_file, path.absolute())
    study, templates = kinds.assembled()
    first = templates[0]
    candidates = Candidates(
        hubs=hub_file.sites,
        places=place_file.sites,
        sectors=kinds.sectors(templates),
        place_antenna=first.antenna_b,
        radio=first.radio,
        settings=settings_of(study),
        wanted_margin_db=first.wanted_margin_db,
        target_availability_percent=first.target_availability_percent,
        power_rule=first.power_rule,
        growth_years=study.growth_years,
    )
    listed, pair_notes = None, tuple[str, ...]()
    if pairs is not None:
        of_hub, of_place, pair_notes = read_pairs(pairs, hubs=hub_file.sites, places=place_file.sites)
        listed = (of_hub, of_place)
    return Screening(
        study=dataclasses.replace(study, links=()),
        templates=templates,
        candidates=candidates,
        pairs=listed,
        min_distance_m=table.min_distance or 0.0,
        max_distance_m=np.inf if table.max_distance is None else table.max_distance,
        notes=(*study.notes, *hub_file.notes, *place_file.notes, *pair_notes, *kinds.notes),
        hub_rows=SiteRows(file=hub_file.rows.file, where=hub_file.where),
        place_rows=SiteRows(file=place_file.rows.file, where=place_file.where),
    )


def _with_wishes(table: CandidatesTable, asked: Wishes) -> CandidatesTable:
    wanted = {
        "radio": asked.radio,
        "antenna_hub": asked.antenna_hub,
        "antenna_place": asked.antenna_place,
        "height_hub": asked.height_hub,
        "height_place": asked.height_place,
        "min_distance": asked.min_distance_m,
        "max_distance": asked.max_distance_m,
    }
    for end, height in (("hub", asked.height_hub), ("place", asked.height_place)):
        if height is not None and height.reference is None:
            raise StudyError(
                f"--{end}-height {height.height_m:g} m does not say above what",
                "write '6 m above ground' or 'above roof'",
            )
    found = table.model_copy(update={key: value for key, value in wanted.items() if value is not None})
    if found.min_distance is not None and found.max_distance is not None and found.min_distance >= found.max_distance:
        raise StudyError(
            f"the least distance, {found.min_distance:g} m, is not below the greatest, {found.max_distance:g} m"
        )
    return found


class _Kinds:
    """The kinds of antenna that hubs carry; each is made once, however many sectors hang it."""

    def __init__(self, file: StudyFile, table: CandidatesTable, hubs: PlaceFile, path: Path) -> None:
        self.file = file
        self.table = table
        self.hubs = hubs
        self.path = path
        self.known = {antenna.name: antenna for antenna in file.antenna}
        self.made: dict[tuple[str, ...], AntennaTable] = {}
        self.names: list[str | None] = []
        self.notes: list[str] = []
        self._check_names()
        of_sector = [self._kind(sector) for sector in hubs.sectors]
        hubs.rows.raise_if_wrong()
        self.names = list(dict.fromkeys(of_sector))
        self.kind_of = [self.names.index(name) for name in of_sector]

    def _check_names(self) -> None:
        radios = [radio.name for radio in self.file.radio]
        problems: list[Problem] = []
        radio = self.table.radio
        if radio is None and len(radios) > 1:
            problems.append(
                Problem(
                    "candidates, radio", "the file has several radios, and none is chosen", _listed("radio", radios)
                )
            )
        elif radio is not None and radio not in radios:
            problems.append(
                Problem("candidates, radio", f"there is no radio named '{radio}'", _near(radio, "radio", radios))
            )
        for key in ("antenna_hub", "antenna_place"):
            name = getattr(self.table, key)
            if name is not None and name not in self.known:
                problems.append(
                    Problem(
                        f"candidates, {key}",
                        f"there is no antenna named '{name}'",
                        _near(name, "antenna", list(self.known)),
                    )
                )
        if problems:
            raise_problems(self.path.name, problems)

    def _kind(self, sector: SectorRow) -> str | None:
        """Name of the antenna table of a sector; None where nothing is known of its antenna."""
        row = sector.row
        stated = tuple(row.text(column) for column in _ITSELF)
        if not any(stated):
            return self.table.antenna_hub
        if row.text("antenna"):
            name = row.text("antenna")
            if any(stated[1:]):
                self.hubs.rows.add_problem(
                    row, "antenna names one of the study, and the row describes one too", "keep one"
                )
            elif name not in self.known:
                self.hubs.rows.add_problem(
                    row, f"the study has no antenna named '{shown(name)}'", *_near(name, "antenna", list(self.known))
                )
            return name
        if stated not in self.made:
            table = self._described(sector)
            if table is None:
                return None
            self.made[stated] = table
        return self.made[stated].name

    def _described(self, sector: SectorRow) -> AntennaTable | None:
        """The table of an antenna that a row describes by model or data-sheet numbers."""
        row = sector.row
        values: dict[str, object] = {"name": f"of {self.hubs.rows.file}, {row.where}"}
        for column in _ITSELF[1:]:
            text = row.text(column)
            if text and column in ("azimuth_width", "elevation_width"):
                values[column] = _degrees(text)
            elif text:
                values[column] = text
        if row.text("azimuth_width") and values["azimuth_width"] != 360.0 and not row.text("front_to_back"):
            self.hubs.rows.add_problem(
                row, "front_to_back is missing", "the data sheet of a sector gives it, as '25 dB'"
            )
            return None
        try:
            return AntennaTable.model_validate(values)
        except ValidationError as error:
            for problem in problems_of(error.errors(include_url=False), values):
                self.hubs.rows.add_problem(row, f"{problem.where}: {problem.what}".lstrip(": "), *problem.details)
        return None

    def assembled(self) -> tuple[Study, tuple[Link, ...]]:
        """The study, and a link for each kind, made as those of a study file are."""
        table = self.table
        site = {"at": "0.00000 N, 0.00000 E", "height": "10 m above ground"}
        links = tuple(
            LinkTable.model_construct(
                name=f"candidates {number}" if number else "candidates",
                a=_HUB,
                b=_PLACE,
                radio=table.radio or self.file.radio[0].name,
                antenna_a=name,
                antenna_b=table.antenna_place,
                feeder_loss_a=table.feeder_loss_hub,
                feeder_loss_b=table.feeder_loss_place,
                wanted_margin=table.wanted_margin,
                target_availability=table.target_availability,
                rule=table.rule,
            )
            for number, name in enumerate(self.names)
        )
        tables = {
            "site": tuple(SiteTable.model_validate({"name": name, **site}) for name in (_HUB, _PLACE)),
            "antenna": (*self.file.antenna, *self.made.values()),
            "link": links,
        }
        try:
            study = assemble(self.file.model_copy(update=tables), path=self.path)
        except StudyError as error:
            raise self._of_its_row(error) from None
        return study, study.links

    def _of_its_row(self, error: StudyError) -> FellspanError:
        """An error of an antenna that a row describes as one of that row: the study file does not hold it."""
        rows = {f"antenna '{made.name}'": made.name.removeprefix("of ") for made in self.made.values()}
        for quoted, row in rows.items():
            begins = f"{self.path.name}, {quoted}: "
            if error.what.startswith(begins):
                what = error.what.removeprefix(begins).replace(quoted, "the antenna")
                details = error.details
                for other, its_row in rows.items():
                    details = tuple(detail.replace(other, its_row) for detail in details)
                return SitesFileError(f"{row}: {what}", *details)
        return error

    def sectors(self, templates: Sequence[Link]) -> tuple[Sector, ...]:
        """The sectors of all hubs, in their order."""
        rows, found = self.hubs.rows, []
        alike = 0
        for sector, kind in zip(self.hubs.sectors, self.kind_of, strict=True):
            antenna = templates[kind].antenna_a
            try:
                aim = _aim(sector, antenna)
            except FellspanError as error:
                rows.add_problem(sector.row, error.what, *error.details)
                continue
            alike += aim is not None and aim.bearing_deg is not None and antenna.pattern is None
            name = self.hubs.sites.name[sector.hub] + (f", {sector.name}" if sector.name else "")
            stated = self.names[kind] in self.known and aim == antenna.mounting
            found.append(
                Sector(
                    hub=sector.hub,
                    name=sector.name,
                    antenna=antenna if stated else dataclasses.replace(antenna, name=name, mounting=aim),
                )
            )
        rows.raise_if_wrong()
        if alike:
            self.notes.append(
                f"{alike} {'sector has' if alike == 1 else 'sectors have'} a bearing but no pattern, and count alike in every "
                "direction: give model, or gain with azimuth_width and elevation_width"
            )
        return tuple(found)


def _aim(sector: SectorRow, antenna: Antenna) -> Aim | None:
    """How a sector hangs: as its row says, else as the study says of the antenna."""
    row = sector.row
    was = antenna.mounting if isinstance(antenna.mounting, Aim) else Aim()
    changes: dict[str, object] = {}
    for column, key, sign, low, high in (
        ("bearing", "bearing_deg", 1.0, 0.0, 360.0),
        ("downtilt", "tilt_deg", -1.0, -90.0, 90.0),
    ):
        if row.text(column):
            value = _degrees(row.text(column))
            if not isinstance(value, float) or not low <= value <= high:
                raise SitesFileError(f"{column} '{shown(row.text(column))}' is not {low:g} to {high:g} degrees")
            changes[key] = sign * value + 0.0
    if row.text("polarization"):
        allowed = get_args(MountedPolarization)
        if row.text("polarization") not in allowed:
            raise SitesFileError(
                f"polarization '{shown(row.text('polarization'))}' is not allowed", f"allowed: {', '.join(allowed)}"
            )
        changes["polarization"] = row.text("polarization")
    aim = dataclasses.replace(was, **changes)  # type: ignore[arg-type]
    return None if aim == Aim() else aim


def _degrees(text: str) -> float | str:
    """A number of degrees; the text itself where it is none, for the reader to complain of."""
    bare = text.removesuffix("°").removesuffix("degrees").removesuffix("deg").strip()
    try:
        return float(bare)
    except ValueError:
        return text


def _listed(kind: str, names: Sequence[str]) -> tuple[str, ...]:
    few = ", ".join(f"'{name}'" for name in names[:6]) + (f" and {len(names) - 6} more" if names[6:] else "")
    return (f'add {kind} = "NAME" under [candidates], or give --{kind}', f"{kind}s of this file: {few or 'none'}")


def _near(name: str, kind: str, names: Sequence[str]) -> tuple[str, ...]:
    return (*did_you_mean(name, names), _listed(kind, names)[1])
