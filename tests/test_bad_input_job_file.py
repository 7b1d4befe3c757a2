"""Every mistake in `job.toml` is reported with its line and its key, what was read and what would be right."""

from __future__ import annotations

from pathlib import Path

import pytest

from tests.job_folders import ELLIPSOID, PLANE, mistakes_of

DATUM = "[datum]\n"
LAST = len(PLANE["job.toml"].splitlines())
"""Lines of the plane job's file; what a test adds to it stands below."""

# Text added to the plane job: line (counted from its end), key, words.
ADDED = {
    "unknown section": ("[statistic]\n", 1, "statistic", ("unknown key", "'statistics'")),
    "unknown key": ("[statistics]\nconfidense = 0.9\n", 2, "statistics.confidense", ("unknown", "'confidence'")),
    "unknown key of an instrument": (
        "[instruments.T]\ndirection_arcsecs = 1\n",
        2,
        "instruments.T.direction_arcsecs",
        ("unknown", "'direction_arcsec'"),
    ),
    "unknown table": ('[tables]\nlevls = "a.csv"\n', 2, "tables.levls", ("unknown", "'levels'")),
    "a number as text": (
        '[instruments.T]\ndirection_arcsec = "1.5"\n',
        2,
        "instruments.T.direction_arcsec",
        ("'1.5'", "a number"),
    ),
    "a truth value for a number": (
        "[instruments.T]\ndistance_mm = true\n",
        2,
        "instruments.T.distance_mm",
        ("'true'", "a number"),
    ),
    "zero sd": ("[instruments.T]\nzenith_arcsec = 0\n", 2, "instruments.T.zenith_arcsec", ("'0'", "or more")),
    "negative sd": ("[instruments.T]\ndistance_mm = -1\n", 2, "instruments.T.distance_mm", ("'-1'", "0.0 or more")),
    "not a number": ("[instruments.T]\ndistance_mm = nan\n", 2, "instruments.T.distance_mm", ("'nan'", "finite")),
    "infinite": ("[instruments.T]\ndistance_mm = inf\n", 2, "instruments.T.distance_mm", ("'inf'", "finite")),
    "an instrument that is a number": (
        "[instruments.T]\n[instruments]\nU = 3\n",
        3,
        "instruments.U",
        ("'3'", "section"),
    ),
    "confidence in percent": ("[statistics]\nconfidence = 95\n", 2, "statistics.confidence", ("'95'", "below 1.0")),
    "unknown basis": (
        '[statistics]\nsd_basis = "postrior"\n',
        2,
        "statistics.sd_basis",
        ("'postrior'", "'prior' or 'posterior'", "did you mean 'posterior'"),
    ),
    "unknown datum": ('[datum]\nmode = "free"\n', 2, "datum.mode", ("'free'", "'control' or 'inner'")),
    "unknown datum mark": (
        '[datum]\nmode = "inner"\nmarks = ["A", "01"]\n',
        3,
        "datum.marks",
        ("'01'", "not a mark", "'001'"),
    ),
    "datum mark twice": ('[datum]\nmode = "inner"\nmarks = ["A", "A"]\n', 3, "datum.marks", ("'A' twice", "once")),
    "no datum mark": ('[datum]\nmode = "inner"\nmarks = []\n', 3, "datum.marks", ("at least one",)),
    "datum marks with control": ('[datum]\nmarks = ["A"]\n', 2, "datum.marks", ("inner",)),
    "one datum mark as text": ('[datum]\nmode = "inner"\nmarks = "A"\n', 3, "datum.marks", ("'A'", "list")),
    "a file that is not there": (
        '[tables]\nvectors = "gnss.csv"\n',
        2,
        "tables.vectors",
        ("'gnss.csv'", "no such file"),
    ),
    "a number for a file": ("[tables]\nvectors = 3\n", 2, "tables.vectors", ("'3'", "list")),
    "no file": ("[tables]\nvectors = []\n", 2, "tables.vectors", ("at least one",)),
    "a file twice": (
        '[tables]\nlevels = ["levels.csv", "./levels.csv"]\n',
        2,
        "tables.levels",
        ("'./levels.csv'", "once"),
    ),
    "a file for two tables": (
        '[tables]\nvectors = "levels.csv"\nlevels = "levels.csv"\n',
        2,
        "tables.vectors",
        ("levels", "once"),
    ),
}

# Replaced text of the plane job: line, key, words.
REPLACED = {
    "unknown frame": ('kind = "plane"', 'kind = "plan"', 5, "frame.kind", ("'plan'", "did you mean 'plane'")),
    "title without quotation marks": (
        'title = "Plane test job"',
        "title = Plane test job",
        1,
        None,
        ("not valid TOML", "quotation marks"),
    ),
    "a number for a title": ('title = "Plane test job"', "title = 7", 1, "title", ("'7'", "quotation marks")),
    "a time for a date": ("date = 2026-04-18", "date = 07:30:00", 2, "date", ("'07:30:00'", "2026-04-18")),
    "an impossible date": ("date = 2026-04-18", "date = 2026-02-30", 2, None, ("not valid TOML",)),
    "a key twice": ('kind = "plane"', 'kind = "plane"\nkind = "plane"', 6, None, ("not valid TOML",)),
    "a section that is a value": ('[frame]\nkind = "plane"', "[x_frame]\n[x.y]", 4, "x_frame", ("unknown key",)),
    "a missing bracket": ("[frame]", "[frame", 4, None, ("not valid TOML",)),
    "unknown default instrument": (
        'instrument = "TS1"',
        'instrument = "TS"',
        8,
        "defaults.instrument",
        ("'TS'", "no [instruments.TS]", "'TS1'"),
    ),
    "unknown default": (
        "levels_instrument",
        "level_instrument",
        9,
        "defaults.level_instrument",
        ("unknown key", "'levels_instrument'"),
    ),
    "a CRS in a plane": (
        'kind = "plane"',
        'kind = "plane"\ncrs = "EPSG:25832"',
        6,
        "frame.crs",
        ("ellipsoid frame", "take it away"),
    ),
    "heights in a plane": (
        'kind = "plane"',
        'kind = "plane"\nheights = "orthometric"',
        6,
        "frame.heights",
        ("ellipsoid frame",),
    ),
    "a geoid in a plane": (
        'kind = "plane"',
        'kind = "plane"\ngeoid_grid = "g.tif"',
        6,
        "frame.geoid_grid",
        ("ellipsoid frame",),
    ),
    "curvature by number": (
        'kind = "plane"',
        'kind = "plane"\nearth_curvature = 1',
        6,
        "frame.earth_curvature",
        ("'1'", "true or false"),
    ),
    "refraction out of this world": (
        'kind = "plane"',
        'kind = "plane"\nrefraction_coefficient = 13',
        6,
        "frame.refraction_coefficient",
        ("'13'", "below 10"),
    ),
}  # fmt: skip

# Replaced text of the ellipsoid job: line, key, words.
ON_THE_ELLIPSOID = {
    "no CRS": ('crs = "EPSG:25832"\n', "", 3, "frame.crs", ("missing", 'crs = "EPSG:25832"')),
    "unknown CRS": ("EPSG:25832", "EPSG:999999", 5, "frame.crs", ("EPSG:999999",)),
    "a CRS by number": ('"EPSG:25832"', "25832", 5, "frame.crs", ("'25832'", "quotation marks")),
    "unknown heights": (
        '"ellipsoidal"',
        '"ellipsoid"',
        6,
        "frame.heights",
        ("'ellipsoid'", "did you mean 'ellipsoidal'"),
    ),
    "curvature of an ellipsoid": (
        'heights = "ellipsoidal"',
        "earth_curvature = true",
        6,
        "frame.earth_curvature",
        ("plane frame",),
    ),
    "no such geoid grid": (
        'heights = "ellipsoidal"',
        'geoid_grid = "geoid.tif"',
        6,
        "frame.geoid_grid",
        ("geoid.tif", "job folder"),
    ),
    "a geoid grid that is none": (
        'heights = "ellipsoidal"',
        'geoid_grid = "marks.csv"',
        6,
        "frame.geoid_grid",
        ("marks.csv", "no vertical grid"),
    ),
}


def assert_told(
    folder: Path, base: dict[str, str], text: str, place: tuple[int, str | None], words: tuple[str, ...]
) -> None:
    found = mistakes_of(folder, base, {"job.toml": text})
    meant = [mistake for mistake in found if (mistake.line, mistake.column) == place and mistake.file == "job.toml"]
    assert any(all(word in mistake.message for word in words) for mistake in meant), "\n".join(map(str, found))


@pytest.mark.parametrize("name", ADDED)
def test_added_to_a_job_file(name: str, tmp_path: Path) -> None:
    text, line, key, words = ADDED[name]
    assert_told(tmp_path, PLANE, PLANE["job.toml"] + text, (LAST + line, key), words)


@pytest.mark.parametrize("name", REPLACED)
def test_replaced_in_a_job_file(name: str, tmp_path: Path) -> None:
    old, new, line, key, words = REPLACED[name]
    assert old in PLANE["job.toml"]
    assert_told(tmp_path, PLANE, PLANE["job.toml"].replace(old, new, 1), (line, key), words)


@pytest.mark.parametrize("name", ON_THE_ELLIPSOID)
def test_replaced_in_a_job_file_on_the_ellipsoid(name: str, tmp_path: Path) -> None:
    old, new, line, key, words = ON_THE_ELLIPSOID[name]
    assert ELLIPSOID["job.toml"].count(old) == 1
    assert_told(tmp_path, ELLIPSOID, ELLIPSOID["job.toml"].replace(old, new), (line, key), words)


def test_all_mistakes_of_a_job_file_at_once(tmp_path: Path) -> None:
    text = PLANE["job.toml"].replace('"plane"', '"plan"').replace("1.5", "-1.5") + "[datum]\nmod = 3\n"
    found = mistakes_of(tmp_path, PLANE, {"job.toml": text})
    keys = ["frame.kind", "instruments.TS1.direction_arcsec", "instruments.TS1.distance_ppm", "datum.mod"]
    assert [mistake.column for mistake in found] == keys


def test_mistaken_instruments_do_not_trouble_their_rows(tmp_path: Path) -> None:
    text = PLANE["job.toml"].replace("direction_arcsec = 1.5", "direction_arcsec = 0")
    found = mistakes_of(tmp_path, PLANE, {"job.toml": text})
    assert [mistake.file for mistake in found] == ["job.toml"]


@pytest.mark.parametrize(
    "text",
    [
        "a = " + "[" * 5000,
        "a = " + "9" * 5000,
        "a = 1" + "0" * 400 + "\n[frame]\nrefraction_coefficient = 1" + "0" * 400,
    ],
)
def test_monstrous_toml(text: str, tmp_path: Path) -> None:
    assert mistakes_of(tmp_path, PLANE, {"job.toml": text})[0].file == "job.toml"
