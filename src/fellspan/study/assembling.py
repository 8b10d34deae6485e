"""Puts the tables of a study file together into a `Study`: names looked up, positions read, paths resolved.

Sees that files exist, and opens none but those of antennas, by way of `patterns`.
"""

import re
from collections import Counter
from collections.abc import Iterable, Mapping
from pathlib import Path
from typing import Literal, TypeVar

from fellspan.climate.given import GivenClimate
from fellspan.errors import FellspanError, LinkError
from fellspan.geodesy.coordinates import parse_position
from fellspan.geodesy.position import Position
from fellspan.links.criteria import Criterion
from fellspan.links.rule_types import PowerRule
from fellspan.links.site import Antenna, Link, Radio, Site
from fellspan.planning.inputs import Study, TerrainInputs
from fellspan.propagation.refraction import k_from_gradient
from fellspan.study.messages import Problem, did_you_mean, raise_problems
from fellspan.study.notes import position_note
from fellspan.study.patterns import Patterns
from fellspan.study.radio_side import PowerRules, climate_of, noise_floors, radio_of, unusable_channels, with_line
from fellspan.study.schema import (
    AntennaTable,
    ClimateTable,
    CriteriaTable,
    LinkTable,
    RadioTable,
    RasterTable,
    SiteTable,
    StudyFile,
    TerrainTable,
)
from fellspan.terrain.remote import unknown_scheme
from fellspan.terrain.sources import CoverSource, ObstacleSource, RasterSource, SurveySource

_Row = TypeVar("_Row", SiteTable, RadioTable, AntennaTable, LinkTable)
_DEFAULT_MEDIAN_K = 4.0 / 3.0
_RASTERS = ("ground", "surface", "cover")
_ELSEWHERE = re.compile(r"[a-z][a-z0-9+.-]+:|/vsi", re.IGNORECASE)
"""A name that the raster library resolves by itself: a URL, a virtual file, a container with a part of it."""


def assemble(study_file: StudyFile, *, path: Path) -> Study:
    """The study that the tables of the file at `path` describe; a StudyError if they do not fit together."""
    assembler = _Assembler(study_file, path)
    terrain = assembler.terrain(study_file.terrain)
    links = assembler.links()
    climate = assembler.climate(study_file.climate)
    water = study_file.water
    outlines = assembler.files("water.outlines", (row.path for row in water.outlines))
    if assembler.problems:
        raise_problems(path.name, assembler.problems)
    stamp, criteria = study_file.study, study_file.criteria
    return Study(
        title=stamp.title,
        planner=stamp.planner,
        revision=stamp.revision,
        date=stamp.date,
        growth_years=stamp.growth_years,
        water_level_m=water.level,
        water_low_m=water.low,
        water_high_m=water.high,
        water_outlines=outlines,
        terrain=terrain,
        links=links,
        preset=criteria.preset or "p530-temperate",
        criteria=_rules(criteria),
        median_k=_median_k(criteria),
        confidence=criteria.confidence,
        tiles_url=study_file.map.tiles_url,
        tiles_credit=study_file.map.tiles_credit,
        path=path,
        antenna_catalogue=assembler.patterns.catalogue_path,
        climate=climate,
        rain_edition=study_file.signal.rain_edition,
        rain_reading=study_file.signal.rain_reading,
        rules_file=assembler.rules.file,
        exposure_rule=study_file.exposure.rule,
        notes=tuple(assembler.notes),
    )


def _rules(criteria: CriteriaTable) -> tuple[Criterion, ...]:
    return tuple(
        Criterion(name=rule.name, k=rule.k, fraction=rule.fraction, source="rule of the study file")
        for rule in criteria.rules or ()
    )


def _median_k(criteria: CriteriaTable) -> float:
    if criteria.gradient is not None:
        return float(k_from_gradient(criteria.gradient))
    return _DEFAULT_MEDIAN_K if criteria.median_k is None else criteria.median_k


def address_trouble(text: str, *, raster: bool = True) -> tuple[str, str] | None:
    """Why a URL cannot serve, known without a network: an unknown scheme, or a file that is no raster; None where it may."""
    if not raster and ("://" in text or text.startswith("/vsi")):
        return f"'{text}' is a URL, and of these only rasters are read", "download the file, and give its path"
    return unknown_scheme(text)


def raster_path(text: str, folder: Path) -> str | Path:
    """A file name resolved against a folder; a name that the raster library resolves by itself stays text."""
    return text if _ELSEWHERE.match(text) else folder / Path(text).expanduser()


class _Assembler:
    """Works through the tables and gathers problems, so that one run tells how many there are."""

    def __init__(self, study_file: StudyFile, path: Path) -> None:
        self.folder = path.parent
        self.problems: list[Problem] = []
        self.notes: list[str] = []
        self.tables = study_file
        self.sites = self._by_name("site", study_file.site)
        self.radios = self._by_name("radio", study_file.radio)
        self.antennas = self._by_name("antenna", study_file.antenna)
        self.patterns = Patterns(study_file.antennas, self.folder, problems=self.problems, notes=self.notes)
        file = study_file.rules.file
        self.rules = PowerRules(None if file is None else self.folder / Path(file).expanduser())
        self._read_rules()
        self._by_name("link", study_file.link)
        self.positions: dict[str, Position] = {}
        for name, site in self.sites.items():
            self._read_position(name, site)

    def _by_name(self, table: str, rows: tuple[_Row, ...]) -> dict[str, _Row]:
        for name, count in Counter(row.name for row in rows).items():
            if count > 1:
                self.problems.append(
                    Problem(f"{table} '{name}'", f"the name stands {count} times", ("give each one a name of its own",))
                )
        return {row.name: row for row in rows}

    def _read_position(self, name: str, site: SiteTable) -> None:
        text, crs = site.at, site.crs
        if site.latitude is not None:
            text, crs = f"{site.latitude}, {site.longitude}", None
        elif site.easting is not None:
            text = f"{site.easting!r}, {site.northing!r}"
        try:
            parsed = parse_position(text or "", crs=crs)
        except FellspanError as error:
            self.problems.append(Problem(f"site '{name}', position", error.what, error.details))
            return
        self.positions[name] = parsed.position
        if parsed.caution:
            self.notes.append(position_note(name, parsed.caution))

    def links(self) -> tuple[Link, ...]:
        """The links whose parts are all there; what is not is added to the problems."""
        return tuple(link for table in self.tables.link if (link := self._link(table)) is not None)

    def _link(self, table: LinkTable) -> Link | None:
        where = f"link '{table.name}'"
        a, b = self._site(table, "a"), self._site(table, "b")
        named = self._on_channel(table, self._named(f"{where}, radio", "radio", table.radio, self.radios))
        radio = None if named is None else self._radio(table, named)
        antenna_a = self._antenna(table, "a", named)
        antenna_b = self._antenna(table, "b", named)
        rule = self._rule(table)
        if a is None or b is None or radio is None or antenna_a is None or antenna_b is None:
            return None
        return Link(
            name=table.name,
            a=a,
            b=b,
            radio=radio,
            antenna_a=antenna_a,
            antenna_b=antenna_b,
            wanted_margin_db=table.wanted_margin,
            target_availability_percent=table.target_availability,
            power_rule=rule,
        )

    def _on_channel(self, link: LinkTable, table: RadioTable | None) -> RadioTable | None:
        """The radio of a link, on the channel that the link states."""
        if table is None or link.frequency is None:
            return table
        if table.duplex == "frequency":
            self.problems.append(
                Problem(
                    f"link '{link.name}', frequency",
                    f"radio '{table.name}' sends on a pair of frequencies",
                    ("give the pair with the radio, transmit_a and transmit_b, or drop frequency here",),
                )
            )
            return table
        return table.model_copy(update={"frequency": link.frequency})

    def _radio(self, link: LinkTable, table: RadioTable) -> Radio | None:
        if link.high_end is not None and table.duplex != "frequency":
            self.problems.append(
                Problem(
                    f"link '{link.name}', high_end",
                    f"radio '{table.name}' has no pair of frequencies",
                    ('give it duplex = "frequency", transmit_a and transmit_b, or drop high_end',),
                )
            )
            return None
        try:
            return radio_of(table, high_end=link.high_end)
        except LinkError as error:
            problem = Problem("", error.what, error.details)
            if problem not in self.problems:  # several links share a radio
                self.problems.append(problem)
            return None

    def _read_rules(self) -> None:
        """A wrong file of rules is told at once, also where no link names a rule."""
        try:
            if self.rules.file is not None:
                self.rules.read()
        except FellspanError as error:
            self.problems.append(Problem("rules.file", error.what, error.details))

    def _rule(self, link: LinkTable) -> PowerRule | None:
        name = link.rule or self.tables.rules.rule
        if name is None or any(problem.where == "rules.file" for problem in self.problems):
            return None
        try:
            return self.rules.find(name)
        except FellspanError as error:
            where = "rules.rule" if link.rule is None else f"link '{link.name}', rule"
            problem = Problem(where, error.what, error.details)
            if problem not in self.problems:
                self.problems.append(problem)
            return None

    def climate(self, table: ClimateTable) -> GivenClimate:
        """What the study gives of the climate; nothing where that cannot be, which is a problem."""
        try:
            return climate_of(table)
        except FellspanError as error:
            self.problems.append(Problem("climate", error.what, error.details))
            return GivenClimate()

    def _named(self, where: str, kind: str, name: str, known: Mapping[str, _Row]) -> _Row | None:
        if name in known:
            return known[name]
        listed = ", ".join(known) if known else f"none; add a [[{kind}]] table"
        self.problems.append(
            Problem(
                where,
                f"there is no {kind} named '{name}'",
                (*did_you_mean(name, known), f"{kind}s of this file: {listed}"),
            )
        )
        return None

    def _antenna(self, link: LinkTable, end: Literal["a", "b"], radio: RadioTable | None) -> Antenna | None:
        name = (link.antenna_a if end == "a" else link.antenna_b) or link.antenna
        loss_db = link.feeder_loss_a if end == "a" else link.feeder_loss_b
        if name is None:
            return with_line(Antenna(feeder_loss_db=loss_db), link, end=end)
        table = self._named(f"link '{link.name}', antenna_{end}", "antenna", name, self.antennas)
        if table is None or radio is None:
            return None
        made = self.patterns.antenna(table, frequency_hz=radio.frequency, feeder_loss_db=loss_db)
        return None if made is None else with_line(made, link, end=end)

    def _site(self, link: LinkTable, end: Literal["a", "b"]) -> Site | None:
        """The site at an end, with what the link states for itself in place of the site's own."""
        where = f"link '{link.name}', {end}"
        table = self._named(where, "site", link.a if end == "a" else link.b, self.sites)
        if table is None or table.name not in self.positions:
            return None
        height = link.height_a if end == "a" else link.height_b
        roof_edge = link.roof_edge_a if end == "a" else link.roof_edge_b
        parapet = link.parapet_a if end == "a" else link.parapet_b
        given = height or table.height
        if given is None or given.reference is None:
            self.problems.append(
                Problem(
                    f"site '{table.name}'",
                    f"there is no antenna height, and link '{link.name}' gives none",
                    (f'add height = "12 m above ground" to the site, or height_{end} to the link',),
                )
            )
            return None
        # A roof edge of the site is about its roof: it does not follow the antenna to a mast beside the building.
        keeps_roof = height is None or height.reference == "roof"
        try:
            return Site(
                name=table.name,
                position=self.positions[table.name],
                height_m=given.height_m,
                height_reference=given.reference,
                roof_m=table.roof,
                ground_amsl_m=table.ground,
                vertical_datum=table.datum,
                roof_edge_m=roof_edge if roof_edge is not None else table.roof_edge if keeps_roof else None,
                parapet_m=parapet if parapet is not None else table.parapet if keeps_roof else None,
                noise_floors=noise_floors(table),
                unusable_channels=unusable_channels(table),
            )
        except LinkError as error:
            self.problems.append(Problem("", error.what, error.details))
            return None

    def terrain(self, table: TerrainTable) -> TerrainInputs:
        """The files of [terrain], resolved; a file that is not there is a problem."""
        if not table.ground and not table.surface:
            self.problems.append(
                Problem(
                    "terrain",
                    "there is neither ground nor surface",
                    ('add ground = "FILE" (bare ground) or surface = "FILE" (roofs and treetops included)',),
                )
            )
        return TerrainInputs(
            ground=tuple(self._raster("ground", row) for row in table.ground),
            surface=tuple(self._raster("surface", row) for row in table.surface),
            cover=tuple(
                CoverSource(
                    path=self._path("cover", row.path),
                    kind=row.kind,
                    vertical_unit=row.unit,
                    error_m=row.error,
                    growth_m_per_year=row.growth,
                    band=row.band,
                )
                for row in table.cover
            ),
            obstacles=tuple(
                ObstacleSource(path=self._path("obstacles", row.path), complete=row.complete) for row in table.obstacles
            ),
            survey=tuple(SurveySource(path=self._path("survey", row.path)) for row in table.survey),
            gaps=table.gaps,
            sea_level_m=table.sea_level,
            step_m=table.step,
        )

    def _raster(self, role: Literal["ground", "surface"], row: RasterTable) -> RasterSource:
        return RasterSource(
            path=self._path(role, row.path),
            role=role,
            vertical_unit=row.unit,
            vertical_datum=row.datum,
            error_m=row.error,
            band=row.band,
        )

    def files(self, key: str, texts: Iterable[str]) -> tuple[str | Path, ...]:
        """Files of a table other than [terrain], resolved; one that is not there is a problem."""
        return tuple(self._path(key, text) for text in texts)

    def _path(self, key: str, text: str) -> str | Path:
        resolved = raster_path(text, self.folder)
        wrong = address_trouble(text, raster=key in _RASTERS) if isinstance(resolved, str) else None
        if wrong is not None:
            self.problems.append(Problem(key if "." in key else f"terrain.{key}", wrong[0], wrong[1:]))
        if isinstance(resolved, Path) and not resolved.exists():
            self.problems.append(
                Problem(
                    key if "." in key else f"terrain.{key}",
                    f"there is no file '{text}'",
                    (f"looked for at {resolved.absolute()}", "paths are relative to the study file"),
                )
            )
        return resolved
