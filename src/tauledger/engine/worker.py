"""The process that holds ngspice; nothing else in the package imports PySpice.

It takes requests from one pipe and answers on another; stdout and stderr are never part of the protocol, because the
engine writes there. A thread listens to the requests: when the parent is gone the pipe ends, and the thread removes the
private folder and ends the process, even in the middle of a run.
"""

from __future__ import annotations

import array
import ctypes
import logging
import os
import queue
import shutil
import sys
import threading
from collections.abc import Iterable
from typing import Any

from tauledger.engine.protocol import Message, receive, send

LINUX_NAMES = ("libngspice.so.0", "libngspice.so")
# ngspice takes commands of about a thousand characters.
SAVED_AT_ONCE = 30
DARWIN_NAMES = ("/opt/homebrew/lib/libngspice.dylib", "/usr/local/lib/libngspice.dylib", "libngspice.dylib")


class LibraryUnusable(Exception):
    """No file given or found is the ngspice library."""


def find_library(given: str) -> str:
    """Give the path or name under which the dynamic linker finds ngspice.

    given: what the user asked for, or empty for the system's own. Raises LibraryUnusable.
    """
    if given:
        candidates: tuple[str, ...] = (given,)
    else:
        candidates = DARWIN_NAMES if sys.platform == "darwin" else LINUX_NAMES
    reasons: list[str] = []
    for candidate in candidates:
        try:
            library = ctypes.CDLL(candidate)
        except OSError as error:
            reasons.append(str(error))
            continue
        if hasattr(library, "ngSpice_Init"):
            return candidate
        reasons.append(f"{candidate}: has no ngSpice_Init, so it is not the ngspice library")
    raise LibraryUnusable(reasons[0])


class Spice:
    """One ngspice instance: commands, the lines it says, and vectors in full precision."""

    def __init__(self, library: str) -> None:
        logging.getLogger("PySpice").setLevel(logging.CRITICAL)
        from PySpice.Spice.NgSpice.Shared import NgSpiceShared, ffi

        lines: list[str] = []

        class Listening(NgSpiceShared):  # type: ignore[misc]
            LIBRARY_PATH = library.replace("{", "{{").replace("}", "}}")

            def send_char(self, message: str, _ngspice_id: int) -> int:
                lines.append(message if isinstance(message, str) else repr(message))
                return 0

        self._lines = lines
        self._ffi = ffi
        self._shared = Listening.new_instance()
        self._c = self._shared._ngspice_shared
        self.version = str(self._shared.ngspice_version)

    def command(self, text: str) -> list[str]:
        """Run one command and give what the engine said, its own verdict included only as lines."""
        self._lines.clear()
        try:
            self._shared.exec_command(text)
        except NameError as error:
            self._note(error)
        return list(self._lines)

    def load(self, deck: str) -> list[str]:
        """Load a deck and give what the engine said."""
        self._lines.clear()
        try:
            self._shared.load_circuit(deck)
        except NameError as error:
            self._note(error)
        return list(self._lines)

    def _note(self, error: NameError) -> None:
        # PySpice's own errors repeat what the lines say; only "ngSpice_… returned 1" tells something more.
        if type(error) is NameError:
            self._lines.append(f"stderr {error}")

    @property
    def plot(self) -> str:
        """Name of the current plot; "const" where nothing was solved."""
        return str(self._ffi.string(self._c.ngSpice_CurPlot()).decode("ascii"))

    def vector(self, name: str) -> list[float] | None:
        """Give a vector of the current plot: real values, or real and imaginary parts in turn; None if missing."""
        info = self._c.ngGet_Vec_Info(name.encode("ascii"))
        if info == self._ffi.NULL:
            return None
        data, width = (info.v_compdata, 16) if info.v_compdata != self._ffi.NULL else (info.v_realdata, 8)
        if data == self._ffi.NULL or info.v_length == 0:
            return None
        return list(array.array("d", self._ffi.buffer(data, info.v_length * width)[:]))

    def number(self, name: str) -> float | None:
        """Give the first value of a real vector of the current plot, or None; `vector` takes half as long again."""
        info = self._c.ngGet_Vec_Info(name.encode("ascii"))
        if info == self._ffi.NULL or info.v_realdata == self._ffi.NULL or info.v_length == 0:
            return None
        return float(info.v_realdata[0])


def bias(spice: Spice, request: Message) -> Message:
    """Load a deck, solve its operating point, and read vectors and device parameters."""
    spice.command("remcirc")
    spice.command("destroy all")
    load = spice.load(request["deck"])
    run = spice.command("op")
    solved = spice.plot != "const"
    vectors = [_first(spice.vector(name)) if solved else None for name in request["vectors"]]
    read = readings(spice, request["readings"]) if solved else [[] for _ in request["readings"]]
    return {"load": load, "run": run, "vectors": vectors, "readings": read}


def sweep(spice: Spice, request: Message) -> Message:
    """Run the AC grids one after the other and read vectors after each; load the deck before, where it is given."""
    if request["deck"]:
        spice.command("remcirc")
        spice.command("destroy all")
        spice.load(request["deck"])
    if request["save"]:
        spice.command("save " + " ".join(request["vectors"]))
    return {"answers": _ac(spice, request)}


def isolate(spice: Spice, request: Message) -> Message:
    """Load a deck, and run the AC grids with unit amplitude on one group of sources after the other.

    The deck drives the first group.
    """
    spice.command("remcirc")
    spice.command("destroy all")
    load = spice.load(request["deck"])
    # one inner node has a blank in its name: m1#body diode
    saved = [f'"{name}"' if " " in name else name for name in request["vectors"]]
    for first in range(0, len(saved), SAVED_AT_ONCE):
        spice.command("save " + " ".join(saved[first : first + SAVED_AT_ONCE]))
    driven: list[list[Message]] = []
    before: list[str] = []
    for sources in request["sources"]:
        if driven:
            for source in before:
                spice.command(f"alter {source} acmag = 0.0")
            for source in sources:
                spice.command(f"alter {source} acmag = 1.0")
        driven.append(_ac(spice, request))
        before = sources
    return {"load": load, "driven": driven}


def _ac(spice: Spice, request: Message) -> list[Message]:
    answers: list[Message] = []
    for points, start, stop, count in request["grids"]:
        spice.command("destroy all")
        run = spice.command(f"ac {f'dec {points}' if points else f'lin {count}'} {start!r} {stop!r}")
        solved = spice.plot != "const"
        answers.append(
            {
                "run": run,
                "frequency": spice.vector("frequency") if solved else None,
                "vectors": [spice.vector(name) if solved else None for name in request["vectors"]],
            }
        )
    return answers


def readings(spice: Spice, asked: Iterable[tuple[str, list[str], list[str], str]]) -> list[list[float | None]]:
    """Read @device[…] of (device, names, optional names, model), the optional ones behind the others.

    Each device in a plot of its own: in one that grows, 10,000 take seconds. An optional name that one device of a
    model does not have is not asked of the next.
    """
    found: list[list[float | None]] = []
    absent: set[tuple[str, str]] = set()
    for device, names, optional, model in asked:
        spice.command("setplot new")
        values = [spice.number(f"@{device}[{name}]") for name in names]
        for name in optional:
            value = None if model and (model, name) in absent else spice.number(f"@{device}[{name}]")
            if value is None:
                absent.add((model, name))
            values.append(value)
        found.append(values)
        spice.command(f"destroy {spice.plot}")
    return found


def _first(values: list[float] | None) -> float | None:
    return values[0] if values else None


def _listen(request_fd: int, folder: str, inbox: queue.SimpleQueue[Any]) -> None:
    while (request := receive(request_fd)) is not None:
        inbox.put(request)
    shutil.rmtree(folder, ignore_errors=True)
    os._exit(0)


def main(request_fd: int, reply_fd: int, folder: str, library: str) -> None:
    """Answer requests until their pipe ends."""
    inbox: queue.SimpleQueue[Message] = queue.SimpleQueue()
    threading.Thread(target=_listen, args=(request_fd, folder, inbox), daemon=True).start()
    try:
        spice = Spice(find_library(library))
    except LibraryUnusable as reason:
        send(reply_fd, {"missing": str(reason)})
        return
    send(reply_fd, {"version": spice.version})
    work = {"bias": bias, "sweep": sweep, "isolate": isolate}
    while True:
        request = inbox.get()
        send(reply_fd, work[request["do"]](spice, request))


if __name__ == "__main__":
    main(int(sys.argv[1]), int(sys.argv[2]), sys.argv[3], sys.argv[4])
