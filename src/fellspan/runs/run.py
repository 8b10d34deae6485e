"""A run over pairs: opens or makes the store, has the chunks that are missing worked on, commits each whole.

Knows when a chunk is done, and not what its results mean.
"""

from collections.abc import Callable, Iterator, Sequence
from contextlib import closing, contextmanager
from dataclasses import dataclass
from pathlib import Path
from typing import Final, Protocol

from filelock import FileLock, Timeout

from fellspan.errors import OutputError, RunError
from fellspan.planning.inputs import Study
from fellspan.runs.inputs import CHUNKS_KEY, PAIRS_KEY, run_key, see_to_facts
from fellspan.runs.listing import Chunk, PairList
from fellspan.runs.local import work_here
from fellspan.runs.store import STORE_NAME, Store, errors
from fellspan.runs.work import Job, job_of
from fellspan.screening.pairs import Candidates

LOCK_NAME: Final = ".fellspan-run.lock"


class Watcher(Protocol):
    """Told of a run's progress: `begin` once, `done` from any thread, with a number of pairs; `kept` as they are committed."""

    def begin(self, pairs: int, done: int) -> None:
        """So many pairs in all, and so many of them from earlier."""

    def done(self, pairs: int) -> None:
        """So many pairs more are worked out."""

    def kept(self, pairs: int) -> None:
        """So many pairs more are in the store."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class RunPlan:
    """What to run: the pairs, what they are judged by, the texts that name the inputs, and where the work is done."""

    study: Study
    candidates: Candidates
    pairs: PairList
    facts: dict[str, str]
    files: tuple[tuple[str, int | str], ...] = ()
    scheduler: str | None = None
    threads: int | None = None


@contextmanager
def locked(folder: Path) -> Iterator[None]:
    """Keep other runs out of a folder, which is made; a RunError where one is at work there."""
    lock = _made_lock(folder)
    try:
        lock.acquire(timeout=0)
    except Timeout:
        raise RunError(
            f"another run is at work in '{folder}'", "wait until it has finished, or give another folder for --out"
        ) from None
    except OSError as error:
        raise OutputError(f"'{folder}' cannot be written: {error.strerror or error}", "give another folder") from None
    try:
        yield
    finally:
        lock.release()


def _made_lock(folder: Path) -> FileLock:
    try:
        folder.mkdir(parents=True, exist_ok=True)
    except FileExistsError:
        raise OutputError(f"'{folder}' is a file, not a folder", "give a folder, or a name that is free") from None
    except OSError as error:
        raise OutputError(f"'{folder}' cannot be made: {error.strerror or error}", "give another folder") from None
    return FileLock(folder / LOCK_NAME)


def open_store(folder: Path, run: RunPlan, *, fresh: bool, outputs: Sequence[str]) -> Store:
    """The store of this run in a folder that is locked: the one that is there, or a new one.

    `outputs` are the names of the files that the run will write there.

    Raises
    ------
    RunError
        The one that is there rests on other inputs.
    OutputError
        A file of one of those names is there that no run has written.
    """
    path = folder / STORE_NAME
    if path.exists():
        if not fresh:
            store = Store.open(path)
            try:
                see_to_facts(store.facts(), run.facts, folder=folder)
            except BaseException:
                store.__exit__()
                raise
            return store
        _drop(folder, path, outputs)
    for name in outputs:
        if (folder / name).exists():
            raise OutputError(
                f"'{folder / name}' is there already and was not written by this run",
                "give another folder for --out, or move that file away",
            )
    return Store.create(path, facts=run.facts, candidates=run.candidates)


def _drop(folder: Path, path: Path, outputs: Sequence[str]) -> None:
    """Remove an earlier run: a file that is none of ours stays, and is an error; one that is damaged goes."""
    try:
        Store.open(path).__exit__()
    except RunError as error:
        if "was not written" in error.what:
            raise
    except OutputError:
        _see_to_start(path)
    with errors(path):
        for name in (*outputs, STORE_NAME + "-journal", STORE_NAME):
            (folder / name).unlink(missing_ok=True)


def _see_to_start(path: Path) -> None:
    """A damaged file is ours where it begins as SQLite's do."""
    with path.open("rb") as stream:
        if stream.read(15) != b"SQLite format 3":
            raise RunError(f"'{path}' was not written by a run of Fellspan", "give another folder for --out")


def finish_run(store: Store, run: RunPlan, *, watcher: Watcher, note: Callable[[str], None]) -> None:
    """Work on the chunks that the store lacks, and commit each as it is done.

    Raises
    ------
    TerrainError
        A raster cannot be opened or read.
    RunError
        The cluster is not as it must be.
    OutputError
        The store cannot be written.
    """
    finished = store.finished()
    watcher.begin(int(run.facts[PAIRS_KEY]), store.pairs_done())
    if len(finished) == int(run.facts[CHUNKS_KEY]):
        return
    jobs = _jobs(run, finished)
    if run.scheduler is None:
        done = work_here(jobs, tell=watcher.done, threads=run.threads)
    else:
        from fellspan.runs.cluster import work_on_cluster

        done = work_on_cluster(jobs, address=run.scheduler, tell=watcher.done, note=note)
    with closing(done):
        for chunk, results in done:
            store.commit(chunk, results)
            watcher.kept(results.hub.size)


def _jobs(run: RunPlan, finished: set[int]) -> Iterator[tuple[Chunk, Job]]:
    key = run_key(run.facts)
    for chunk in run.pairs.chunks():
        if chunk.number not in finished:
            yield chunk, job_of(chunk, run.candidates, study=run.study, run=key, files=run.files)
