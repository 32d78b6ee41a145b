"""Lines of text: columns line up, numbers keep their units, long names get room, empty lines are spent with care."""

from __future__ import annotations

from hypothesis import given, settings
from hypothesis import strategies as st

from tauledger.report.layout import SYMBOLS, Prose, Row, Section, Table, cells, lay_out, spell


def lines(*sections: Section, unicode: bool = True, page: int = 60) -> list[str]:
    return [line.text for line in lay_out(sections, width=80, unicode=unicode, page=page)]


def test_a_number_is_never_parted_from_its_unit() -> None:
    for blanks in range(40):
        text = lines(Section((Prose("x " * blanks + "falls at 589.1 kHz by 3 dB, 12 % of 100 µF and 4.7 kΩ " * 2),)))
        assert not any(line.endswith(("589.1", " 3", " 12", "100", "4.7")) for line in text)


@settings(derandomize=True, max_examples=50)
@given(st.lists(st.text("abcµΩ ", min_size=1, max_size=20), max_size=30), st.booleans())
def test_prose_keeps_every_word_and_the_width(words: list[str], unicode: bool) -> None:
    said = " ".join(words)
    text = lines(Section((Prose(said, lead="  lead  "),)), unicode=unicode)
    assert " ".join(text).split() == f"lead {spell(said, unicode=unicode)}".split()
    assert all(cells(line) <= 80 for line in text)
    assert all(line.startswith("        ") for line in text[1:])


def test_numbers_end_in_the_same_column_in_both_spellings() -> None:
    table = Table("lr", ("", "R"), (Row(("a", "10 Ω")), Row(("b", "4.7 kΩ"))))
    for unicode in (True, False):
        assert len({cells(line) for line in lines(Section((table,)), unicode=unicode)}) == 1


def test_a_name_that_is_too_long_stands_on_a_line_of_its_own() -> None:
    name = "receiver.channel_b." * 5
    table = Table("lrr", ("NODE", "R", "C"), (Row((name, "10 Ω", "1 pF")), Row(("b", "10 Ω", "1 pF"))))
    head, own, numbers, other = lines(Section((table,)))
    assert own == f"  {name}"
    assert numbers.split() == ["10", "Ω", "1", "pF"]
    assert len(head) == len(numbers) == len(other)


def test_every_symbol_has_its_ascii() -> None:
    assert spell(SYMBOLS, unicode=False).isascii()


def test_empty_lines_are_spent_only_as_far_as_the_page_allows() -> None:
    sections = [Section((Prose("a"),), major=True), Section((Prose("b"),)), Section((Prose("c"),), major=True)]
    assert lines(*sections, page=5) == ["a", "", "b", "", "c"]
    assert lines(*sections, page=4) == ["a", "b", "", "c"]
    assert lines(*sections, page=3) == ["a", "b", "c"]
    assert lines(*sections, page=2) == ["a", "", "b", "", "c"], "longer than a page anyway"


def test_an_empty_section_leaves_no_gap() -> None:
    assert lines(Section((Prose("a"),)), Section(()), Section((Prose("b"),))) == ["a", "", "b"]
