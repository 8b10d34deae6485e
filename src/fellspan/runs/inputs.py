"""What a run rests on, as named texts: so that a changed input is noticed before results of two kinds are mixed.

Hashes files, and knows nothing of what they mean.
"""

import dataclasses
import hashlib
import json
from collections.abc import Iterable, Mapping
from importlib.metadata import PackageNotFoundError, version
from pathlib import Path
from typing import Final

from fellspan import __version__
from fellspan.errors import RunError
from fellspan.links.site import Link
from fellspan.planning.inputs import Study
from fellspan.planning.plan import InputFile
from fellspan.planning.stamp import input_files
from fellspan.runs.listing import PairCount
from fellspan.terrain.remote import is_remote
from fellspan.terrain.remote_marks import remote_mark
from fellspan.terrain.sources import CoverSource, ObstacleSource, RasterSource, SurveySource

_MOST_NAMED: Final = 3
PAIRS_KEY: Final = "pairs in all"
CHUNKS_KEY: Final = "chunks in all"


def run_facts(
    study: Study,
    *,
    templates: Iterable[Link],
    files: Mapping[str, Path],
    options: Mapping[str, str],
    count: PairCount,
) -> tuple[dict[str, str], tuple[InputFile, ...]]:
    """The named texts, and the files behind them.

    `templates` are links with the antennas of the run, `files` those given on the command line by what they are, `options`
    what was asked there.
    """
    rests_on = input_files(dataclasses.replace(study, links=tuple(templates)))
    given = [_given(role, path) for role, path in files.items()]
    facts: dict[str, str] = {}
    for file in (*rests_on, *given):
        name, number = f"file {file.role} {file.name}", 2
        while name in facts:  # two files of one name in different folders
            name, number = f"file {file.role} {file.name} ({number})", number + 1
        facts[name] = f"{file.size} bytes, {file.sha256}"
    facts |= {f"option {name}": value for name, value in options.items()}
    facts |= {
        "fellspan": __version__,
        "climate maps (itur)": version_of("itur"),
        "list of pairs": count.digest,
        PAIRS_KEY: str(count.pairs),
        CHUNKS_KEY: str(count.chunks),
    }
    return facts, (*rests_on, *given)


def version_of(package: str) -> str:
    """Version of an installed package, or 'absent'."""
    try:
        return version(package)
    except PackageNotFoundError:
        return "absent"


def run_key(facts: Mapping[str, str]) -> str:
    """A short name for a run, the same for the same inputs."""
    return hashlib.sha256(json.dumps(sorted(facts.items())).encode()).hexdigest()[:16]


def see_to_facts(found: Mapping[str, str], now: Mapping[str, str], *, folder: Path) -> None:
    """Refuse to go on with a run that rests on something else.

    Raises
    ------
    RunError
        An input changed; the message says which.
    """
    changed = [name for name in {**now, **found} if found.get(name) != now.get(name)]
    if not changed:
        return
    named = [said for name in changed if (said := _said(name, found, now))] or ["the list of pairs changed"]
    more = f", and {len(named) - _MOST_NAMED} more" if len(named) > _MOST_NAMED else ""
    raise RunError(
        f"'{folder}' holds a run with other inputs: {'; '.join(named[:_MOST_NAMED])}{more}",
        "--fresh starts anew and drops what is there; another --out keeps it",
    )


def _said(name: str, found: Mapping[str, str], now: Mapping[str, str]) -> str:
    kind, _, rest = name.partition(" ")
    if kind == "file":
        words = "changed" if name in found and name in now else "is gone" if name in found else "is new"
        return f"{rest} {words}"
    if kind == "option":
        return f"{rest} was {found.get(name, 'not given')} and is {now.get(name, 'not given')}"
    if name == "list of pairs" or name in (PAIRS_KEY, CHUNKS_KEY):
        return ""
    named = "Fellspan" if name == "fellspan" else name
    return f"{named} was {found.get(name, 'not stated')} and is {now.get(name, 'not stated')}"


def _given(role: str, path: Path) -> InputFile:
    data = path.read_bytes()
    return InputFile(role=role, name=path.name, modified="", size=len(data), sha256=hashlib.sha256(data).hexdigest())


def files_alike(study: Study) -> tuple[tuple[str, int | str], ...]:
    """What workers must find alike: absolute names and sizes of the study's local terrain files, marks of those behind URLs.

    Raises
    ------
    RasterError
        A raster behind a URL cannot be read.
    """
    terrain = study.terrain
    groups: tuple[Iterable[RasterSource | CoverSource | ObstacleSource | SurveySource], ...] = (
        terrain.ground,
        terrain.surface,
        terrain.cover,
        terrain.obstacles,
        terrain.survey,
    )
    alike: list[tuple[str, int | str]] = []
    for path in (source.path for group in groups for source in group):
        if isinstance(path, Path):
            if path.is_file():
                alike.append((str(path.absolute()), path.stat().st_size))
        elif is_remote(path):
            alike.append((path, remote_mark(path).digest))
    return tuple(alike)
