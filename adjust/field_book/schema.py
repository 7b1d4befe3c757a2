"""What a table holds, as data: its columns, their quantities, which are required and what values they may take.

Reading, the messages about unknown columns and the reference page of the job folder all use these descriptions;
a new table is a new entry in `TABLES` and a builder for its rows.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from enum import Enum

import numpy as np

from adjust.arrays import BoolArray, FloatArray
from adjust.units import ANGLE_ENDINGS, DEGREE, LENGTH_ENDINGS

SMALLEST_SD = 1e-12
"""Metres or radians. No instrument comes near it, and weights of 10²⁴ are as far as double precision carries."""
SMALLEST_DISTANCE = 1e-6
"""Metres: below what any instrument resolves."""
LARGEST_LENGTH = 1e9
"""Metres, 25 times round the Earth: beyond it a unit or an exponent is wrong."""


class Quantity(Enum):
    """What a cell of a column holds."""

    NAME = "a name"
    """Text that must be there: a mark, a setup."""
    TEXT = "text"
    LENGTH = "a length"
    ANGLE = "an angle"
    NUMBER = "a number"
    CHOICE = "a choice of words"

    @property
    def endings(self) -> tuple[str, ...]:
        """The unit endings that a column of this quantity may have; empty: the column has none."""
        if self is Quantity.LENGTH:
            return tuple(LENGTH_ENDINGS)
        return tuple(ANGLE_ENDINGS) if self is Quantity.ANGLE else ()


@dataclass(frozen=True)
class Rule:
    """What values of a column must obey, in metres and radians."""

    holds: Callable[[FloatArray], BoolArray]
    expected: str
    """Follows "expected" in a message, and stands in the reference."""


SD = Rule(
    lambda value: (value >= SMALLEST_SD) & (value <= LARGEST_LENGTH),
    "a standard deviation above 0 (to leave a row out write 'no' in the column 'use')",
)
LENGTH = Rule(lambda value: np.abs(value) <= LARGEST_LENGTH, "a length within ±1 000 000 km; check the unit")
DISTANCE = Rule(
    lambda value: (value >= SMALLEST_DISTANCE) & (value <= LARGEST_LENGTH), "a distance above 0 and below 1 000 000 km"
)
CIRCLE = Rule(lambda value: np.abs(value) <= 2 * np.pi * (1 + 1e-9), "at most one full circle; check the unit")
ZENITH = Rule(
    lambda value: (value >= 0) & (value <= np.pi * (1 + 1e-12)),
    "a zenith angle between 0 and 180 degrees: reduce a reading of the second face to 360° minus the reading, "
    "or mean the two faces",
)
LATITUDE = Rule(lambda value: np.abs(value) <= np.pi / 2, "a latitude between -90 and 90 degrees")
DEFLECTION = Rule(lambda value: np.abs(value) <= DEGREE, "a deflection within ±1 degree; check the unit")
CORRELATION = Rule(lambda value: np.abs(value) < 1, "a correlation between -1 and 1, neither of them reached")
READING = Rule(
    lambda value: (value >= 0) & (value <= 2 * np.pi * (1 + 1e-9)),
    "a reading between 0 and one full circle; check the unit",
)
TEMPERATURE = Rule(lambda value: (value >= -60) & (value <= 60), "a temperature between -60 and 60 °C")
PRESSURE = Rule(
    lambda value: (value >= 300) & (value <= 1100),
    "the pressure at the station between 300 and 1100 hPa, not at sea level",
)
HUMIDITY = Rule(lambda value: (value >= 0) & (value <= 100), "a relative humidity between 0 and 100 %")
WHOLE = Rule(lambda value: (value >= 1) & (value % 1 == 0), "a whole number of 1 or more")


@dataclass(frozen=True)
class Column:
    """One column of a table, named without its unit ending."""

    name: str
    quantity: Quantity
    meaning: str
    required: bool = False
    """The column must be there, and no cell of it may be blank."""
    rule: Rule | None = None
    choices: tuple[str, ...] = ()
    """Words of a CHOICE; a blank cell means the first."""

    @property
    def titles(self) -> tuple[str, ...]:
        """The names that the header row may give it."""
        endings = self.quantity.endings
        return tuple(f"{self.name}_{ending}" for ending in endings) if endings else (self.name,)

    @property
    def written(self) -> str:
        """How a message and the reference write it: `height<len>`, `sd<ang>`, `mark`."""
        return self.name + {Quantity.LENGTH: "<len>", Quantity.ANGLE: "<ang>"}.get(self.quantity, "")


@dataclass(frozen=True)
class Table:
    """One table of a job folder."""

    name: str
    row: str
    """What one row is."""
    columns: tuple[Column, ...]
    one_of: tuple[tuple[str, ...], ...] = ()
    """Groups of columns of which a file must have at least one."""
    together: tuple[tuple[str, ...], ...] = ()
    """Columns that stand or fall together: all of them in a file or none."""
    apart: tuple[tuple[str, str], ...] = ()
    """Pairs of columns of which a file may have only one."""
    raw: bool = False
    """Whether its rows are readings, several of which make an observation."""

    def column(self, name: str) -> Column:
        """The column of that name. Raises KeyError."""
        return {column.name: column for column in self.columns}[name]

    @property
    def has_instrument(self) -> bool:
        """Whether its rows may take their sd from an instrument of the job file."""
        return any(column.name == "instrument" for column in self.columns)


def _mark(name: str, meaning: str) -> Column:
    return Column(name, Quantity.NAME, meaning, required=True)


def _length(name: str, meaning: str, rule: Rule = LENGTH, *, required: bool = False) -> Column:
    return Column(name, Quantity.LENGTH, meaning, required, rule)


def _angle(name: str, meaning: str, rule: Rule = CIRCLE, *, required: bool = False) -> Column:
    return Column(name, Quantity.ANGLE, meaning, required, rule)


def _number(name: str, meaning: str, rule: Rule | None = None) -> Column:
    return Column(name, Quantity.NUMBER, meaning, rule=rule)


_AT = _mark("at", "the mark under the instrument")
_TO = _mark("to", "the mark sighted")
_ANGLE_SD = _angle("sd", "standard deviation of the observation; wins over the instrument", SD)
_LENGTH_SD = _length("sd", "standard deviation of the observation; wins over the instrument", SD)
_INSTRUMENT = Column("instrument", Quantity.TEXT, "a table `[instruments.NAME]` of the job file; blank: the default")
_GROUP = Column(
    "group", Quantity.TEXT, "rows of the same word are judged together, how well their sds were stated; blank: none"
)
_USE = Column(
    "use", Quantity.CHOICE, "`no` keeps the row in the books and leaves it out of the adjustment", choices=("yes", "no")
)
_HEIGHTS = (
    _length("instrument_height", "height of the instrument above `at`; blank: 0"),
    _length("target_height", "height of the target above `to`; blank: 0"),
)
_CONTROL = ("free", "fixed", "weighted")
FACES = ("L", "R")

MARKS = Table(
    "marks",
    "a mark",
    (
        _mark("mark", "the mark's name; stays text, leading zeros and all"),
        _length("easting", "grid easting"),
        _length("northing", "grid northing"),
        _angle("latitude", "geodetic latitude, north positive (ellipsoid frame)", LATITUDE),
        _angle("longitude", "geodetic longitude, east positive (ellipsoid frame)"),
        _length("height", "height in the job's height system"),
        Column("plan_control", Quantity.CHOICE, "what easting and northing count for", choices=_CONTROL),
        Column("height_control", Quantity.CHOICE, "what the height counts for", choices=_CONTROL),
        _length("sd_easting", "standard deviation of a weighted easting", SD),
        _length("sd_northing", "standard deviation of a weighted northing", SD),
        _length("sd_height", "standard deviation of a weighted height", SD),
        _length("geoid", "height of the geoid above the ellipsoid"),
        _angle("deflection_north", "deflection of the vertical, astronomic minus geodetic latitude", DEFLECTION),
        _angle("deflection_east", "(astronomic minus geodetic longitude) × cos latitude", DEFLECTION),
        Column("description", Quantity.TEXT, "free text for the listing"),
    ),
    together=(
        ("easting", "northing"),
        ("latitude", "longitude"),
        ("sd_easting", "sd_northing"),
        ("deflection_north", "deflection_east"),
    ),
    apart=(("easting", "latitude"),),
)

DIRECTIONS = Table(
    "directions",
    "one direction of a round; rows of one `setup` share one unknown orientation",
    (
        Column("setup", Quantity.NAME, "the occupation; one setup stands on one mark", required=True),
        _AT,
        _TO,
        _angle("direction", "reading of the horizontal circle, clockwise", required=True),
        _ANGLE_SD,
        _INSTRUMENT,
        _GROUP,
        _USE,
    ),
)

ANGLES = Table(
    "angles",
    "a clockwise angle from `from` to `to`",
    (
        _AT,
        _mark("from", "the mark sighted first"),
        _mark("to", "the mark sighted second"),
        _angle("angle", "the clockwise angle", required=True),
        _ANGLE_SD,
        _INSTRUMENT,
        _GROUP,
        _USE,
    ),
)

AZIMUTHS = Table(
    "azimuths",
    "an azimuth, clockwise from the north of the plane grid, or of the geodetic meridian in an ellipsoid frame",
    (
        _AT,
        _TO,
        _angle("azimuth", "the azimuth, clockwise from north", required=True),
        _ANGLE_SD,
        _INSTRUMENT,
        _GROUP,
        _USE,
    ),
)

DISTANCES = Table(
    "distances",
    "a measured distance: `slope` along the line of sight, or `horizontal`, already reduced to the horizontal "
    "at the mean height of the two marks",
    (
        _AT,
        _TO,
        _length("slope", "distance along the line of sight", DISTANCE),
        _length("horizontal", "distance reduced to the horizontal", DISTANCE),
        *_HEIGHTS,
        _LENGTH_SD,
        _INSTRUMENT,
        _GROUP,
        _USE,
    ),
    one_of=(("slope", "horizontal"),),
)

ZENITHS = Table(
    "zeniths",
    "a zenith angle (0 up, 90° level)",
    (
        _AT,
        _TO,
        _angle("zenith", "the zenith angle, mean of the faces", ZENITH, required=True),
        *_HEIGHTS,
        _ANGLE_SD,
        _INSTRUMENT,
        _GROUP,
        _USE,
    ),
)

LEVELS = Table(
    "levels",
    "the height of `to` minus the height of `from` by spirit levelling",
    (
        _mark("from", "the mark levelled from"),
        _mark("to", "the mark levelled to"),
        _length("rise", "height of `to` minus height of `from`", required=True),
        _length("length", "length of the levelled line", DISTANCE),
        _number("setups", "number of instrument setups along the line", WHOLE),
        _LENGTH_SD,
        _INSTRUMENT,
        _GROUP,
        _USE,
    ),
)

AXES = ("x", "y", "z")
COVARIANCES = ("cov_xx", "cov_xy", "cov_xz", "cov_yy", "cov_yz", "cov_zz")

VECTORS = Table(
    "vectors",
    "a GNSS baseline in geocentric axes, `to` minus `from`, mark to mark",
    (
        _mark("from", "the mark at the vector's foot"),
        _mark("to", "the mark at its head"),
        *(_length(f"d{axis}", f"geocentric difference along {axis.upper()}", required=True) for axis in AXES),
        *(_length(f"sd_{axis}", f"standard deviation of the {axis} component", SD) for axis in AXES),
        *(
            _number(f"corr_{pair}", f"correlation of {pair[0]} and {pair[1]}; blank: 0", CORRELATION)
            for pair in ("xy", "xz", "yz")
        ),
        *(_number(f"{name}_m2", f"covariance of {name[4]} and {name[5]}, m²") for name in COVARIANCES),
        Column("session", Quantity.TEXT, "the session it was observed in"),
        _GROUP,
        _USE,
    ),
    one_of=(("sd_x", "cov_xx_m2"),),
    together=(tuple(f"sd_{axis}" for axis in AXES), tuple(f"{name}_m2" for name in COVARIANCES)),
    apart=(("sd_x", "cov_xx_m2"), ("corr_xy", "cov_xx_m2"), ("corr_xz", "cov_xx_m2"), ("corr_yz", "cov_xx_m2")),
)

POINTINGS = Table(
    "pointings",
    "one pointing of a total station, as it was read",
    (
        Column("setup", Quantity.NAME, "the occupation; one setup stands on one mark", required=True),
        _AT,
        _TO,
        Column("round", Quantity.TEXT, "the round; readings of one setup and round share the circle's zero"),
        Column("face", Quantity.TEXT, "`L` or `R`; blank: as the vertical circle shows, else `L`"),
        _angle("circle", "reading of the horizontal circle, clockwise", READING),
        _angle("zenith", "reading of the vertical circle: above 180 degrees on face right", READING),
        _length("slope", "distance along the line of sight, as it was shown", DISTANCE),
        _length("instrument_height", "height of the instrument above `at`; holds in the setup until given again"),
        _length(
            "target_height", "height of the target above `to`; holds for the target, or for those without their own"
        ),
        Column("target", Quantity.TEXT, "a table `[targets.NAME]` of the job file; blank: the default"),
        _number("temperature_c", "air temperature, °C; holds in the setup until given again", TEMPERATURE),
        _number("pressure_hpa", "air pressure at the station, hPa; holds in the setup until given again", PRESSURE),
        _number("humidity_percent", "relative humidity; holds in the setup until given again", HUMIDITY),
        _INSTRUMENT,
        _GROUP,
        _USE,
    ),
    one_of=(("circle", "zenith", "slope"),),
    together=(("temperature_c", "pressure_hpa"),),
    raw=True,
)

LEVEL_BOOK = Table(
    "level_book",
    "one staff position of a levelled line, in the order walked",
    (
        Column("line", Quantity.NAME, "the run; its rows follow each other", required=True),
        Column("point", Quantity.TEXT, "the mark under the staff; blank or `TP…`: a turning point"),
        _length("backsight", "staff reading looking back: opens a setup of the level"),
        _length("intermediate", "staff reading of a side shot"),
        _length("foresight", "staff reading looking ahead: closes the setup"),
        _length("backsight_distance", "length of the sight back", DISTANCE),
        _length("foresight_distance", "length of the sight ahead, or to the side", DISTANCE),
        _INSTRUMENT,
        _GROUP,
        _USE,
    ),
    one_of=(("backsight",), ("foresight",)),
    raw=True,
)

TABLES: dict[str, Table] = {
    table.name: table
    for table in (
        MARKS,
        DIRECTIONS,
        ANGLES,
        AZIMUTHS,
        DISTANCES,
        ZENITHS,
        LEVELS,
        VECTORS,
        POINTINGS,
        LEVEL_BOOK,
    )
}
"""Every table of a job folder, in the order in which they are read and documented."""
