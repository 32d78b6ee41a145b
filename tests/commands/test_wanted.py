"""`--want`: what can be wanted, and one clear message for what cannot."""

from __future__ import annotations

import pytest

from tauledger.asked import Want
from tauledger.commands.wanted import wanted
from tauledger.errors import InputError


def test_every_figure_is_read_as_a_netlist_would_have_its_number() -> None:
    read = wanted(("margin=60", "GAIN_MARGIN = 12 dB", "f_h=1meg", "f_l=20", "f_u=4.7Meg"))
    assert read == (
        Want("margin", 60.0),
        Want("gain_margin", 12.0),
        Want("f_h", 1e6),
        Want("f_l", 20.0),
        Want("f_u", 4.7e6),
    )
    assert wanted(()) == ()


def test_a_least_value_may_be_written_as_one_and_degrees_with_their_sign() -> None:
    assert wanted(("margin>=60°", "f_l<=20")) == (Want("margin", 60.0), Want("f_l", 20.0))
    assert wanted(("margin=60 degrees",)) == wanted(("margin=60deg",)) == (Want("margin", 60.0),)


@pytest.mark.parametrize(
    ("given", "says", "right"),
    [
        ("margin", "--want margin: not a value above 0", "margin=60"),
        ("margin=", "not a value above 0", "margin=60"),
        ("margin=sixty", "--want margin=sixty: not a value above 0", "degrees"),
        ("margin=-5", "not a value above 0", "margin=60"),
        ("margin=180", "--want margin=180: a phase margin lies below 180 degrees", "margin=60"),
        ("margin=60m", "not a value above 0", "degrees"),
        ("margin=60dB", "not a value above 0", "degrees"),
        ("gain_margin=0", "not a value above 0", "gain_margin=12"),
        ("f_h=1M", "M is milli in SPICE", "10meg"),
        ("f_h=0", "no frequency above 0", "f_h=1meg"),
        ("f_l", "no frequency above 0", "f_l=1meg"),
        ("f_u=fast", "not a frequency", "10k"),
        ("f_u<=20meg", "a wanted f_u is a least value", "f_u=5meg"),
        ("f_l>=20", "a wanted f_l is a greatest value", "f_l=20"),
        ("f_h=", "--want f_h=", "10k"),
        ("q=3", "--want q=3: not a figure that can be wanted", "margin=60 (degrees)"),
        ("", "not a figure that can be wanted", "f_h=1meg"),
    ],
)
def test_what_cannot_be_wanted_is_told_with_what_is_right(given: str, says: str, right: str) -> None:
    with pytest.raises(InputError) as error:
        wanted((given,))
    assert says in str(error.value)
    assert right in str(error.value)


def test_a_figure_is_wanted_once() -> None:
    with pytest.raises(InputError, match="f_h is wanted twice"):
        wanted(("f_h=1meg", "F_H=2meg"))
