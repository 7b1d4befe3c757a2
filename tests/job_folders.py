"""Small job folders for tests: invented tables with every kind of observation, which a test changes as it needs."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path

import pytest

from adjust import FieldDataError, Job, read_job
from adjust.errors import Mistake

Files = Mapping[str, str | bytes | None]
"""Contents by name; None: no such file."""

PLANE: dict[str, str] = {
    "job.toml": """\
title = "Plane test job"
date = 2026-04-18

[frame]
kind = "plane"

[defaults]
instrument = "TS1"
levels_instrument = "NA2"

[instruments.TS1]
direction_arcsec = 1.5
zenith_arcsec = 2.0
distance_mm = 1.0
distance_ppm = 1.5
centring_mm = 0.4
target_centring_mm = 0.6
height_mm = 0.5

[instruments.NA2]
level_mm_per_sqrt_km = 0.7
""",
    "marks.csv": """\
mark,easting_m,northing_m,height_m,plan_control,height_control
001,1000.000,2000.000,50.000,fixed,fixed
002,1400.000,2000.000,52.000,fixed,fixed
A,1200.0,2300.0,51.0,,
B,1500.0,2400.0,,,
""",
    "directions.csv": """\
setup,at,to,direction_dms
S1,001,002,0-00-00.0
S1,001,A,303-41-24.2
S1,001,B,321-20-24.7
S2,A,001,0-00-00.0
S2,A,002,292-37-11.5
""",
    "angles.csv": """\
at,from,to,angle_gon
002,001,A,62.5666
""",
    "azimuths.csv": """\
at,to,azimuth_deg,sd_arcsec
A,B,71.5651,3
""",
    "distances.csv": """\
at,to,slope_m,instrument_height_m,target_height_m
001,A,360.5567,1.55,1.60
A,B,316.2346,1.52,1.60
""",
    "zeniths.csv": """\
at,to,zenith_deg,instrument_height_m,target_height_m
001,A,89.8346,1.55,1.60
""",
    "levels.csv": """\
from,to,rise_m,length_km
001,A,1.0002,0.4
A,B,2.0001,0.5
""",
}
"""A plane job of every kind that a plane frame holds."""

ELLIPSOID: dict[str, str] = {
    "job.toml": """\
title = "Ellipsoid test job"

[frame]
kind = "ellipsoid"
crs = "EPSG:25832"
heights = "ellipsoidal"
""",
    "marks.csv": """\
mark,easting_m,northing_m,height_m,plan_control,height_control
P1,500000.000,5400000.000,400.000,fixed,fixed
P2,501000.000,5400500.000,410.000,,
""",
    "vectors.csv": """\
from,to,dx_m,dy_m,dz_m,sd_x_mm,sd_y_mm,sd_z_mm,corr_xy,corr_xz,corr_yz
P1,P2,-521.540,930.331,337.251,5,4,6,0.2,0.5,0.3
""",
}
"""A small GNSS job on the ellipsoid."""


def write_folder(folder: Path, files: Files) -> Path:
    """Put files into a folder."""
    folder.mkdir(parents=True, exist_ok=True)
    for name, content in files.items():
        place = folder / name
        place.parent.mkdir(parents=True, exist_ok=True)
        if isinstance(content, bytes):
            place.write_bytes(content)
        elif content is not None:
            place.write_text(content, encoding="utf-8", newline="")
    return folder


def job_of(folder: Path, base: Files, changes: Files | None = None) -> Job:
    """Read a job of `base` with some files changed, added or, where None, left out."""
    return read_job(write_folder(folder, {**base, **(changes or {})}))


def mistakes_of(folder: Path, base: Files, changes: Files | None = None) -> tuple[Mistake, ...]:
    """The mistakes of a job that cannot be read."""
    with pytest.raises(FieldDataError) as caught:
        job_of(folder, base, changes)
    return caught.value.mistakes


def changed(table: str, old: str, new: str, base: Mapping[str, str] = PLANE) -> Files:
    """`base` with one piece of one table's text replaced; the piece must be there."""
    text = base[table]
    assert text.count(old) == 1, f"{old!r} stands {text.count(old)} times in {table}"
    return {**base, table: text.replace(old, new)}
