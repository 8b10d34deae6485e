"""Writes a `Study` as the text of a study file that `load_study` reads back to the same study.

Makes text only: where it goes, and whether something stands there already, is the caller's business.
"""

import os
from collections.abc import Iterable
from pathlib import Path

from fellspan.errors import StudyError
from fellspan.links.criteria import Criterion
from fellspan.links.radio import Radio
from fellspan.links.site import Aim, Antenna, Link, PatternOrigin, Site
from fellspan.planning.inputs import Study
from fellspan.study.notes import position_note
from fellspan.study.toml_text import decibels, hertz, metres, number, plain, quoted, table
from fellspan.study.writing_radio import (
    channel_of,
    heard_text,
    high_end_of,
    line_pairs,
    one_radio_each,
    radio_text,
    study_tables,
)
from fellspan.terrain.sources import CoverSource, ObstacleSource, RasterSource

_ABOVE = {"ground": "above ground", "roof": "above roof", "sea": "above sea level"}


def study_text(study: Study, *, folder: Path) -> str:
    """The text of a study file for `study` that is to stand in `folder`.

    Raises
    ------
    StudyError
        Two different sites, radios or antennas bear the same name, which a study file cannot say.
    """
    sites, radios, antennas = _sites(study.links), one_radio_each(study.links), _antennas(study.links)
    rules_file = None if study.rules_file is None else _path(study.rules_file, folder)
    blocks = [
        table(
            "[study]",
            ("title", quoted(study.title)),
            ("planner", quoted(study.planner) if study.planner else None),
            ("revision", quoted(study.revision) if study.revision else None),
            ("date", study.date.isoformat()),
            ("growth_years", number(study.growth_years) if study.growth_years else None),
        ),
        _terrain(study, folder),
        *_water(study, folder),
        *_criteria(study),
        *study_tables(study, rules_file=rules_file),
        *(text for site in sites.values() for text in (_site(site, study.notes), *heard_text(site))),
        *(radio_text(radio) for radio in radios.values()),
        *_catalogue(study, folder),
        *(_antenna(antenna, folder) for antenna in antennas.values()),
        *(_link(link, sites, radios) for link in study.links),
    ]
    if study.tiles_url is not None:
        blocks.append(
            table("[map]", ("tiles_url", quoted(study.tiles_url)), ("tiles_credit", quoted(study.tiles_credit)))
        )
    return "\n".join(blocks)


def _degrees(value: float, positive: str, negative: str, *, coarse: bool) -> str:
    """Degrees with a letter; filled with zeros to five decimals, unless it was typed so coarsely that a note was made of it."""
    text = number(abs(value))
    if not coarse and "e" not in text:
        whole, _, decimals = text.partition(".")
        text = f"{whole}.{decimals:0<5}"
    return f"{text} {negative if value < 0 else positive}"


def _height(site: Site) -> str:
    return f'"{number(site.height_m)} m {_ABOVE[site.height_reference]}"'


def _terrain(study: Study, folder: Path) -> str:
    terrain = study.terrain
    return table(
        "[terrain]",
        ("ground", _files(_raster(source, folder) for source in terrain.ground)),
        ("surface", _files(_raster(source, folder) for source in terrain.surface)),
        ("cover", _files(_cover(source, folder) for source in terrain.cover)),
        ("obstacles", _files(_obstacles(source, folder) for source in terrain.obstacles)),
        ("survey", _files(_path(source.path, folder) for source in terrain.survey)),
        ("gaps", quoted(terrain.gaps) if terrain.gaps != "error" else None),
        ("sea_level", metres(terrain.sea_level_m) if terrain.sea_level_m else None),
        ("step", metres(terrain.step_m)),
    )


def _files(items: Iterable[str]) -> str | None:
    listed = list(items)
    if not listed:
        return None
    return listed[0] if len(listed) == 1 else "[\n" + "".join(f"  {item},\n" for item in listed) + "]"


def _path(path: str | Path, folder: Path) -> str:
    """A path relative to the study's folder where it lies within it, else absolute; a URL as it is."""
    if isinstance(path, str):
        return quoted(path)
    absolute = Path(os.path.abspath(path))
    home = Path(os.path.abspath(folder))
    return quoted((absolute.relative_to(home) if absolute.is_relative_to(home) else absolute).as_posix())


def _inline(path: str, pairs: Iterable[tuple[str, str | None]]) -> str:
    stated = [f"{key} = {value}" for key, value in pairs if value is not None]
    return f"{{ path = {path}, {', '.join(stated)} }}" if stated else path


def _raster(source: RasterSource, folder: Path) -> str:
    return _inline(
        _path(source.path, folder),
        (
            ("unit", quoted(source.vertical_unit) if source.vertical_unit else None),
            ("datum", quoted(source.vertical_datum) if source.vertical_datum else None),
            ("error", metres(source.error_m)),
            ("band", str(source.band) if source.band != 1 else None),
        ),
    )


def _cover(source: CoverSource, folder: Path) -> str:
    growth = source.growth_m_per_year
    return _inline(
        _path(source.path, folder),
        (
            ("kind", quoted(source.kind)),
            ("unit", quoted(source.vertical_unit) if source.vertical_unit else None),
            ("error", metres(source.error_m)),
            ("growth", f'"{number(growth)} m per year"' if growth else None),
            ("band", str(source.band) if source.band != 1 else None),
        ),
    )


def _obstacles(source: ObstacleSource, folder: Path) -> str:
    complete = f"[{', '.join(quoted(kind) for kind in source.complete)}]" if source.complete else None
    return _inline(_path(source.path, folder), (("complete", complete),))


def _water(study: Study, folder: Path) -> Iterable[str]:
    levels = study.water_level_m, study.water_low_m, study.water_high_m
    if levels != (None, None, None) or study.water_outlines:
        yield table(
            "[water]",
            *((key, metres(level)) for key, level in zip(("level", "low", "high"), levels, strict=True)),
            ("outlines", _files(_path(path, folder) for path in study.water_outlines)),
        )


def _criteria(study: Study) -> Iterable[str]:
    yield table(
        "[criteria]",
        ("preset", None if study.criteria else quoted(study.preset)),
        ("median_k", number(study.median_k)),
        ("confidence", number(study.confidence)),
    )
    for rule in study.criteria:
        yield _rule(rule)


def _rule(rule: Criterion) -> str:
    return table(
        "[[criteria.rules]]", ("name", quoted(rule.name)), ("k", number(rule.k)), ("fraction", number(rule.fraction))
    )


def _site(site: Site, notes: Iterable[str]) -> str:
    position = site.position
    coarse = any(note.startswith(position_note(site.name, "")) for note in notes)
    at = (
        f"{_degrees(position.latitude_deg, 'N', 'S', coarse=coarse)}, "
        f"{_degrees(position.longitude_deg, 'E', 'W', coarse=coarse)}"
    )
    return table(
        "[[site]]",
        ("name", quoted(site.name)),
        ("at", quoted(at)),
        ("height", _height(site)),
        ("roof", metres(site.roof_m)),
        ("ground", metres(site.ground_amsl_m)),
        ("datum", quoted(site.vertical_datum) if site.vertical_datum else None),
    )


def _catalogue(study: Study, folder: Path) -> Iterable[str]:
    if study.antenna_catalogue is not None:
        yield table("[antennas]", ("catalogue", _path(study.antenna_catalogue, folder)))


def _antenna(antenna: Antenna, folder: Path) -> str:
    origin, aim = antenna.origin or PatternOrigin(), antenna.mounting or Aim()
    return table(
        "[[antenna]]",
        ("name", quoted(antenna.name)),
        ("gain", None if antenna.gain_dbi is None else f'"{number(antenna.gain_dbi)} dBi"'),
        ("model", None if origin.model is None else quoted(origin.model)),
        ("pattern", None if origin.file is None else _path(origin.file, folder)),
        ("azimuth_width", plain(origin.azimuth_width_deg)),
        ("elevation_width", plain(origin.elevation_width_deg)),
        ("front_to_back", None if origin.front_to_back_db is None else decibels(origin.front_to_back_db)),
        ("cross_polar", None if origin.cross_polar_db is None else decibels(origin.cross_polar_db)),
        ("bearing", plain(aim.bearing_deg)),
        ("tilt", plain(aim.tilt_deg)),
        ("polarization", None if aim.polarization is None else quoted(aim.polarization)),
        ("roll", plain(aim.roll_deg) if aim.roll_deg else None),
    )


def _link(link: Link, sites: dict[str, Site], radios: dict[str, Radio]) -> str:
    return table(
        "[[link]]",
        ("name", quoted(link.name)),
        ("a", quoted(link.a.name)),
        ("b", quoted(link.b.name)),
        ("radio", quoted(link.radio.name)),
        ("antenna_a", _antenna_name(link.antenna_a)),
        ("antenna_b", _antenna_name(link.antenna_b)),
        ("feeder_loss_a", decibels(link.antenna_a.feeder_loss_db)),
        ("feeder_loss_b", decibels(link.antenna_b.feeder_loss_db)),
        ("wanted_margin", f'"{number(link.wanted_margin_db)} dB"'),
        ("height_a", _own_height(link.a, sites)),
        ("height_b", _own_height(link.b, sites)),
        ("roof_edge_a", metres(link.a.roof_edge_m)),
        ("roof_edge_b", metres(link.b.roof_edge_m)),
        ("parapet_a", metres(link.a.parapet_m)),
        ("parapet_b", metres(link.b.parapet_m)),
        ("frequency", hertz(channel_of(link, radios))),
        ("high_end", high_end_of(link, radios)),
        *line_pairs(link),
    )


def _own_height(end: Site, sites: dict[str, Site]) -> str | None:
    written = sites[end.name]
    same = (written.height_m, written.height_reference) == (end.height_m, end.height_reference)
    return None if same else _height(end)


def _antenna_name(antenna: Antenna) -> str | None:
    return quoted(antenna.name) if _is_named(antenna) else None


def _is_named(antenna: Antenna) -> bool:
    """Whether a user described it; an end of which nothing is known has the default name and no gain."""
    return antenna.peak_gain_dbi is not None or antenna.mounting is not None or antenna.name != Antenna().name


def _sites(links: Iterable[Link]) -> dict[str, Site]:
    """Sites by name. Heights and roof edges may differ between links, since a link can state its own; the rest may not."""
    found: dict[str, Site] = {}
    for site in (end for link in links for end in (link.a, link.b)):
        first = found.setdefault(site.name, site)
        for name in ("position", "roof_m", "ground_amsl_m", "vertical_datum", "noise_floors", "unusable_channels"):
            if getattr(first, name) != getattr(site, name):
                raise StudyError(f"two different sites are called '{site.name}'", "give each one a name of its own")
    return found


def _antennas(links: Iterable[Link]) -> dict[str, Antenna]:
    """Antennas by name; feeder losses may differ between links, since they are a link's, and patterns with the frequency."""
    found: dict[str, Antenna] = {}
    for antenna in (end for link in links for end in (link.antenna_a, link.antenna_b)):
        if not _is_named(antenna):
            continue
        if antenna.pattern is not None and antenna.origin is None:
            raise StudyError(
                f"antenna '{antenna.name}' has a pattern that no study file can name",
                "write the pattern to a file, or use a model or data-sheet numbers",
            )
        first = found.setdefault(antenna.name, antenna)
        for name in ("gain_dbi", "mounting", "origin"):
            if getattr(first, name) != getattr(antenna, name):
                raise StudyError(
                    f"two different antennas are called '{antenna.name}'", "give each one a name of its own"
                )
    return found
