"""A levelling net between two benchmarks, with a spur that nothing checks."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from adjust.field_book.cells import Style
from adjust.field_book.writing import describe_job
from adjust.frames import PlaneFrame
from adjust.simulate.demos.demo import Demo, named, noted, numbers_of, rows_of, with_lengths
from adjust.simulate.equipment import Equipment
from adjust.simulate.networks import assemble, place_marks
from adjust.simulate.observing import observe

SEED = 20260504

MARKS = (
    ("BM17", 3.4820, "bolt in the church plinth, Marrowby"),
    ("BM23", 5.1174, "rivet on the parapet of Eel Bridge"),
    ("F1", 2.9136, "peg, fen gate"),
    ("F2", 2.2071, "peg, drove crossing"),
    ("F3", 3.8842, "bolt, sluice wing wall"),
    ("F4", 1.9517, "peg, cattle trough"),
    ("F5", 2.7763, "peg, third milestone"),
    ("F6", 0.8424, "bolt, pump house intake"),
)
"""Name, true height in metres, what it is."""

LINES = (
    ("BM17", "F1", 0.82),
    ("F1", "F2", 1.10),
    ("F2", "F3", 0.64),
    ("F3", "BM23", 0.97),
    ("F1", "F4", 0.75),
    ("F4", "F5", 1.26),
    ("F5", "F3", 0.88),
    ("F2", "F5", 0.59),
    ("BM17", "F4", 1.31),
    ("F5", "BM23", 1.42),
    ("F4", "F6", 0.48),
)
"""From, to, kilometres."""

FIRST_DAY = 6
"""Lines levelled on the first day."""

README = """\
# Levels on Marrow Fen

**Invented data.** There is no Marrow Fen, and nobody carried a staff over it: a seeded simulator made the heights, the
levels and their errors.

Six marks on a fen are levelled from two benchmarks, on two days, in two files that `job.toml` joins under `[tables]`.
Each line was run both ways; a row holds the mean. Its standard deviation comes from the instrument, 0.7 mm for a
kilometre, and the length of the line.

```
hubtack adjust field_data/fen_levels
```

What to notice:

- Nothing but heights is asked for: marks without eastings and northings need none, and no plan coordinates appear.
- The two benchmarks are `fixed`: the net must fit between them, so that a moved benchmark would show.
- The further from a benchmark, the larger the sd of a height; the loops hold the marks in the middle together.
- F6, at the pump house, hangs on a single line. Its redundancy is 0, so no test can say anything about that rise, and
  the listing warns of it. A second line to F6, or the same line run again, would cure it.
"""


def fen_levels() -> Demo:
    """The demonstration `fen_levels`."""
    names, heights, descriptions = zip(*MARKS, strict=True)
    coordinates = np.column_stack([np.full((len(MARKS), 2), np.nan), heights])
    marks = named(place_marks(coordinates, fixed_height=(0, 1)), names, descriptions)
    kilometres = np.array([length for _, _, length in LINES])
    lines = Equipment(level=0.0007).height_differences(
        numbers_of([line[:2] for line in LINES], names), kilometres * 1000
    )
    plan = replace(assemble("Marrow Fen pumping station, levels", PlaneFrame(), marks, [lines]), date="2026-05-05")
    job, _ = observe(plan, np.random.default_rng(SEED))
    written = describe_job(
        job, Style({"height": 4, "rise": 4}), {"DL1": {"level_mm_per_sqrt_km": 0.7}}, {"instrument": "DL1"}
    )
    levels = noted(with_lengths(written.tables.pop("levels"), kilometres), {10: "spur, no second way out to it"})
    written.tables["levels_day1"] = rows_of(levels, slice(FIRST_DAY))
    written.tables["levels_day2"] = rows_of(levels, slice(FIRST_DAY, None))
    written.job_file["tables"] = {"levels": ["levels_day1.csv", "levels_day2.csv"]}
    comments = {
        "marks": ["Heights of BM17 and BM23 as published; invented, like everything here"],
        "levels_day1": ["2026-05-04, dry, light wind; bar-code staffs 3 and 4", "rise: mean of the run out and back"],
        "levels_day2": ["2026-05-05, overcast; the same staffs", "rise: mean of the run out and back"],
    }
    return Demo(written, comments, README)
