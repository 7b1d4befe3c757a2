"""The published JSON Schema of results.json: what it says, and that every result keeps it."""

from __future__ import annotations

import copy
import json
from pathlib import Path
from typing import Any

import jsonschema
import numpy as np
import pytest

from adjust import FieldDataError
from adjust.reports.saved import published_schema, read_results
from tests.exported import ALL, SPECIFIED, plain_of, text_of

PUBLISHED = Path(__file__).parents[1] / "docs" / "results.schema.json"
SCHEMA: dict[str, Any] = json.loads(PUBLISHED.read_text("utf-8"))
VALIDATOR = jsonschema.Draft202012Validator(SCHEMA)


def closed(schema: Any) -> Any:
    """The schema without room for keys that it does not describe."""
    if isinstance(schema, list):
        return [closed(entry) for entry in schema]
    if not isinstance(schema, dict):
        return schema
    sealed = {key: closed(value) for key, value in schema.items()}
    return sealed | {"additionalProperties": False} if "properties" in schema else sealed


def test_the_published_schema_is_that_of_the_records_and_a_schema() -> None:
    """Written with: python -c "from adjust.reports.saved import published_schema as s; print(s(), end='')"."""
    assert PUBLISHED.read_text("utf-8") == published_schema()
    jsonschema.Draft202012Validator.check_schema(SCHEMA)
    assert SCHEMA["$schema"] == "https://json-schema.org/draft/2020-12/schema"


@pytest.mark.parametrize("name", ALL)
def test_every_result_keeps_the_schema(name: str) -> None:
    VALIDATOR.validate(plain_of(name))


@pytest.mark.parametrize("name", ALL)
def test_every_key_that_is_written_is_described(name: str) -> None:
    jsonschema.Draft202012Validator(closed(SCHEMA)).validate(plain_of(name))


@pytest.mark.parametrize("name", ALL)
def test_results_read_back_as_they_were_written(name: str, tmp_path: Path) -> None:
    (tmp_path / "results.json").write_text(text_of(name), "utf-8")
    read = read_results(tmp_path)
    assert read == read_results(tmp_path / "results.json")
    assert json.loads(read.model_dump_json(by_alias=True)) == plain_of(name)


def places(record: Any, path: tuple[Any, ...] = ()) -> list[tuple[Any, ...]]:
    """Paths of all entries, of lists only the first."""
    if isinstance(record, dict):
        return [(*path, key) for key in record] + [p for key in record for p in places(record[key], (*path, key))]
    return [(*path, 0), *places(record[0], (*path, 0))] if isinstance(record, list) and record else []


@pytest.mark.parametrize("wrong", ["x", -1.5, [], {}])
def test_schema_and_reader_refuse_the_same_wrong_values(wrong: Any, tmp_path: Path) -> None:
    """Each entry in turn is replaced by something else."""
    plain = plain_of(SPECIFIED)
    refused = 0
    for path in places(plain):
        changed = copy.deepcopy(plain)
        inner = changed
        for key in path[:-1]:
            inner = inner[key]
        inner[path[-1]] = wrong
        (tmp_path / "results.json").write_text(json.dumps(changed), "utf-8")
        if VALIDATOR.is_valid(changed):
            read_results(tmp_path)
        else:
            refused += 1
            with pytest.raises(FieldDataError, match=r"results\.json: .*adjust the job again"):
                read_results(tmp_path)
    assert refused > len(places(plain)) / 3


def test_what_is_no_results_file_is_refused_in_words(tmp_path: Path) -> None:
    with pytest.raises(FieldDataError, match=r"cannot be read .*give a results\.json that hubtack adjust wrote"):
        read_results(tmp_path)
    rng = np.random.default_rng(5)
    for content in (b"", b"{", b"[1]", b"null", b'{"schema": "other/2"}', rng.bytes(100), b"\xff\xfe"):
        (tmp_path / "results.json").write_bytes(content)
        with pytest.raises(FieldDataError, match=r"results\.json: "):
            read_results(tmp_path)


def test_not_a_number_is_refused(tmp_path: Path) -> None:
    (tmp_path / "results.json").write_text(text_of("dam_control").replace('"w": ', '"w": NaN, "x": ', 1), "utf-8")
    with pytest.raises(FieldDataError):
        read_results(tmp_path)
