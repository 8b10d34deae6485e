"""The stamp of an issue: which files a plan rests on, with size, date and hash, so that a reader can tell whether they changed.

Reads bytes only; knows nothing of what they mean.
"""

import datetime as dt
import hashlib
from collections.abc import Iterator
from pathlib import Path

from fellspan.errors import RasterError
from fellspan.planning.inputs import Study
from fellspan.planning.plan import InputFile
from fellspan.terrain.remote import is_remote, shown_address
from fellspan.terrain.remote_marks import remote_mark

WHOLE_UP_TO_BYTES = 256 * 1024 * 1024
"""Files above this size are hashed at their start, middle and end only."""
PART_BYTES = 4 * 1024 * 1024
_CHUNK_BYTES = 1024 * 1024


def input_files(study: Study) -> tuple[InputFile, ...]:
    """The study file, terrain and antenna files, in the order of the study; what cannot be read here is said so in its hash."""
    return tuple(_input_file(role, path) for role, path in _named_files(study))


def _named_files(study: Study) -> Iterator[tuple[str, str | Path]]:
    if study.path is not None:
        yield "study", study.path
    terrain = study.terrain
    for role, sources in (
        ("ground", terrain.ground),
        ("surface", terrain.surface),
        ("cover", terrain.cover),
        ("obstacles", terrain.obstacles),
        ("survey", terrain.survey),
    ):
        for source in sources:
            yield role, source.path
    for path in study.water_outlines:
        yield "water", path
    if study.antenna_catalogue is not None:
        yield "antennas", study.antenna_catalogue
    if study.rules_file is not None:
        yield "power rules", study.rules_file
    ends = (antenna for link in study.links for antenna in (link.antenna_a, link.antenna_b))
    files = (antenna.origin.file for antenna in ends if antenna.origin is not None)
    for path in dict.fromkeys(path for path in files if path is not None):
        yield "antenna pattern", path


def _input_file(role: str, named: str | Path) -> InputFile:
    if isinstance(named, str):
        return _address(role, named)
    path = named
    if not path.exists():
        return InputFile(role=role, name=str(named), modified="", size=0, sha256="not hashed: not a local file")
    try:
        return _folder(role, path) if path.is_dir() else _file(role, path)
    except OSError as error:
        return InputFile(
            role=role, name=path.name, modified="", size=0, sha256=f"not hashed: {error.strerror or error}"
        )


def _file(role: str, path: Path) -> InputFile:
    stat = path.stat()
    partly = stat.st_size > WHOLE_UP_TO_BYTES
    digest = hashlib.sha256()
    for chunk in _parts(path, stat.st_size) if partly else _chunks(path):
        digest.update(chunk)
    return InputFile(
        role=role,
        name=path.name,
        modified=_moment(stat.st_mtime),
        size=stat.st_size,
        sha256=("partial:" if partly else "") + digest.hexdigest(),
    )


def _address(role: str, address: str) -> InputFile:
    """What is read over a network: what the server states of it, or a sample, stands for the hash of all bytes."""
    if not is_remote(address):
        return _input_file(role, Path(address))
    try:
        mark = remote_mark(address)
    except RasterError as error:
        return InputFile(
            role=role, name=shown_address(address), modified="", size=0, sha256=f"not hashed: {error.what[:120]}"
        )
    return InputFile(
        role=role, name=shown_address(address), modified=mark.modified, size=mark.size or 0, sha256=mark.digest
    )


def _folder(role: str, folder: Path) -> InputFile:
    """A folder of tiles as one entry: the hash covers each file's name, size and own hash, in the order of their names."""
    files = [_file(role, path) for path in sorted(folder.rglob("*")) if path.is_file()]
    digest = hashlib.sha256("\n".join(f"{file.name} {file.size} {file.sha256}" for file in files).encode())
    partly = any(file.sha256.startswith("partial:") for file in files)
    return InputFile(
        role=role,
        name=f"{folder.name}/ ({len(files)} files)",
        modified=max((file.modified for file in files), default=""),
        size=sum(file.size for file in files),
        sha256=("partial:" if partly else "") + digest.hexdigest(),
    )


def _chunks(path: Path) -> Iterator[bytes]:
    with path.open("rb") as stream:
        while chunk := stream.read(_CHUNK_BYTES):
            yield chunk


def _parts(path: Path, size: int) -> Iterator[bytes]:
    with path.open("rb") as stream:
        for start in (0, (size - PART_BYTES) // 2, size - PART_BYTES):
            stream.seek(start)
            yield stream.read(PART_BYTES)


def _moment(timestamp: float) -> str:
    """UTC, to the second."""
    return dt.datetime.fromtimestamp(timestamp, tz=dt.UTC).strftime("%Y-%m-%dT%H:%M:%SZ")
