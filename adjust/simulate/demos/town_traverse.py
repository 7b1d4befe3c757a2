"""Two traverses along streets, tied across, with one distance booked with two digits changed over."""

from __future__ import annotations

from dataclasses import replace
from itertools import pairwise

import numpy as np

from adjust.field_book.cells import Style
from adjust.field_book.writing import describe_job
from adjust.frames import PlaneFrame
from adjust.simulate.demos.demo import Demo, named, numbers_of, occupations
from adjust.simulate.equipment import Equipment
from adjust.simulate.layout import Layout
from adjust.simulate.networks import assemble, place_marks
from adjust.simulate.observing import observe
from adjust.units import ARCSEC

SEED = 20260611

CONTROL = (
    ("K101", 1000.0, 500.0, "pillar, water tower"),
    ("K102", 905.0, 655.0, "bolt, school wall"),
    ("K117", 1985.0, 560.0, "bolt, market hall step"),
    ("K118", 2090.0, 420.0, "pillar, brewery roof"),
)
STATIONS = (
    ("201", 1090.0, 690.0, "nail, Cobble Row"),
    ("202", 1265.0, 712.0, "nail, Cobble Row"),
    ("203", 1440.0, 688.0, "nail, Cobble Row"),
    ("204", 1620.0, 715.0, "nail, Cobble Row"),
    ("205", 1800.0, 690.0, "nail, Cobble Row"),
    ("301", 1160.0, 480.0, "nail, Tanner Lane"),
    ("302", 1335.0, 505.0, "nail, Tanner Lane"),
    ("303", 1500.0, 470.0, "nail, Tanner Lane"),
    ("304", 1690.0, 500.0, "nail, Tanner Lane"),
    ("305", 1850.0, 455.0, "nail, Tanner Lane"),
)
"""Name, easting and northing to the metre, what it is."""

ROUTES = (
    ("K101", "K102"),
    ("K117", "K118"),
    ("K102", "201", "202", "203", "204", "205", "K117"),
    ("K101", "301", "302", "303", "304", "305", "K118"),
    ("202", "302"),
    ("203", "303"),
    ("204", "304"),
)
"""Marks that see each other, one after the other."""

MISBOOKED = ("302", "303")
"""The line whose distance was written down wrongly."""

INSTRUMENTS = {
    "TS2": {
        "direction_arcsec": 2.0,
        "distance_mm": 1.5,
        "distance_ppm": 2.0,
        "centring_mm": 0.8,
        "target_centring_mm": 0.8,
    }
}

README = """\
# Street control between Cobble Row and Tanner Lane

**Invented data.** The town does not exist; a seeded simulator laid out the streets, observed them and made one mistake.

Two traverses run from the western control pair K101, K102 to the eastern pair K117, K118, tied across at three places.
Rounds of directions at every mark, every distance measured once and reduced to the horizontal; standard deviations from
the instrument `TS2`, centring included.

```
hubtack adjust field_data/town_traverse
```

What to notice:

- The command ends with exit status 1: the global test fails, because one of the {distances} distances is wrong.
- One mistake makes many observations look bad. The list of suspects has it first, because its residual is the largest
  when measured in its own standard deviation: `{source}`, {start} to {end}.
- It reads {read} m. Its residual (adjusted minus observed) is not the whole error: the network gives way and takes up
  part of it. Minus the residual divided by the redundancy estimates the error, here about {size:+.2f} m: two digits
  changed over, {right} written {read}.
- `hubtack blunders field_data/town_traverse` names this one error, and what somebody probably did.
- Nobody may mend a number that was booked, however plain the mistake. What is decided of it is kept beside the book,
  with the reason (`--decisions`): the global test passes and no suspect is left. The user's guide goes through it. Then
  measure the line again.
"""


def town_traverse() -> Demo:
    """The demonstration `town_traverse`."""
    table = (*CONTROL, *STATIONS)
    generator = np.random.default_rng(SEED)
    names, descriptions = [row[0] for row in table], [row[3] for row in table]
    place_of = np.array([row[1:3] for row in table]) + np.round(generator.uniform(-2.0, 2.0, (len(table), 2)), 3)
    coordinates = np.column_stack([place_of, np.full(len(table), np.nan)])
    marks = named(place_marks(coordinates, fixed_plan=range(len(CONTROL))), names, descriptions)
    lines = numbers_of([pair for route in ROUTES for pair in pairwise(route)], names)
    equipment = Equipment(
        direction=2 * ARCSEC, distance=0.0015, distance_proportional=2e-6, centring=0.0008, heights=0.0
    )
    sights = Layout(coordinates, lines).both_ways()
    kinds = [equipment.directions(sights), equipment.horizontal_distances(lines)]
    plan = replace(
        assemble("Street control, Cobble Row and Tanner Lane", PlaneFrame(), marks, kinds), date="2026-06-12"
    )
    job, _ = observe(replace(plan, setups=occupations(plan)), generator)
    style = Style({"easting": 3, "northing": 3, "direction": 1, "horizontal": 3}, sexagesimal=True)
    written = describe_job(job, style, INSTRUMENTS, {"instrument": "TS2"})
    comments = {
        "marks": ["K101, K102, K117, K118: town control, invented like everything here"],
        "directions": ["2026-06-11 and -12, TS2, mean of three rounds in both faces"],
        "distances": ["2026-06-11 and -12, TS2, reduced to the horizontal at the mean height of the line"],
    }
    return Demo(written, comments, README.format(**_misbook(written.tables["distances"])))


def _misbook(distances: dict[str, list[str]]) -> dict[str, object]:
    """Change over two digits of one distance; return what the story tells of it."""
    row = list(zip(distances["at"], distances["to"], strict=True)).index(MISBOOKED)
    right = distances["horizontal_m"][row]
    whole, _, decimals = right.partition(".")
    read = f"{whole}.{decimals[1]}{decimals[0]}{decimals[2]}"
    distances["horizontal_m"][row] = read
    return {
        "distances": len(distances["at"]),
        "source": f"distances.csv:{row + 3}",
        "start": MISBOOKED[0],
        "end": MISBOOKED[1],
        "read": read,
        "right": right,
        "size": float(read) - float(right),
    }
