"""Works on chunks with a Dask cluster: the same function as here; results come back to the one that writes them.

The only place that knows dask.distributed, which is an extra. A job holds all that it needs, so that a lost worker takes
nothing with it: its chunks are given to another.
"""

import time
from collections.abc import Callable, Generator, Iterator
from typing import Any, Final

from fellspan import __version__
from fellspan.errors import FellspanError, RunError
from fellspan.runs.inputs import version_of
from fellspan.runs.listing import Chunk
from fellspan.runs.work import Job, work
from fellspan.screening.pairs import PairResults

_AHEAD: Final = 3
"""Chunks in the cluster for each of its threads; the others wait here."""
_CONNECT_S: Final = 15.0
_WORKERS_S: Final = 30.0
_ASK_S: Final = 5.0
_LOOK_S: Final = 0.05
_LOST_S: Final = 20.0
"""A scheduler that is not back by then is given up."""
MOST_TRIES: Final = 10
"""A chunk is given to workers this often before it is taken for the chunk that kills them."""
_MUST_AGREE: Final = ("fellspan", "itur")
"""Without climate maps a worker would find other availabilities."""
_ALONGSIDE: Final = ("numpy", "rasterio", "pyproj")


def facts_of_worker() -> dict[str, str]:
    """Versions where this runs: of Fellspan and of what its numbers come from."""
    return {"fellspan": __version__, **{name: version_of(name) for name in ("itur", *_ALONGSIDE)}}


def work_on_cluster(
    jobs: Iterator[tuple[Chunk, Job]],
    *,
    address: str,
    tell: Callable[[int], None],
    note: Callable[[str], None],
) -> Generator[tuple[Chunk, PairResults], None, None]:
    """Chunks with their results, in the order in which the cluster is done with them.

    `note` is told what is doubtful about the workers.

    Raises
    ------
    RunError
        dask is not installed, the scheduler is not reached, there are no workers, or they run another version.
    """
    client = _client(address)
    try:
        threads = _see_to_workers(client, address, note)
        yield from _gathered(client, jobs, threads=threads, tell=tell, note=note)
    except OSError as error:
        if isinstance(error, FellspanError):
            raise
        raise _gone() from None
    finally:
        # outstanding chunks are forgotten with their futures; what was committed stays
        client.close(timeout=_ASK_S)


def _client(address: str) -> Any:
    try:
        import distributed
    except ImportError:
        raise RunError(
            "--scheduler needs dask.distributed, which is not installed",
            'install it from the folder of the clone: .venv/bin/pip install -e ".[cluster]"',
        ) from None
    connect: Any = distributed.Client
    try:
        return connect(address, timeout=_CONNECT_S, set_as_default=False, direct_to_workers=False)
    except (OSError, TimeoutError, ValueError) as error:
        raise RunError(
            f"no Dask scheduler answers at '{address}' ({_first_line(error)})",
            "start one with: dask scheduler; it prints its address, such as tcp://192.0.2.7:8786",
        ) from None


def _see_to_workers(client: Any, address: str, note: Callable[[str], None]) -> int:
    """Number of threads of all workers, once there are some and all run this version."""
    try:
        client.wait_for_workers(1, timeout=_WORKERS_S)
    except TimeoutError:
        raise RunError(
            f"the scheduler at '{address}' has no workers (waited {_WORKERS_S:g} s)",
            f"start some, on as many machines as you like, with: dask worker {address}",
        ) from None
    try:
        found: dict[str, dict[str, str]] = client.run(facts_of_worker)
    except ModuleNotFoundError as error:
        raise RunError(
            f"a worker of '{address}' has no {error.name or 'fellspan'}", f"install fellspan {__version__} there"
        ) from None
    here = facts_of_worker()
    for worker, facts in sorted(found.items()):
        for name in _MUST_AGREE:
            if facts[name] != here[name]:
                raise RunError(
                    f"worker {worker} has {name} {facts[name]}, and here it is {here[name]}",
                    "install the same version on all machines",
                )
        others = [f"{name} {facts[name]}" for name in _ALONGSIDE if facts[name] != here[name]]
        if others:
            note(f"worker {worker} has {', '.join(others)}, other than here: last digits of results may differ")
    return _threads_of(client)


def _threads_of(client: Any) -> int:
    return max(1, int(sum(client.nthreads().values())))


def _gathered(
    client: Any,
    jobs: Iterator[tuple[Chunk, Job]],
    *,
    threads: int,
    tell: Callable[[int], None],
    note: Callable[[str], None],
) -> Iterator[tuple[Chunk, PairResults]]:
    import distributed
    from distributed import CancelledError, KilledWorker
    from distributed.scheduler import NoValidWorkerError

    given: dict[Any, tuple[Chunk, Job, int]] = {}
    watch: Any = distributed.as_completed
    completed = watch(loop=client.loop, with_results=False)

    def give(chunk: Chunk, job: Job, tries: int) -> None:
        # pure=False and a key of its own: two runs on one scheduler never share a result
        future = client.submit(work, job, pure=False, key=f"fellspan-{job.run}-{chunk.number}-{tries}-{id(given)}")
        given[future] = (chunk, job, tries)
        completed.add(future)

    def give_more() -> None:
        while len(given) < max(threads, _threads_of(client)) * _AHEAD:
            following = next(jobs, None)
            if following is None:
                return
            give(*following, 1)

    give_more()
    while given:
        _wait_for_one(client, completed, note)
        future = next(completed)
        chunk, job, tries = given.pop(future)
        try:
            results: PairResults = future.result()
        except (KilledWorker, CancelledError, NoValidWorkerError) as error:
            if client.status != "running":
                raise _gone() from None
            if tries >= MOST_TRIES:
                raise RunError(
                    f"chunk {chunk.number} took {tries} workers down with it ({_first_line(error)})",
                    "look at the memory of the workers; a smaller --chunk needs less (with --fresh)",
                    "what is finished is kept: give the same command again to go on",
                ) from None
            give(chunk, job, tries + 1)
            continue
        except FellspanError as error:
            first, *more = str(error).splitlines()
            raise RunError(f"on a worker: {first}", *(line.strip() for line in more[:3])) from None
        tell(results.hub.size)
        yield chunk, results
        del future, results
        give_more()


def _wait_for_one(client: Any, completed: Any, note: Callable[[str], None]) -> None:
    """Wait until a chunk is done; where nobody is left to do one, say so, and give up with the scheduler."""
    lost_at: float | None = None
    alone, asked_at = False, time.monotonic()
    while not completed.has_ready():
        time.sleep(_LOOK_S)
        if client.status == "running":
            lost_at = None
            if time.monotonic() - asked_at < _ASK_S or alone:
                continue
            asked_at = time.monotonic()
            if not client.nthreads():
                alone = True
                note("no worker is left; the run waits until one comes (dask worker ADDRESS)")
            continue
        lost_at = time.monotonic() if lost_at is None else lost_at
        if time.monotonic() - lost_at > _LOST_S:
            raise _gone()


def _gone() -> RunError:
    return RunError(
        "the scheduler is gone", "what is finished is kept: start one and give the same command again to go on"
    )


def _first_line(error: BaseException) -> str:
    return (str(error).strip() or type(error).__name__).splitlines()[0][:120]
