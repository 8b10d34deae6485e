"""The same work on many links, shared between processes: results in order, as if one had done it all.

For work that holds the interpreter. Each process prepares its own state once (opens its own rasters), so nothing is shared but
what is sent. Where a process is lost, this one does the rest. Knows nothing of links.
"""

import os
import signal
from collections.abc import Callable, Iterator
from concurrent.futures import ProcessPoolExecutor
from concurrent.futures.process import BrokenProcessPool
from multiprocessing import get_context
from typing import Any, Final, TypeVar

Given = TypeVar("Given")
State = TypeVar("State")
Result = TypeVar("Result")

MANY: Final = 24
"""Fewer items than this are not worth the second or so that another process takes to start."""
_state: list[Any] = []


def processes_at_hand() -> int:
    """How many processes this machine works at once: two at most, so that it stays usable."""
    usable = getattr(os, "sched_getaffinity", None)
    return max(1, min(2, len(usable(0)) if usable is not None else os.cpu_count() or 1))


def shared_work(
    prepare: Callable[[Given], State], work: Callable[[State, int], Result], given: Given, *, count: int, processes: int
) -> Iterator[Result]:
    """`work(prepare(given), number)` of every number below `count`, in order.

    `prepare` and `work` are functions of modules, `given` and the results anything that cloudpickle can send. With one process,
    or fewer than `MANY` items, all of it happens here.
    """
    done = 0
    if processes > 1 and count >= MANY:
        import cloudpickle

        payload = cloudpickle.dumps((prepare, work, given))
        pool = ProcessPoolExecutor(processes, get_context("spawn"), initializer=_start, initargs=(payload,))
        del payload
        try:
            for sent in pool.map(_run, range(count)):
                yield cloudpickle.loads(sent)
                done += 1
        except BrokenProcessPool:
            pass  # lost a process (out of memory, killed): what is left is done here
        finally:
            pool.shutdown(wait=True, cancel_futures=True)
    if done < count:
        state = prepare(given)
        for number in range(done, count):
            yield work(state, number)


def _start(payload: bytes) -> None:
    """In the new process: the terminal's interrupt is for the process that started this one."""
    import cloudpickle

    signal.signal(signal.SIGINT, signal.SIG_IGN)
    prepare, work, given = cloudpickle.loads(payload)
    _state[:] = [prepare(given), work]


def _run(number: int) -> bytes:
    import cloudpickle

    state, work = _state
    sent: bytes = cloudpickle.dumps(work(state, number))
    return sent
