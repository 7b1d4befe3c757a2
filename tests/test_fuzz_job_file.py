"""Whatever stands in `job.toml`, reading it ends in a job or in a FieldDataError."""

from __future__ import annotations

import pytest
from hypothesis import example, given, settings
from hypothesis import strategies as st

from adjust.field_book.job_file import DEFAULT_KEYS, DatumSection, FrameSection, Instrument, JobFile, StatisticsSection
from adjust.field_book.schema import TABLES
from tests.job_folders import ELLIPSOID, PLANE
from tests.test_fuzz_field_book import mangled, quickly, read

KEYS = sorted(
    {
        *JobFile.model_fields,
        *FrameSection.model_fields,
        *DatumSection.model_fields,
        *Instrument.model_fields,
        *StatisticsSection.model_fields,
        *DEFAULT_KEYS,
        *TABLES,
        "TS1",
        "x",
        '"a b"',
        '""',
    }
)
VALUES = [
    "1", "-1", "0", "1.5", "1e300", "1e-300", "nan", "inf", "-inf", "true", "[]", "{}", '""', '"A"', '"001"',
    '["A", "A"]', "[[1]]", '["A", 3]', "2026-04-18", "2026-04-18T07:30:00Z", "07:30:00", '"plane"',
    '"ellipsoid"', '"EPSG:25832"', '"EPSG:4978"', '"inner"', '"TS1"', '"levels.csv"', '["levels.csv"]', '".."',
    '"/"', '"\\u0000"', "'''\n'''", "{ a = 1 }", "9" * 400, '"+proj=utm +zone=32"', '"+proj=nonsense"',
    '"marks.csv"', "{ kind = 'plane' }",
]  # fmt: skip
SECTIONS = ["", *(f"[{name}]" for name in JobFile.model_fields), "[instruments.TS1]", "[x.y]", "[[frame]]", "[ frame ]"]


@pytest.mark.parametrize("base", [PLANE, ELLIPSOID], ids=["plane", "ellipsoid"])
@quickly
@given(data=st.data())
def test_mangled_job_files(base: dict[str, str], data: st.DataObject) -> None:
    read({**base, "job.toml": data.draw(mangled(base["job.toml"]))})


lines = st.one_of(
    st.sampled_from(SECTIONS), st.builds("{} = {}".format, st.sampled_from(KEYS), st.sampled_from(VALUES))
)


@pytest.mark.parametrize("base", [PLANE, ELLIPSOID], ids=["plane", "ellipsoid"])
@settings(quickly, max_examples=100)
@given(written=st.lists(lines, max_size=8))
@example(written=["[frame]", 'kind = "ellipsoid"', 'crs = "\\u0000"'])
@example(written=["[datum]", 'mode = "inner"', 'marks = ["\\u0000"]'])
@example(written=["[tables]", 'levels = "\\u0000"'])
@example(written=["[instruments.TS1]", "distance_mm = " + "9" * 400])
def test_invented_job_files(base: dict[str, str], written: list[str]) -> None:
    read({**base, "job.toml": "\n".join(written)})


@pytest.mark.parametrize("key", KEYS)
@settings(quickly, max_examples=8)
@given(section=st.sampled_from(SECTIONS), value=st.sampled_from(VALUES))
def test_any_value_for_any_key(key: str, section: str, value: str) -> None:
    read({**ELLIPSOID, "job.toml": f"{section}\n{key} = {value}\n"})


@quickly
@given(content=st.binary(max_size=200))
def test_bytes_for_a_job_file(content: bytes) -> None:
    read({**PLANE, "job.toml": content})
