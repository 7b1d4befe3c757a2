"""A quarry's control as it was read: circles on two faces, shown distances, weather, and the level book."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from adjust.arrays import FloatArray, IntArray
from adjust.field_book.cells import Style
from adjust.frames import EllipsoidFrame
from adjust.job import Job
from adjust.observations import HeightDifferences, Precision
from adjust.simulate.demos.demo import Demo, named, numbers_of, occupations
from adjust.simulate.equipment import Equipment
from adjust.simulate.networks import assemble, place_marks
from adjust.simulate.raw_job import read_by_a_party
from adjust.simulate.raw_levels import LevelHabits
from adjust.simulate.raw_pointings import Habits
from adjust.units import ARCSEC

SEED = 20260921
CRS = "EPSG:25833"

MARKS = (
    ("Q1", 412310.482, 5271044.915, 486.214, "pillar, crusher"),
    ("Q2", 412948.107, 5271212.366, 502.871, "pillar, gatehouse"),
    ("Q3", 412702.554, 5270655.230, 471.640, "pillar, settling pond"),
    ("Q4", 412455.939, 5270810.778, 458.322, "pillar, lower bench"),
    ("Q5", 412641.283, 5271138.047, 494.105, "pillar, upper bench"),
    ("Q6", 412580.716, 5270932.401, 466.958, "bolt, haul road"),
)
"""Name, true easting, northing and height, what it is."""
GEOID = (45.512, 45.515, 45.506, 45.508, 45.512, 45.510)
"""Metres above the ellipsoid, by mark."""
STATIONS = ("Q1", "Q2", "Q3", "Q4", "Q5")
LINES = (("Q2", "Q5", 410.0), ("Q5", "Q1", 480.0), ("Q1", "Q4", 390.0), ("Q4", "Q6", 260.0), ("Q6", "Q5", 340.0))
"""From, to, metres levelled."""

EQUIPMENT = Equipment(
    direction=1.5 * ARCSEC,
    zenith=2.0 * ARCSEC,
    distance=0.001,
    distance_proportional=1.5e-6,
    centring=0.0,
    heights=0.0,
)
LEVELS = LevelHabits(sight=30.0, imbalance=5.0, collimation=6.0 * ARCSEC, sd_per_root_metre=0.001 / np.sqrt(1000.0))
STYLE = Style(
    {
        **dict.fromkeys(("circle", "zenith", "humidity_percent"), 0),
        **dict.fromkeys(("temperature_c", "pressure_hpa", "backsight_distance", "foresight_distance"), 1),
        **dict.fromkeys(("easting", "northing", "height", "geoid", "instrument_height", "target_height"), 3),
        **dict.fromkeys(("slope", "backsight", "foresight"), 4),
    },
    sexagesimal=True,
    grid=True,
)

README = """\
# Control of Hallin Quarry, from the raw books

**Invented data.** There is no Hallin Quarry; the coordinates are good UTM coordinates of zone 33, where in truth no
such quarry lies. A seeded simulator laid out the marks and read the instruments.

Five pillars with forced centring and a bolt. `pointings.csv` is the book of the total station, row by row as it was
read: three rounds on two faces from every pillar, the horizon closed, distances as the instrument showed them, weather
and heights given once in a setup. `level_book.csv` is the book of the level: backsights and foresights over turning
points, with the lengths of the sights.

```
hubtack adjust field_data/quarry_raw
hubtack reduce field_data/quarry_raw --out quarry_reduced
```

What to notice:

- Nothing was reduced beforehand. An observation of the results names all the lines of the book that it was made of:
  `pointings.csv:2+7+…`.
- Some targets are missing from the second and third round. They are adjusted on the station, not meaned, and their sds
  are larger for it.
- `reduction.txt` shows what the pairs of faces say of the instrument: a collimation error of about 9″ and a vertical
  index of about −14″, the same in all setups, and gone from the means.
- The job file knows the light of the distance meter, its scale and the constant of the prism, so that every distance
  is corrected for the air of its own setup: by 12 ppm in the cool morning, by 29 ppm in the warm afternoon. Take the
  columns of the weather out of `pointings.csv`, and the global test fails.
- The level's line of sight rises by 6″. Its sights are not quite balanced, and each section is corrected for that.
- The readings scatter as much as the instruments promise, and the adjustment agrees: two tests, one inside the setups
  and one between them.
- The reduced tables that `hubtack reduce` writes are a job of their own and adjust to the same coordinates.
"""


def quarry_raw() -> Demo:
    """The demonstration `quarry_raw`."""
    generator = np.random.default_rng(SEED)
    habits = Habits(missing=0.2, closes_horizon=True)
    written = read_by_a_party(_plan(), generator, habits, LEVELS, STYLE, states_errors=False).folder
    comments = {
        "marks": ["UTM zone 33 (ETRS89), orthometric heights; invented, like everything here"],
        "pointings": ["2026-09-22, TS1 on the pillars, readings as booked; distances as shown, nothing applied"],
        "level_book": ["2026-09-23, NA2, staff 7; sights paced"],
    }
    return Demo(written, comments, README)


def _plan() -> Job:
    frame = EllipsoidFrame(CRS)
    names, easting, northing, height, descriptions = zip(*MARKS, strict=True)
    coordinates = np.column_stack([frame.from_grid(np.column_stack([easting, northing])), height])
    marks = replace(named(place_marks(coordinates, fixed=(0, 1)), names, descriptions), geoid=np.array(GEOID))
    sights = numbers_of([(at, to) for at in STATIONS for to in names if to != at], names)
    heights = _heights(sights)
    kinds = [
        EQUIPMENT.directions(sights),
        EQUIPMENT.zenith_angles(sights, heights),
        EQUIPMENT.slope_distances(sights, heights),
        _levels(names),
    ]
    plan = assemble("Hallin Quarry, control from the raw books", frame, marks, kinds)
    return replace(plan, setups=occupations(plan), orthometric=True, date="2026-09-23")


def _heights(sights: IntArray) -> FloatArray:
    """Heights of instrument and target (rows, 2): adapters on the pillars, a rod on the bolt."""
    instrument = np.array([0.231, 0.229, 0.234, 0.230, 0.232, 0.0])
    target = np.array([0.231, 0.229, 0.234, 0.230, 0.232, 1.300])
    return np.column_stack([instrument[sights[:, 0]], target[sights[:, 1]]])


def _levels(names: tuple[str, ...]) -> HeightDifferences:
    lengths = np.array([length for _, _, length in LINES])
    rows = EQUIPMENT.height_differences(numbers_of([line[:2] for line in LINES], names), lengths)
    return replace(rows, precision=Precision.of_sd(LEVELS.sd_per_root_metre * np.sqrt(lengths)))
