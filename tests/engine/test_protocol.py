"""Frames cross a pipe whole, floats without loss, and never past the deadline."""

from __future__ import annotations

import os
import threading
import time
from collections.abc import Iterator

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from tauledger.engine.protocol import DeadlinePassed, receive, send


@pytest.fixture
def pipe() -> Iterator[tuple[int, int]]:
    """Read and write end of a pipe."""
    read, write = os.pipe()
    yield read, write
    for fd in (read, write):
        try:
            os.close(fd)
        except OSError:
            continue


@settings(derandomize=True, max_examples=40, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(st.lists(st.floats(allow_nan=False)))
def test_floats_cross_bit_for_bit(pipe: tuple[int, int], values: list[float]) -> None:
    send(pipe[1], {"values": values})
    assert receive(pipe[0], time.monotonic() + 5) == {"values": values}


def test_a_frame_larger_than_the_pipe_arrives_whole(pipe: tuple[int, int]) -> None:
    message = {"deck": "x" * 3_000_000}
    writer = threading.Thread(target=send, args=(pipe[1], message))
    writer.start()
    assert receive(pipe[0], time.monotonic() + 10) == message
    writer.join()


def test_half_a_frame_passes_the_deadline(pipe: tuple[int, int]) -> None:
    os.write(pipe[1], (100).to_bytes(8, "big") + b"{")
    with pytest.raises(DeadlinePassed):
        receive(pipe[0], time.monotonic() + 0.05)


def test_the_end_of_the_pipe_is_none(pipe: tuple[int, int]) -> None:
    os.close(pipe[1])
    assert receive(pipe[0], time.monotonic() + 5) is None
