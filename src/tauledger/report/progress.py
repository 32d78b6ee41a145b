"""One line of progress on a terminal, for what takes longer than a second; nothing anywhere else."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from contextlib import contextmanager
from typing import TYPE_CHECKING, TextIO

if TYPE_CHECKING:
    from threading import Event

AFTER_S = 1.0
EVERY_S = 0.25


@contextmanager
def progress(stream: TextIO, *, after_s: float = AFTER_S) -> Iterator[Callable[[str], None]]:
    """Give a function that is told what is being done; after `after_s` seconds the reader sees it, with the time.

    The line is taken away at the end. Where `stream` is no terminal nothing is written.
    """
    if not stream.isatty():
        yield _nobody_reads
        return
    import threading

    doing = [""]
    ended = threading.Event()

    def tell(what: str) -> None:
        doing[0] = what

    watcher = threading.Thread(target=_watch, args=(stream, doing, ended, after_s), daemon=True)
    watcher.start()
    try:
        yield tell
    finally:
        ended.set()
        watcher.join()


def _watch(stream: TextIO, doing: list[str], ended: Event, after_s: float) -> None:
    import shutil
    import time

    started = time.monotonic()
    if ended.wait(after_s):
        return
    shown = 0
    while True:
        room = shutil.get_terminal_size().columns - 1
        line = f"{doing[0]} ... {time.monotonic() - started:.0f} s"[-room:]
        stream.write("\r" + line.ljust(shown))
        stream.flush()
        shown = len(line)
        if ended.wait(EVERY_S):
            break
    stream.write("\r" + " " * shown + "\r")
    stream.flush()


def _nobody_reads(_: str) -> None:
    return None
