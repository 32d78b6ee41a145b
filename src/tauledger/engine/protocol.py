"""Frames on a pipe: eight bytes of length, then JSON; floats cross it without loss."""

from __future__ import annotations

import json
import os
import select
import time
from typing import Any

Message = dict[str, Any]

LENGTH_BYTES = 8


class DeadlinePassed(Exception):
    """No complete frame came before the deadline."""


def send(fd: int, message: Message) -> None:
    """Write one frame; BrokenPipeError where nobody reads any more."""
    body = json.dumps(message).encode("ascii")
    view = memoryview(len(body).to_bytes(LENGTH_BYTES, "big") + body)
    while view:
        view = view[os.write(fd, view) :]


def receive(fd: int, deadline: float | None = None) -> Message | None:
    """Read one frame, or None at the end of the pipe.

    deadline: time.monotonic() at which to give up with DeadlinePassed; None waits for ever.
    """
    head = _read(fd, LENGTH_BYTES, deadline)
    body = _read(fd, int.from_bytes(head, "big"), deadline) if len(head) == LENGTH_BYTES else b""
    if not body:
        return None
    message: Message = json.loads(body)
    return message


def _read(fd: int, size: int, deadline: float | None) -> bytes:
    data = bytearray()
    while len(data) < size:
        if deadline is not None and not select.select([fd], [], [], max(0.0, deadline - time.monotonic()))[0]:
            raise DeadlinePassed
        chunk = os.read(fd, min(size - len(data), 1 << 20))
        if not chunk:
            return b""
        data += chunk
    return bytes(data)
