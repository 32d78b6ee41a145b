"""The review as JSON, document `tauledger.review/1`, and the JSON schema that ships with it."""

from __future__ import annotations

import math
from typing import Any

import msgspec

from tauledger.record import SCHEMA, Review

SCHEMA_FILE = "review.schema.json"


def to_json(review: Review) -> bytes:
    """Give the review as one line of UTF-8 JSON: plain SI numbers, null where there is none, the record's field order.

    Equal reviews give equal bytes. What is not finite becomes null, for JSON has no NaN.
    """
    return msgspec.json.encode(finite(msgspec.to_builtins(review))) + b"\n"


def schema() -> dict[str, Any]:
    """Give the JSON schema of the document, from the records themselves.

    It ships as `review.schema.json`; after a change of a record write it anew with `python -c "from
    tauledger.report.json import schema_text; print(schema_text(), end='')"`.
    """
    found = msgspec.json.schema(Review)
    found["$defs"][Review.__name__]["properties"]["schema"] = {"const": SCHEMA}
    return {"$schema": "https://json-schema.org/draft/2020-12/schema", "$id": SCHEMA, **found}


def schema_text() -> str:
    """Give the schema as the text of the file that ships."""
    return msgspec.json.format(msgspec.json.encode(schema()), indent=1).decode() + "\n"


def finite(value: Any) -> Any:
    """Put what JSON has in the place of what it has not: null for numbers that are not finite, `\\udce9` for a byte."""
    if isinstance(value, float):
        return value if math.isfinite(value) else None
    if isinstance(value, str):
        # A path may hold bytes that are no text; JSON has no way to say so but as they are shown.
        return value.encode(errors="backslashreplace").decode()
    if isinstance(value, dict):
        return {name: finite(entry) for name, entry in value.items()}
    if isinstance(value, list | tuple):
        return [finite(entry) for entry in value]
    return value
