"""Ctrl-C and SIGTERM in a long command: ended in order if that is quick, at once if it is not, or on a second signal.

Knows signals and nothing of the work. What the command keeps must survive a process that is killed at any moment.
"""

import os
import select
import signal
import socket
import sys
import threading
import time
from collections.abc import Callable, Iterator, Mapping
from contextlib import contextmanager
from types import FrameType
from typing import Any, Final

INTERRUPTED: Final = 130
PATIENCE_S: Final = 1.0
"""So long may an ending in order take."""
_SIGNALS: Final = (signal.SIGINT, signal.SIGTERM)
_Handler = Callable[[int, FrameType | None], Any] | int | signal.Handlers | None
_OVER: Final = b"\0"


@contextmanager
def stopping_at_signals(say: Callable[[], None]) -> Iterator[None]:
    """Turn the first signal into a KeyboardInterrupt here, then into `say` and exit code 130.

    Where that takes longer than `PATIENCE_S`, or a second signal comes, `say` is called and the process ends as it stands:
    in a compiled loop, in the midst of a question to SQLite. Signals are those of the main thread; elsewhere nothing is done.
    """
    if threading.current_thread() is not threading.main_thread():
        yield
        return
    said, spoken = threading.Lock(), threading.Event()

    def say_once() -> None:
        if said.acquire(blocking=False):
            say()
            spoken.set()
        else:
            spoken.wait(PATIENCE_S)

    def leave() -> None:
        say_once()
        os._exit(INTERRUPTED)

    first = threading.Event()

    def at_signal(_: int, __: FrameType | None) -> None:
        if not first.is_set():
            first.set()
            raise KeyboardInterrupt

    read, write = socket.socketpair()
    read.setblocking(False)
    write.setblocking(False)
    # One that is ignored, as in a shell's background, stays so.
    heard = [number for number in _SIGNALS if signal.getsignal(number) is not signal.SIG_IGN]
    before = {number: signal.signal(number, at_signal) for number in heard}
    # The bytes come as the signal does, while the handler waits until the main thread is back in Python.
    wakeup = signal.set_wakeup_fd(write.fileno(), warn_on_full_buffer=False)
    watch = threading.Thread(target=_watch, args=(read, leave), name="fellspan-signals", daemon=True)
    watch.start()
    try:
        yield
    except KeyboardInterrupt:
        say_once()
        sys.exit(INTERRUPTED)
    finally:
        signal.set_wakeup_fd(wakeup)
        if not first.is_set():
            _restore(before)
        write.send(_OVER)
        watch.join()
        read.close()
        write.close()
        if first.is_set():
            # What is left is Python winding up: a signal in it ends the process as the first one does.
            _restore(dict.fromkeys(before, lambda *_: os._exit(INTERRUPTED)))


def _restore(handlers: Mapping[signal.Signals, _Handler]) -> None:
    for number, handler in handlers.items():
        signal.signal(number, handler)


def _watch(read: socket.socket, leave: Callable[[], None]) -> None:
    """End the process where it does not end by itself."""
    ends_at: float | None = None
    while True:
        ready, _, _ = select.select([read], [], [], None if ends_at is None else max(0.0, ends_at - time.monotonic()))
        if not ready:
            leave()
        for byte in read.recv(64) if ready else b"":
            if byte == _OVER[0]:
                return
            if byte in _SIGNALS:
                if ends_at is not None:
                    leave()
                ends_at = time.monotonic() + PATIENCE_S
