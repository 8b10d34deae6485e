"""Which site, frequency and study `fellspan around` is about: from a study file, or from options alone. Asks nothing."""

import datetime as dt
from collections.abc import Sequence
from dataclasses import dataclass, replace
from pathlib import Path

from fellspan.cli.sight_points import read_points
from fellspan.cli.sight_terrain import TerrainOptions, terrain_inputs
from fellspan.errors import CoordinateError, UsageError
from fellspan.geodesy.coordinates import ParsedPosition
from fellspan.links.site import Link, Site
from fellspan.planning.inputs import Study
from fellspan.quantities import format_height, parse_antenna_height, parse_frequency_hz, parse_length_m
from fellspan.study.notes import position_note
from fellspan.study.reading import load_study, stated_site
from fellspan.vocabulary import GapPolicy, HeightReference, LengthUnit

_EXAMPLE = "fellspan around '36.0174 N, 45.2153 W' --height '12 m above ground' --frequency '5.8 GHz' --ground dtm.tif"
_TYPED = "--height"


@dataclass(frozen=True, slots=True, kw_only=True)
class Asked:
    """What was typed after `fellspan around`; None or empty where nothing was."""

    words: Sequence[str]
    study: Path | None
    height: str | None
    frequency: str | None
    ground: Sequence[str]
    surface: Sequence[str]
    cover: Sequence[str]
    obstacles: Sequence[str]
    roof: str | None
    unit: LengthUnit | None
    datum: str | None
    error: str | None
    crs: str | None
    gaps: GapPolicy | None


def site_and_study(asked: Asked) -> tuple[Site, float, Study, str]:
    """The site, the frequency in Hz, a study that holds terrain and criteria, and who says how high the antenna is.

    Raises
    ------
    UsageError
        Something is missing, the study has no such site, or options say what the study says itself.
    """
    return _of_study(asked, asked.study) if asked.study is not None else _alone(asked)


def _of_study(asked: Asked, file: Path) -> tuple[Site, float, Study, str]:
    lost = {
        "--ground": asked.ground,
        "--surface": asked.surface,
        "--cover": asked.cover,
        "--obstacles": asked.obstacles,
        "--unit": asked.unit,
        "--datum": asked.datum,
        "--error": asked.error,
        "--gaps": asked.gaps,
    }
    if names := [name for name, value in lost.items() if value]:
        raise UsageError(f"{', '.join(names)} cannot stand beside --study", "the study says it: change it there")
    study = load_study(file)
    name = " ".join(asked.words).strip()
    known = [(site, link) for link in study.links for site in (link.a, link.b)]
    frequency_hz = None if asked.frequency is None else parse_frequency_hz(asked.frequency)
    if uses := [(site, link) for site, link in known if site.name == name]:
        site, link, origin = _at_its_height(uses, file)
        if asked.height is not None or asked.roof is not None:
            site = _with_height(site, asked)
            origin = _TYPED if asked.height is not None else origin
        return site, frequency_hz or link.radio.frequency_hz, study, origin
    try:
        point = _point(asked)
    except (CoordinateError, UsageError):
        names = sorted({site.name for site, _ in known})
        shown = ", ".join(f"'{other}'" for other in names[:6]) + (f" and {len(names) - 6} more" if names[6:] else "")
        raise UsageError(
            f"'{name}' is neither a site of a link of {file.name} nor a position", f"its sites: {shown}"
        ) from None
    if frequency_hz is None:
        frequency_hz = study.links[0].radio.frequency_hz
    return _site_at(point, asked), frequency_hz, _noted(study, point), _TYPED


def _at_its_height(uses: list[tuple[Site, Link]], file: Path) -> tuple[Site, Link, str]:
    """The site with its own height, else the one that most of its links give; a link that has it; and where it comes from."""
    name = uses[0][0].name
    stated = stated_site(file, name)
    heights: list[tuple[HeightReference | None, float]] = [(site.height_reference, site.height_m) for site, _ in uses]
    own = None if stated is None or stated.height is None else stated.height
    wanted = max(heights, key=heights.count) if own is None else (own.reference, own.height_m)
    if wanted in heights:
        site, link = uses[heights.index(wanted)]
    else:
        assert own is not None
        assert own.reference is not None
        assert stated is not None
        site, link = uses[0]
        site = replace(
            site,
            height_m=own.height_m,
            height_reference=own.reference,
            roof_edge_m=stated.roof_edge,
            parapet_m=stated.parapet,
        )
    if own is None:
        count = heights.count(wanted)
        of = "its link" if len(uses) == 1 else f"{count} of its {len(uses)} links"
        origin = f"{of} in {file.name}" + (f", such as '{link.name}'" if count < len(uses) else "")
    else:
        origin = f"site '{name}' in {file.name}"
    others = [(link.name, at) for at, (_, link) in zip(heights, uses, strict=True) if at != wanted]
    if others:
        first, (reference, height_m) = others[0]
        more = f" ({len(others) - 1} more differ too)" if others[1:] else ""
        origin += f"; link '{first}' has {format_height(height_m, reference)}{more}"
    return site, link, origin


def _alone(asked: Asked) -> tuple[Site, float, Study, str]:
    missing = [
        name
        for name, given in (
            ("--ground or --surface (a raster), or --study", asked.ground or asked.surface),
            ("--frequency", asked.frequency),
            ("--height", asked.height),
        )
        if not given
    ]
    if missing:
        raise UsageError(f"around still needs: {', '.join(missing)}", f"for instance: {_EXAMPLE}")
    point = _point(asked)
    terrain = terrain_inputs(
        TerrainOptions(
            ground=asked.ground, surface=asked.surface, cover=asked.cover, obstacles=asked.obstacles, survey=(),
            unit=asked.unit, datum=asked.datum, error=asked.error, gaps=asked.gaps or "error",
        ),
        [point],
    )  # fmt: skip
    study = Study(title="Around a site", links=(), terrain=terrain, date=dt.date.today())
    assert asked.frequency is not None
    return _site_at(point, asked), parse_frequency_hz(asked.frequency), _noted(study, point), _TYPED


def _noted(study: Study, point: ParsedPosition) -> Study:
    if not point.caution:
        return study
    return replace(study, notes=(*study.notes, position_note("Site", point.caution)))


def _point(asked: Asked) -> ParsedPosition:
    points = read_points(asked.words, crs=asked.crs)
    if len(points) != 1:
        points = read_points([" ".join(asked.words)], crs=asked.crs)
    return points[0]


def _site_at(point: ParsedPosition, asked: Asked) -> Site:
    if asked.height is None:
        raise UsageError("around still needs: --height", "as in '12 m above ground' or '3 m above roof'")
    return _with_height(Site(name="Site", position=point.position, height_m=0.0), asked)


def _with_height(site: Site, asked: Asked) -> Site:
    """The site with the height and the roof that were typed; what a height is measured from is never guessed."""
    roof_m = site.roof_m if asked.roof is None else parse_length_m(asked.roof)
    if asked.height is None:
        return replace(site, roof_m=roof_m)
    height = parse_antenna_height(asked.height)
    if height.reference is None:
        raise UsageError(
            f"--height '{asked.height}' does not say above what",
            f"write '{asked.height} above ground', '{asked.height} above roof' or '{asked.height} above sea level'",
        )
    on_roof = height.reference == "roof"
    return replace(
        site,
        height_m=height.height_m,
        height_reference=height.reference,
        roof_m=roof_m,
        roof_edge_m=site.roof_edge_m if on_roof else None,
        parapet_m=site.parapet_m if on_roof else None,
    )
