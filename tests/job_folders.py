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


RAW: dict[str, str] = {
    "job.toml": """\
title = "Raw test job"

[frame]
kind = "plane"

[defaults]
instrument = "TS1"
levels_instrument = "NA2"
target = "round"

[instruments.TS1]
direction_arcsec = 1.5
zenith_arcsec = 2.0
distance_mm = 1.0
distance_ppm = 1.5
centring_mm = 0.4
target_centring_mm = 0.6
height_mm = 0.5
edm_wavelength_nm = 658
edm_reference_index = 1.0002863
edm_scale_ppm = 0.5
collimation_arcsec = 4.0
index_arcsec = -6.0

[instruments.NA2]
level_mm_per_sqrt_km = 0.7
level_mm_per_setup = 0.2
level_collimation_arcsec = 3.0

[targets.round]
constant_mm = -34.4
centring_mm = 0.3

[targets.mini]
constant_mm = 17.5
""",
    "marks.csv": """\
mark,easting_m,northing_m,height_m,plan_control,height_control
001,1000.000,1000.000,100.000,fixed,fixed
002,1000.000,1200.000,101.500,fixed,fixed
A,,,,,
B,,,,,
""",
    "pointings.csv": """\
setup,at,to,round,face,circle_dms,zenith_dms,slope_m,instrument_height_m,target_height_m,target,temperature_c,pressure_hpa,humidity_percent
S1,001,002,1,L,0-00-05,89-34-20,200.0373,1.550,1.550,,18.0,985.0,60
S1,001,A,1,L,63-26-10,90-12-01,223.6420,,1.600,mini,,,
S1,001,B,1,L,101-10-20,90-00-10,150.1000,,,,,,
S1,001,B,1,R,281-10-10,269-59-40,150.1004,,,,,,
S1,001,A,1,R,243-26-02,269-47-49,223.6424,,,mini,,,
S1,001,002,1,R,180-00-01,270-25-30,200.0377,,,,,,
S1,001,002,2,L,90-02-11,89-34-22,200.0375,,,,18.5,985.2,
S1,001,A,2,L,153-28-15,,,,,,,,
S1,001,A,2,R,333-28-09,,,,,,,,
S1,001,002,2,R,270-02-05,270-25-29,200.0374,,,,,,
S2,A,001,,,12-00-00,89-47-50,223.6430,1.520,1.550,,19.0,984.0,55
S2,A,B,,,310-00-07,89-30-01,130.0010,,,,,,
""",
    "level_book.csv": """\
line,point,backsight_m,intermediate_m,foresight_m,backsight_distance_m,foresight_distance_m
a,001,1.4321,,,38,
a,TP1,1.1210,,1.6650,40,36
a,A,1.2000,,1.6678,30,41
a,B,,1.4300,,,25
a,,1.5010,,1.3005,33,31
a,002,,,1.2200,,30
""",
}
"""A plane job of raw readings: two faces, a round without a target, single faces, turning points, a side shot."""


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
