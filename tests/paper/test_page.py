"""A designer's page: what it may say, and one message with file, line and caret for what it may not."""

from __future__ import annotations

import pytest

from cells import near
from tauledger.errors import InputError, NetlistError
from tauledger.paper.page import read_page

PAGE = """# a comment
f_high = "690k"
gain = -117

[node.b]
resistance = 605
capacitance = "217p"   # with Miller

[device.Q1]
gm = "42m"

[node."x1.in"]
time_constant = 1.3e-7
"""


def test_figures_are_read_with_the_line_they_stand_on() -> None:
    claims = read_page(PAGE, "page.toml").claims
    assert [(c.kind, c.name, c.key, c.place.line) for c in claims] == [
        ("whole", "", "f_high", 2),
        ("whole", "", "gain", 3),
        ("node", "b", "resistance", 6),
        ("node", "b", "capacitance", 7),
        ("device", "Q1", "gm", 10),
        ("node", "x1.in", "time_constant", 13),
    ]
    assert [c.value for c in claims] == near([690e3, -117.0, 605.0, 217e-12, 42e-3, 1.3e-7], rel=1e-12)


def test_dotted_keys_and_inline_tables_are_tables_too() -> None:
    claims = read_page('node.b.resistance = "2.2k"\ndevice = { Q1 = { gm = 0.04 } }\n', "p").claims
    assert [(c.name, c.key, c.value, c.place.line) for c in claims] == [
        ("b", "resistance", 2200.0, 1),
        ("Q1", "gm", 0.04, 2),
    ]


@pytest.mark.parametrize(
    ("text", "line", "column", "says"),
    [
        ("f_high = 690k\n", 1, 13, "this is no TOML"),
        ('f_hihg = "690k"\n', 1, 1, "no such figure: f_hihg"),
        ('\n[node.b]\nresistence = "1k"\n', 3, 1, "no such figure of a node: resistence"),
        ('[node.b]\nresistance = "fast"\n', 2, 1, "resistance is not a number"),
        ('[node.b]\nresistance = "4k5"\n', 2, 1, "resistance is not a number"),
        ("[node.b]\n  resistance = -5\n", 2, 3, "resistance must be positive"),
        ("[node.b]\nresistance = true\n", 2, 1, "resistance is not a number"),
        ("[node.b]\nresistance = inf\n", 2, 1, "resistance is not a number"),
        ("gain = 0\n", 1, 1, "gain must be other than 0"),
        ('f_high = "2M"\n', 1, 1, "M is milli in SPICE"),
        ('f_high = "2 MHz"\n', 1, 1, "M is milli in SPICE"),
        ('[node.b]\ncapacitance = "33e-12 F"\n', 2, 1, "F is femto in SPICE"),
        ('f_high = "60 dB"\n', 1, 1, "only a gain is in dB"),
        ('gain = "1e9 dB"\n', 1, 1, "gain is not a number"),
        ('gain = "6 1 5"\n', 1, 1, "gain is not a number"),
        ("node = 3\n", 1, 1, "node is a table of tables"),
        ("[node]\nb = 3\n", 1, 2, "node is a table of tables"),
        ('[node.b]\nresistance = "1k"\n[node.b]\n', 3, 8, "this is no TOML"),
        ("f_high = ", 1, 10, "this is no TOML"),
    ],
)
def test_what_cannot_be_used_is_one_message_with_its_place(text: str, line: int, column: int, says: str) -> None:
    with pytest.raises(NetlistError) as caught:
        read_page(text, "page.toml")
    (diagnostic,) = caught.value.diagnostics
    assert (diagnostic.file, diagnostic.line, diagnostic.column) == ("page.toml", line, column)
    assert diagnostic.message.startswith(says) or says in diagnostic.message
    assert diagnostic.hint


def test_a_page_without_a_figure_says_how_to_write_one() -> None:
    with pytest.raises(InputError, match="there is no figure on this page"):
        read_page("# nothing\n[node.b]\n", "page.toml")


@pytest.mark.parametrize(
    ("line", "value"),
    [
        ('gain = "61.5dB"', 1188.5),
        ('gain = "61.5 dB"', 1188.5),
        ('gain = "-20 db"', 0.1),
        ('gain = "0 dB"', 1.0),
        ('gain = "61.5"', 61.5),
        ('gain = "-95.8 V/V"', -95.8),
        ('f_high = "271 kHz"', 271e3),
        ('f_low = "1.4 k"', 1.4e3),
        ('node.b.resistance = "1 kohm"', 1e3),
        ('node.b.resistance = "1.373 kΩ"', 1373.0),
        ('node.b.capacitance = "217 pF"', 217e-12),
        ('node.b.miller_gain = "20 dB"', 10.0),
        ('device.M1.gm_over_i = "18.2 1/V"', 18.2),
        ('device.M1.gm_over_i = "18.2/V"', 18.2),
        ('device.M1.v_gs = "-0.7 V"', -0.7),
    ],
)
def test_units_stand_behind_a_blank_or_none(line: str, value: float) -> None:
    (claim,) = read_page(line + "\n", "p").claims
    assert claim.value == near(value, rel=1e-4)
