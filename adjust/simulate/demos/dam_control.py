"""A dam's control on the ellipsoid: GNSS vectors, total-station rounds and levels in one adjustment."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from adjust.arrays import FloatArray, IntArray
from adjust.field_book.cells import Style
from adjust.field_book.writing import JobFolder, describe_job
from adjust.frames import EllipsoidFrame
from adjust.job import Job, Marks
from adjust.observations import Observations
from adjust.simulate.demos.demo import Demo, named, noted, numbers_of, occupations, with_lengths
from adjust.simulate.equipment import Equipment
from adjust.simulate.networks import assemble, place_marks
from adjust.simulate.observing import observe
from adjust.units import ARCSEC

SEED = 20260914
CRS = "EPSG:25833"

MARKS = (
    ("REF1", 597214.382, 5228961.507, 712.438, "GNSS reference, western ridge"),
    ("REF2", 600127.944, 5229874.216, 688.902, "GNSS reference, northern shoulder"),
    ("REF3", 599308.175, 5226541.833, 655.317, "GNSS reference, chapel hill; an older survey"),
    ("P1", 598702.418, 5228310.264, 441.826, "observation pillar, left bank, upstream"),
    ("P2", 598986.731, 5228432.157, 447.390, "observation pillar, left bank, downstream"),
    ("P3", 599041.206, 5227988.940, 439.174, "observation pillar, right bank, downstream"),
    ("P4", 598688.553, 5227921.375, 444.618, "observation pillar, right bank, upstream"),
    ("D1", 598822.114, 5228248.402, 452.105, "crest bolt, left abutment"),
    ("D2", 598841.960, 5228166.718, 452.122, "crest bolt"),
    ("D3", 598849.377, 5228083.255, 452.098, "crest bolt"),
    ("D4", 598843.081, 5228001.894, 452.117, "crest bolt, right abutment"),
    ("HB1", np.nan, np.nan, 438.5520, "benchmark, keeper's house; no coordinates"),
    ("HB2", np.nan, np.nan, 449.2310, "benchmark, gate tower; no coordinates"),
)
"""Name, true easting, northing and height, what it is."""

GEOID = (46.281, 46.304, 46.232, 46.267, 46.271, 46.263, 46.259, 46.267, 46.266, 46.265, 46.264, 46.268, 46.267)
"""Metres above the ellipsoid, by mark."""
DEFLECTIONS = {"P1": (3.8, -6.1), "P2": (3.6, -5.9), "P3": (3.9, -5.8), "P4": (4.1, -6.0)}
"""North and east components at the pillars, seconds of arc."""

VECTORS = (
    ("REF1", "P1"),
    ("REF1", "P2"),
    ("REF1", "P4"),
    ("REF2", "P2"),
    ("REF2", "P3"),
    ("REF3", "P1"),
    ("REF3", "P3"),
    ("REF3", "P4"),
    ("P1", "P3"),
    ("P2", "P4"),
)
PILLARS = ("P1", "P2", "P3", "P4")
CREST = ("D1", "D2", "D3", "D4")
LEVELS = (
    ("HB1", "P1", 0.41),
    ("P1", "D1", 0.22),
    ("D1", "D2", 0.09),
    ("D2", "D3", 0.09),
    ("D3", "D4", 0.09),
    ("D4", "HB2", 0.12),
    ("HB2", "P4", 0.20),
    ("D1", "P2", 0.31),
    ("P4", "HB1", 0.66),
)
"""From, to, kilometres."""

EQUIPMENT = Equipment(
    direction=1.0 * ARCSEC,
    zenith=1.5 * ARCSEC,
    distance=0.0008,
    distance_proportional=1e-6,
    centring=0.0002,
    heights=0.0003,
    level=0.0004,
    vector=0.003,
    vector_proportional=0.5e-6,
)
INSTRUMENTS = {
    "TS1": {
        "direction_arcsec": 1.0,
        "zenith_arcsec": 1.5,
        "distance_mm": 0.8,
        "distance_ppm": 1.0,
        "centring_mm": 0.2,
        "target_centring_mm": 0.2,
        "height_mm": 0.3,
    },
    "DL2": {"level_mm_per_sqrt_km": 0.4},
}
STYLE = Style(
    {
        **dict.fromkeys(("easting", "northing", "geoid", "instrument_height", "target_height", "corr"), 3),
        **dict.fromkeys(("height", "slope", "rise", "dx", "dy", "dz"), 4),
        **dict.fromkeys(("direction", "zenith", "deflection_north", "deflection_east", "sd_x", "sd_y", "sd_z"), 1),
    },
    sexagesimal=True,
    grid=True,
    correlations=True,
)

README = """\
# Control of the dam at Skelder Water

**Invented data.** There is no Skelder Water and no such dam; the coordinates are good UTM coordinates of zone 33, where
in truth no such valley lies. A seeded simulator made marks, observations and their errors.

Three GNSS references on the ridges, four pillars below the dam and above it, four bolts on its crest, two benchmarks.
Ten GNSS vectors with their correlations bring the pillars into the reference frame; rounds of directions, zenith angles
and slope distances, with the heights of instrument and target, lead from the pillars to the crest; levels run from the
benchmark HB1 over the crest and back. Heights are orthometric, `marks.csv` gives the geoid height of every mark and the
deflection of the vertical at the pillars.

```
hubtack adjust field_data/dam_control
```

What to notice:

- One adjustment takes all three crafts, each with its own precision, on the ellipsoid: nothing was reduced to the
  projection before, and eastings and northings appear only when the adjusted latitudes and longitudes are mapped.
- REF1 and REF2 are fixed. REF3 comes from an older survey and is `weighted`: its coordinates count as observations of
  sd 3 and 5 mm, and the listing says how far they were moved.
- HB1 has a height and no place, HB2 has neither: levelled marks get no plan coordinates, and need none.
- The crest bolts come out better in height than in plan, because levels do what a zenith angle over 400 m cannot.
- Ellipses and sds refer to grid north, which here lies about one degree from the meridian.
"""


def dam_control() -> Demo:
    """The demonstration `dam_control`."""
    generator = np.random.default_rng(SEED)
    job, _ = observe(_plan(generator), generator)
    written = describe_job(job, STYLE, INSTRUMENTS, {"instrument": "TS1", "levels_instrument": "DL2"})
    kilometres = np.array([length for _, _, length in LEVELS])
    written.tables["levels"] = with_lengths(written.tables["levels"], kilometres)
    written.tables["vectors"] = _sessions(written)
    comments = {
        "marks": ["UTM zone 33 (ETRS89), orthometric heights; invented, like everything here"],
        "directions": ["2026-09-14, TS1, mean of four rounds in both faces"],
        "zeniths": ["2026-09-14, TS1, mean of both faces, pressure and temperature applied"],
        "distances": ["2026-09-14, TS1, slope distances corrected for the atmosphere"],
        "levels": ["2026-09-15, DL2, mean of the runs out and back"],
        "vectors": ["2026-09-16 and -17, sessions of two hours"],
    }
    return Demo(written, comments, README)


def _plan(generator: np.random.Generator) -> Job:
    frame = EllipsoidFrame(CRS)
    marks = _marks(frame)
    lengths = np.array([length for _, _, length in LEVELS]) * 1000.0
    kinds = [
        *_rounds(marks),
        EQUIPMENT.height_differences(numbers_of([line[:2] for line in LEVELS], marks.names), lengths),
        _vectors(frame, marks, generator),
    ]
    plan = assemble("Skelder Water dam, control 2026", frame, marks, kinds)
    return replace(plan, setups=occupations(plan), orthometric=True, date="2026-09-17")


def _marks(frame: EllipsoidFrame) -> Marks:
    names, easting, northing, height, descriptions = zip(*MARKS, strict=True)
    geographic = frame.from_grid(np.column_stack([easting, northing]))
    placed = place_marks(np.column_stack([geographic, height]), fixed=(0, 1), weighted=(2,), fixed_height=(11,))
    deflection = np.array([DEFLECTIONS.get(name, (0.0, 0.0)) for name in names]) * ARCSEC
    return replace(named(placed, names, descriptions), geoid=np.array(GEOID), deflection=deflection)


def _rounds(marks: Marks) -> list[Observations]:
    """From every pillar to the other pillars and the crest, all of it."""
    sights = numbers_of([(at, to) for at in PILLARS for to in (*PILLARS, *CREST) if to != at], marks.names)
    heights = _heights(sights)
    return [
        EQUIPMENT.directions(sights),
        EQUIPMENT.zenith_angles(sights, heights),
        EQUIPMENT.slope_distances(sights, heights),
    ]


def _heights(sights: IntArray) -> FloatArray:
    """Heights of instrument and target (rows, 2): forced centring on the pillars, prisms on the bolts."""
    above = np.array([0.0, 0.0, 0.0, 0.231, 0.236, 0.229, 0.233, 0.118, 0.118, 0.118, 0.118, 0.0, 0.0])
    return np.column_stack([above[sights[:, 0]], above[sights[:, 1]]])


def _vectors(frame: EllipsoidFrame, marks: Marks, generator: np.random.Generator) -> Observations:
    lines = numbers_of(VECTORS, marks.names)
    ends = frame.geocentric(marks.given + np.column_stack([np.zeros((len(marks), 2)), marks.geoid]))
    lengths = np.linalg.norm(ends[lines[:, 1]] - ends[lines[:, 0]], axis=1)
    spread = generator.uniform(0.75, 1.35, (len(lines), 3))
    return EQUIPMENT.vectors(lines, lengths, frame.axes(marks.given[lines[:, 0]]), spread)


def _sessions(written: JobFolder) -> dict[str, list[str]]:
    """The table of vectors with the session of each, and a word on one of them."""
    table = written.tables["vectors"]
    half = len(VECTORS) // 2
    sessions = ["A"] * half + ["B"] * (len(VECTORS) - half)
    return noted(table | {"session": sessions}, {3: "snow on the ridge, antenna brushed off twice"})
