"""The study of one sight line: from options, and from questions where options are missing and someone can answer.

Makes a `Study`; runs nothing and writes nothing.
"""

import datetime as dt
from collections.abc import Sequence
from dataclasses import dataclass
from typing import get_args

from fellspan.cli.asking import ask, ask_or_skip, can_ask
from fellspan.cli.sight_points import read_points
from fellspan.cli.sight_terrain import TerrainOptions, refuse_uncovered, terrain_inputs
from fellspan.errors import FellspanError, UsageError
from fellspan.geodesy.coordinates import ParsedPosition, parse_position
from fellspan.links.site import Antenna, Link, Radio, Site
from fellspan.planning.inputs import Study, TerrainInputs
from fellspan.quantities import (
    AntennaHeight,
    parse_antenna_height,
    parse_frequency_hz,
    parse_gain_dbi,
    parse_length_m,
    parse_threshold_dbm,
    parse_transmit_power_dbm,
)
from fellspan.study.notes import position_note
from fellspan.vocabulary import CriteriaPreset, GapPolicy, HeightReference, LengthUnit

_EXAMPLE = "--ground dtm.tif --frequency '5.8 GHz' --height-a '12 m above ground'"


@dataclass(frozen=True, slots=True, kw_only=True)
class SightOptions:
    """What was typed after `fellspan sight`; None or empty where nothing was."""

    points: Sequence[str]
    crs: str | None
    ground: Sequence[str]
    surface: Sequence[str]
    gaps: GapPolicy
    frequency: str | None
    height_a: str | None
    height_b: str | None
    roof_a: str | None
    roof_b: str | None
    preset: CriteriaPreset
    power: str | None = None
    gain_a: str | None = None
    gain_b: str | None = None
    threshold: str | None = None
    cover: Sequence[str] = ()
    obstacles: Sequence[str] = ()
    survey: Sequence[str] = ()
    unit: LengthUnit | None = None
    datum: str | None = None
    error: str | None = None
    command: str = "sight"
    """Which command asks: its name stands in messages."""

    def of_terrain(self) -> TerrainOptions:
        """What of it is about terrain."""
        return TerrainOptions(
            ground=self.ground, surface=self.surface, cover=self.cover, obstacles=self.obstacles, survey=self.survey,
            unit=self.unit, datum=self.datum, error=self.error, gaps=self.gaps,
        )  # fmt: skip


def sight_study(options: SightOptions) -> tuple[Study, bool]:
    """The study, and whether anything was asked for it.

    The raster is asked for first, so that each position can be held against it at once.

    Raises
    ------
    UsageError
        Something is missing and nobody can be asked.
    """
    points = read_points(options.points, crs=options.crs)
    missing = _missing(options, len(points))
    if missing and not can_ask():
        raise UsageError(
            f"{options.command} still needs: {', '.join(missing)}",
            "the input is no terminal, so nothing can be asked",
            f"for instance: {_EXAMPLE}",
        )
    terrain = terrain_inputs(options.of_terrain(), points)
    while len(points) < 2:
        points.append(ask(f"Position of {'AB'[len(points)]}", lambda text: _position(text, options, terrain)))
    frequency_hz = (
        parse_frequency_hz(options.frequency)
        if options.frequency
        else ask("Frequency, as in 5.8 GHz", parse_frequency_hz)
    )
    a = _site("A", points[0], options.height_a, options.roof_a)
    b = _site("B", points[1], options.height_b, options.roof_b)
    notes = tuple(position_note(name, point.caution) for name, point in zip("AB", points, strict=True) if point.caution)
    today = dt.date.today()
    study = Study(
        title=f"Sight line of {today.isoformat()}",
        links=(_link(a, b, options, frequency_hz),),
        terrain=terrain,
        date=today,
        preset=options.preset,
        notes=notes,
    )
    return study, bool(missing)


def _link(a: Site, b: Site, options: SightOptions, frequency_hz: float) -> Link:
    """The link with as much of its equipment as was given."""
    gain_a = parse_gain_dbi(options.gain_a) if options.gain_a else None
    gain_b = parse_gain_dbi(options.gain_b) if options.gain_b else None
    named = ("antenna", "antenna") if gain_a == gain_b else ("antenna A", "antenna B")
    ends = [
        Antenna() if gain is None else Antenna(name=name, gain_dbi=gain)
        for name, gain in zip(named, (gain_a, gain_b), strict=True)
    ]
    radio = Radio(
        name="radio",
        frequency_hz=frequency_hz,
        power_dbm=parse_transmit_power_dbm(options.power) if options.power else None,
        threshold_dbm=parse_threshold_dbm(options.threshold) if options.threshold else None,
    )
    return Link(name="A - B", a=a, b=b, radio=radio, antenna_a=ends[0], antenna_b=ends[1])


def _missing(options: SightOptions, points: int) -> list[str]:
    """What must still be known, as a person would type it."""
    wanted = {
        "the position of A": points >= 1,
        "the position of B": points >= 2,
        "--ground or --surface (a raster)": bool(options.ground or options.surface),
        "--frequency": options.frequency,
        "--height-a": options.height_a,
        "--height-b": options.height_b,
    }
    return [name for name, given in wanted.items() if not given]


def _position(text: str, options: SightOptions, terrain: TerrainInputs) -> ParsedPosition:
    """A position that was typed at a question; one that no raster covers is refused at once."""
    parsed = parse_position(text, crs=options.crs)
    refuse_uncovered(terrain, [parsed.position])
    return parsed


def _site(name: str, point: ParsedPosition, height_text: str | None, roof_text: str | None) -> Site:
    height = (
        parse_antenna_height(height_text)
        if height_text
        else ask(f"Antenna height at {name}, as in 12 m above roof", parse_antenna_height)
    )
    if height.reference is None:
        height = _with_reference(name, height, height_text)
    roof_m = parse_length_m(roof_text) if roof_text else None
    if height.reference == "roof" and roof_m is None and can_ask():
        roof_m = ask_or_skip(f"Roof at {name} above ground, if no raster shows it", parse_length_m)
    return Site(
        name=name,
        position=point.position,
        height_m=height.height_m,
        height_reference=height.reference or "ground",
        roof_m=roof_m,
    )


def _with_reference(name: str, height: AntennaHeight, text: str | None) -> AntennaHeight:
    """The height with what it is measured from: never guessed. The answer may be a word or the whole height anew."""
    if not can_ask():
        raise UsageError(
            f"--height-{name.lower()} '{text}' does not say above what",
            f"write '{text} above ground', '{text} above roof' or '{text} above sea level'",
        )

    def read(answer: str) -> AntennaHeight:
        fitting = [word for word in get_args(HeightReference) if answer and word.startswith(answer.lower())]
        if len(fitting) == 1:
            return AntennaHeight(height_m=height.height_m, reference=fitting[0])
        try:
            whole = parse_antenna_height(answer)
        except FellspanError:
            whole = parse_antenna_height(f"{height.height_m!r} m above {answer.lower().removeprefix('above ')}")
        if whole.reference is None:
            raise UsageError(f"'{answer}' does not say above what", f"one of: {', '.join(get_args(HeightReference))}")
        return whole

    return ask(f"{height.height_m:g} m at {name}: above what? ({' / '.join(get_args(HeightReference))})", read)
