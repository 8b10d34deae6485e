"""Results one after the other, the next ones worked out meanwhile in a thread of their own; knows nothing of pages.

For work that leaves the interpreter (rasters, arrays): with two cores it costs no time of its own. The order is that of the
items, whatever thread was quicker.
"""

from collections import deque
from collections.abc import Callable, Generator, Iterable
from concurrent.futures import Future, ThreadPoolExecutor
from itertools import islice
from typing import TypeVar

Item = TypeVar("Item")
Result = TypeVar("Result")


def ahead(work: Callable[[Item], Result], items: Iterable[Item], *, by: int = 2) -> Generator[Result, None, None]:
    """`work` of each item, at most `by` of them ahead of the one asked for, so that memory stays bounded.

    The first are begun at the first `next`. Close the generator to give up what is not wanted any more.
    """
    left = iter(items)
    pool = ThreadPoolExecutor(max_workers=1)
    try:
        begun: deque[Future[Result]] = deque(pool.submit(work, item) for item in islice(left, by + 1))
        while begun:
            done = begun.popleft().result()
            begun.extend(pool.submit(work, item) for item in islice(left, 1))
            yield done
    finally:
        pool.shutdown(wait=True, cancel_futures=True)
