"""The JSON document: its schema ships, its bytes repeat, and nothing in it is not a number."""

from __future__ import annotations

import json
import math
from importlib.resources import files
from typing import Any

import jsonschema
import pytest
from msgspec import Struct
from msgspec.structs import fields, replace

from report.literal import ECHO_PREAMP
from tauledger.record import SCHEMA, Review
from tauledger.report.json import SCHEMA_FILE, schema, schema_text, to_json


def document(review: Review = ECHO_PREAMP) -> dict[str, Any]:
    loaded = json.loads(to_json(review), parse_constant=lambda text: pytest.fail(f"{text} is no JSON"))
    assert isinstance(loaded, dict)
    return loaded


def test_the_schema_that_ships_is_the_one_of_the_records() -> None:
    """After a change of a record write it anew as the docstring of `schema` says."""
    assert files("tauledger.report").joinpath(SCHEMA_FILE).read_text(encoding="utf-8") == schema_text()


def test_the_document_fits_its_schema() -> None:
    jsonschema.Draft202012Validator.check_schema(schema())
    jsonschema.validate(document(), schema())


@pytest.mark.parametrize(
    ("field", "wrong"), [("schema", "tauledger.review/2"), ("temperature_c", "27"), ("parts", None), ("poles", [{}])]
)
def test_the_schema_refuses_what_is_wrong(field: str, wrong: object) -> None:
    with pytest.raises(jsonschema.ValidationError):
        jsonschema.validate({**document(), field: wrong}, schema())


def test_a_reader_may_meet_fields_that_it_does_not_know() -> None:
    jsonschema.validate({**document(), "added_later": 1}, schema())


def test_every_field_of_the_records_is_in_the_document_in_their_order() -> None:
    def same(record: Any, told: Any) -> None:
        if isinstance(record, Struct):
            names = [field.encode_name for field in fields(record)]
            assert list(told) == names
            for field, name in zip(fields(record), names, strict=True):
                same(getattr(record, field.name), told[name])
        elif isinstance(record, tuple):
            assert len(record) == len(told)
            for one, other in zip(record, told, strict=True):
                same(one, other)
        else:
            assert record == told

    same(ECHO_PREAMP, document())
    assert next(iter(document())) == "schema"
    assert document()["schema"] == SCHEMA


def test_equal_reviews_give_equal_bytes() -> None:
    assert to_json(replace(ECHO_PREAMP)) == to_json(ECHO_PREAMP)
    assert to_json(ECHO_PREAMP).endswith(b"}\n")
    assert to_json(ECHO_PREAMP).count(b"\n") == 1


def test_what_is_not_finite_becomes_null() -> None:
    assert ECHO_PREAMP.agreement is not None
    agreement = replace(ECHO_PREAMP.agreement, max_relative_error=math.nan, at_hz=math.inf)
    told = document(replace(ECHO_PREAMP, agreement=agreement))["agreement"]
    assert told == {"max_relative_error": None, "at_hz": None, "points": 261}


def test_a_path_that_is_no_text_is_shown_as_its_bytes() -> None:
    netlist = replace(ECHO_PREAMP.netlist, path="caf\udce9.cir")
    assert document(replace(ECHO_PREAMP, netlist=netlist))["netlist"]["path"] == "caf\\udce9.cir"
