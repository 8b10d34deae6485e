"""Works on chunks with the threads of this process, a few ahead of what is committed. Knows no store."""

import os
from collections.abc import Callable, Generator, Iterator
from concurrent.futures import FIRST_COMPLETED, Future, ThreadPoolExecutor, wait
from threading import Event
from typing import Final

from fellspan.runs.listing import Chunk
from fellspan.runs.work import Job, close_terrain, work
from fellspan.screening.pairs import PairResults

_AHEAD: Final = 1
"""Chunks waiting for each thread: enough that none idles while another is committed."""


def work_here(
    jobs: Iterator[tuple[Chunk, Job]], *, tell: Callable[[int], None], threads: int | None = None
) -> Generator[tuple[Chunk, PairResults], None, None]:
    """Chunks with their results, in the order in which they are done.

    Closing the iterator, as an exception in its reader does, stops the threads between two batches of pairs.
    """
    count = threads or max(1, os.cpu_count() or 1)
    stop = Event()
    waiting: dict[Future[PairResults], Chunk] = {}
    pool = ThreadPoolExecutor(max_workers=count, thread_name_prefix="fellspan")

    def submit_more() -> None:
        while len(waiting) < count * (1 + _AHEAD):
            following = next(jobs, None)
            if following is None:
                return
            chunk, job = following
            waiting[pool.submit(work, job, stopped=stop.is_set, tell=tell)] = chunk

    try:
        submit_more()
        while waiting:
            done, _ = wait(waiting, return_when=FIRST_COMPLETED)
            for future in done:
                chunk = waiting.pop(future)
                yield chunk, future.result()
            submit_more()
    finally:
        stop.set()
        pool.shutdown(wait=True, cancel_futures=True)
        close_terrain()
