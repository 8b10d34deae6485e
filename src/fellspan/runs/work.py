"""The work on one chunk of pairs: the same function here and on a worker of a cluster.

A job holds all it needs but the rasters, which the worker opens itself and keeps open. Knows no store and no scheduler.
"""

import dataclasses
import os
import threading
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

from fellspan import __version__
from fellspan.errors import RunError
from fellspan.planning.inputs import Study
from fellspan.planning.planner import open_terrain
from fellspan.runs.listing import Chunk
from fellspan.screening.pairs import Candidates, PairResults, Sector, SiteColumns
from fellspan.screening.screen import Stopped, screen_pairs
from fellspan.terrain.remote import shown_address
from fellspan.terrain.remote_marks import remote_mark
from fellspan.terrain.terrain import Terrain

BATCH_PAIRS: Final = 4096
"""Pairs given to the engine at a time, the same everywhere; between two of them a run can be stopped."""

Index = NDArray[np.int64]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Job:
    """One chunk with the hubs, sectors and places that its pairs need, and what they are numbered in the whole run.

    `run` names the run, so that a worker knows its terrain again; `files` are sizes of local files and marks of remote ones,
    which every worker must find alike.
    """

    run: str
    version: str
    study: Study
    candidates: Candidates
    chunk: Chunk
    hub: Index
    place: Index
    sector: Index
    """What hub, place and sector of `candidates` are in the whole run."""
    files: tuple[tuple[str, int | str], ...] = ()


def job_of(
    chunk: Chunk, candidates: Candidates, *, study: Study, run: str, files: tuple[tuple[str, int | str], ...] = ()
) -> Job:
    """The job of a chunk, with the part of the candidates that it needs."""
    hub, of_hub = np.unique(chunk.hub, return_inverse=True)
    place, of_place = np.unique(chunk.place, return_inverse=True)
    where = {number: index for index, number in enumerate(hub.tolist())}
    sector = [number for number, found in enumerate(candidates.sectors) if found.hub in where]
    part = dataclasses.replace(
        candidates,
        hubs=columns_of(candidates.hubs, hub),
        places=columns_of(candidates.places, place),
        sectors=tuple(_in_part(candidates.sectors[number], where) for number in sector),
    )
    return Job(
        run=run,
        version=__version__,
        study=study,
        candidates=part,
        chunk=Chunk(number=chunk.number, hub=of_hub.astype(np.int64), place=of_place.astype(np.int64)),
        hub=hub,
        place=place,
        sector=np.array(sector, dtype=np.int64),
        files=files,
    )


def _in_part(sector: Sector, where: dict[int, int]) -> Sector:
    return Sector(hub=where[sector.hub], name=sector.name, antenna=sector.antenna)


def columns_of(sites: SiteColumns, index: Index) -> SiteColumns:
    """Some sites of the columns."""
    return SiteColumns(
        name=tuple(sites.name[number] for number in index.tolist()),
        latitude_deg=sites.latitude_deg[index],
        longitude_deg=sites.longitude_deg[index],
        height_m=sites.height_m[index],
        height_reference=sites.height_reference[index],
        roof_m=sites.roof_m[index],
    )


def work(
    job: Job, *, stopped: Callable[[], bool] | None = None, tell: Callable[[int], None] | None = None
) -> PairResults:
    """The results of a chunk, numbered as in the whole run.

    `stopped` is asked between parts of the work, `tell` is called with the number of pairs of each batch that is done.

    Raises
    ------
    Stopped
        The run was told to stop.
    RunError
        This worker runs another version of Fellspan, or finds other files than the run rests on.
    TerrainError
        A raster cannot be read.
    """
    if job.version != __version__:
        raise RunError(
            f"this worker runs Fellspan {__version__}, and the run was started by {job.version}",
            "install the same version on all machines",
        )
    terrain = _TERRAINS.of(job)
    done: list[PairResults] = []
    for start in range(0, job.chunk.hub.size, BATCH_PAIRS):
        if stopped is not None and stopped():
            raise Stopped
        part = slice(start, start + BATCH_PAIRS)
        hub, place = job.chunk.hub[part], job.chunk.place[part]
        # one thread: chunks already keep all cores busy
        done.append(screen_pairs(job.candidates, hub=hub, place=place, terrain=terrain, threads=1, stopped=stopped))
        if tell is not None:
            tell(done[-1].hub.size)
    together = joined(done)
    return dataclasses.replace(
        together,
        hub=job.hub[together.hub],
        place=job.place[together.place],
        sector=np.where(together.sector < 0, -1, job.sector[together.sector]),
    )


def joined(parts: Sequence[PairResults]) -> PairResults:
    """Results one after the other."""
    columns: dict[str, object] = {}
    for field in dataclasses.fields(PairResults):
        values = [getattr(part, field.name) for part in parts]
        columns[field.name] = sum(values, ()) if isinstance(values[0], tuple) else np.concatenate(values)
    return PairResults(**columns)  # type: ignore[arg-type]


def close_terrain() -> None:
    """Close what `work` keeps open in this process."""
    _TERRAINS.close()


class _Terrains:
    """The terrain of the run that this process works for, opened once for all its threads."""

    def __init__(self) -> None:
        self._lock = threading.Lock()
        self._run = ""
        self._terrain: Terrain | None = None

    def of(self, job: Job) -> Terrain:
        with self._lock:
            if self._terrain is None or self._run != job.run:
                self._close()
                _see_to_files(job.files)
                self._terrain, self._run = open_terrain(job.study), job.run
            return self._terrain

    def close(self) -> None:
        with self._lock:
            self._close()

    def _close(self) -> None:
        if self._terrain is not None:
            self._terrain.close()
            self._terrain = None


_TERRAINS: Final = _Terrains()


def _see_to_files(files: Sequence[tuple[str, int | str]]) -> None:
    for path, size in files:
        if isinstance(size, str):
            if remote_mark(path).digest != size:
                raise RunError(
                    f"this worker finds another raster at {shown_address(path)} than the run rests on",
                    "was it replaced, or do GDAL's variables (such as AWS_S3_ENDPOINT) differ on this machine?",
                )
            continue
        try:
            found = os.path.getsize(path)
        except OSError as error:
            raise RunError(
                f"this worker cannot read '{path}': {error.strerror or error}",
                "every worker needs the files of the study under the same paths, or as URLs that GDAL reads",
            ) from None
        if found != size:
            raise RunError(
                f"this worker finds '{path}' with {found} bytes, and the run rests on one with {size}",
                "bring the same files to all machines",
            )
