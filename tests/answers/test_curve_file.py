"""A measured curve as CSV: what is read, and what is said about what cannot be."""

from __future__ import annotations

import pytest

from tauledger.answers.curve_file import MOST_POINTS, read_curve
from tauledger.errors import ExitCode, NetlistError


def test_columns_and_points_stand_in_any_order_and_comments_are_left_out() -> None:
    text = '# analyser 2\r\n\r\n Gain_dB , "f_hz"\r\n-3.5,2e3\r\n  # moved the probe\r\n 39.6 , "1000"\r\n'
    curve = read_curve(text.encode(), "bench.csv")
    assert curve.frequency_hz == (1000.0, 2000.0)
    assert curve.gain_db == (39.6, -3.5)
    assert curve.phase_deg is None


def test_a_byte_order_mark_is_no_part_of_the_first_column() -> None:
    curve = read_curve("\ufefff_hz,gain_db,phase_deg\n1,2,-3\n4,5,6\n".encode(), "bench.csv")
    assert curve.phase_deg == (-3.0, 6.0)


@pytest.mark.parametrize(
    ("text", "place", "message"),
    [
        ("", "1:1", "there is no curve in this file"),
        ("# nothing\n", "1:1", "there is no curve in this file"),
        ("f_hz,gain\n1,2\n", "1:6", "no such column: gain"),
        ("f_hz;gain_db\n1;2\n", "1:5", "the columns stand apart by semicolons, not by commas"),
        ("f_hz\tgain_db\n1\t2\n", "1:5", "the columns stand apart by tabs, not by commas"),
        ("f_hz,gain_db,\n1,2,\n", "1:14", "no such column: no name"),
        ("f_hz,gain_db,gain_db\n1,2,3\n", "1:14", "the column gain_db stands there twice"),
        ("f_hz,phase_deg\n1,2\n", "1:1", "the column gain_db is missing"),
        ("f_hz,gain_db\n1,2\n2;3\n", "3:4", "1 field where the header names 2"),
        ("f_hz,gain_db\n1,2\n2,3,4\n", "3:5", "3 fields where the header names 2"),
        ("f_hz,gain_db\n1,2\n2,  three\n", "3:5", "gain_db is no number: three"),
        ("f_hz,gain_db\n1,2\n2,\n", "3:3", "gain_db is no number: nothing"),
        ("f_hz,gain_db\n1,2\n1_000,3\n", "3:1", "f_hz is no number: 1_000"),
        ("f_hz,gain_db\n1,nan\n2,3\n", "2:3", "gain_db is no number: nan"),
        ("f_hz,gain_db\n0,2\n2,3\n", "2:1", "the frequency must be above 0 Hz"),
        ("f_hz,gain_db\n5,2\n2,3\n5.0,4\n", "4:1", "5.0 Hz stands in line 2 already"),
        ("f_hz,gain_db\n5,4000\n2,3\n", "2:3", "4000 dB is no gain"),
        ("f_hz,gain_db\n5,4\n", "2:1", "1 point: no curve that can be compared"),
    ],
)
def test_what_is_wrong_is_said_at_its_place(text: str, place: str, message: str) -> None:
    with pytest.raises(NetlistError) as caught:
        read_curve(text.encode(), "bench.csv")
    first = caught.value.diagnostics[0]
    assert str(first).startswith(f"bench.csv:{place}: {message}")
    assert first.hint
    assert caught.value.exit_code == ExitCode.UNUSABLE_INPUT


def test_what_is_no_utf_8_is_pointed_at() -> None:
    with pytest.raises(NetlistError) as caught:
        read_curve("f_hz,gain_db\n# µ".encode() + b"\xb5 probe\n1,2\n", "bench.csv")
    assert str(caught.value).startswith("bench.csv:2:4: byte 0xb5 is no UTF-8")


def test_every_faulty_line_is_told_up_to_ten() -> None:
    with pytest.raises(NetlistError) as caught:
        read_curve(b"f_hz,gain_db\n" + b"1,x\n" * 30, "bench.csv")
    assert [fault.line for fault in caught.value.diagnostics] == list(range(2, 12))


def test_a_flood_of_points_is_refused() -> None:
    lines = "".join(f"{k},0\n" for k in range(1, MOST_POINTS + 2))
    with pytest.raises(NetlistError, match=f"give 2 to {MOST_POINTS} points"):
        read_curve(f"f_hz,gain_db\n{lines}".encode(), "bench.csv")


def test_what_could_steer_a_terminal_is_shown_as_a_sign() -> None:
    with pytest.raises(NetlistError) as caught:
        read_curve(b"f_hz,gain_db\n1,\x1b[31m\n", "bench.csv")
    assert "\x1b" not in str(caught.value)


@pytest.mark.parametrize(
    "text", ["", "f_hz,gain\n1,2\n", "f_hz;gain_db\n1;2\n", "f_hz,phase_deg\n1,2\n", "f_hz,gain_db\n1\n"]
)
def test_a_hint_fits_into_eighty_columns(text: str) -> None:
    with pytest.raises(NetlistError) as caught:
        read_curve(text.encode(), "bench.csv")
    assert all(len(one.hint) <= 78 for one in caught.value.diagnostics)
