"""Reading an invented network with a total station: circles on two faces, rounds, weather, distances as shown."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from adjust.angles import FULL_TURN, HALF_TURN
from adjust.arrays import BoolArray, FloatArray, IntArray
from adjust.field_book.cells import EXACT, Style, Table
from adjust.job import Job
from adjust.observations import Directions, Observations, SlopeDistances, ZenithAngles
from adjust.reductions.atmosphere import Air
from adjust.reductions.distance import velocity_factor
from adjust.reductions.faces import LEFT, RIGHT, effect_of_collimation
from adjust.reductions.refractivity import group_refractivity
from adjust.simulate.observing import true_geometry
from adjust.units import ARCSEC

WAVELENGTH = 658e-9
REFERENCE_INDEX = 1.0002863
SCALE = 2.5e-6
TARGET_CONSTANT = -0.0344


@dataclass(frozen=True)
class Habits:
    """How a party reads: what its instrument is off by (radians), and what it does not read."""

    rounds: int = 3
    collimation: float = 9.0 * ARCSEC
    index: float = -14.0 * ARCSEC
    eccentricity: float = 6.0 * ARCSEC
    """Of the horizontal circle: reading + eccentricity · sin(reading)."""
    missing: float = 0.2
    """Share of the sights that the rounds after the first leave out."""
    single: float = 0.0
    """Share of the sights that are read on one face only."""
    closes_horizon: bool = False
    """Whether half-rounds come back to their first target."""


@dataclass(frozen=True)
class Sights:
    """What stands behind the pointings of a plan: true values (sights,) along each direction of it, radians and metres,
    NaN where the plan does not measure it; `heights` (sights, 2)."""

    setup: IntArray
    marks: IntArray
    direction: FloatArray
    zenith: FloatArray
    slope: FloatArray
    heights: FloatArray

    @classmethod
    def of(cls, plan: Job) -> Sights:
        """The sights of a plan whose rounds, zenith angles and slopes share marks; values at its true coordinates."""
        geometry = true_geometry(plan)
        rounds = next(rows for rows in plan.observations if isinstance(rows, Directions))
        zenith, heights = _beside(rounds, plan, ZenithAngles)
        slope, slope_heights = _beside(rounds, plan, SlopeDistances)
        return cls(
            rounds.setup_index,
            rounds.marks,
            rounds.predict(geometry)[:, 0],
            zenith,
            slope,
            np.where(np.isnan(heights), np.nan_to_num(slope_heights), heights),
        )


def _beside(
    rounds: Directions, plan: Job, kind: type[ZenithAngles] | type[SlopeDistances]
) -> tuple[FloatArray, FloatArray]:
    """Values (sights,) of a kind along the sights of rounds, and heights (sights, 2); NaN where it has none."""
    value, heights = np.full(len(rounds), np.nan), np.full((len(rounds), 2), np.nan)
    place = {tuple(sight): row for row, sight in enumerate(rounds.marks.tolist())}
    for rows in plan.observations:
        if isinstance(rows, kind):
            here = [place[tuple(sight)] for sight in rows.marks.tolist()]
            value[here], heights[here] = rows.predict(true_geometry(plan))[:, 0], rows.heights
    return value, heights


@dataclass(frozen=True)
class Order:
    """The pointings in the order taken: sight, round and face (pointings,)."""

    sight: IntArray
    turn: IntArray
    face: IntArray


def order_of_pointings(setup: IntArray, habits: Habits, generator: np.random.Generator) -> Order:
    """Every setup's rounds: out on face left, back on face right."""
    parts = [
        _one_round(np.flatnonzero(setup == station), turn, habits, generator)
        for station in np.unique(setup)
        for turn in range(habits.rounds)
    ]
    return Order(*np.vstack(parts).T)


def _one_round(sights: IntArray, turn: int, habits: Habits, generator: np.random.Generator) -> IntArray:
    """Sight, round, face (pointings, 3) of one round. The first round, and the first target of any, are complete."""
    first = np.arange(len(sights)) == 0
    seen = sights[first | (turn == 0) | (generator.random(len(sights)) >= habits.missing)]
    both: BoolArray = generator.random(len(seen)) >= habits.single
    side = generator.integers(0, 2, len(seen))
    out, back = seen[both | (side == LEFT)], seen[both | (side == RIGHT)][::-1]
    if habits.closes_horizon and len(seen) > 1:
        out, back = (np.append(half, half[:1]) if len(half) else half for half in (out, back))
    face = np.repeat([LEFT, RIGHT], [len(out), len(back)])
    return np.column_stack([np.concatenate([out, back]), np.full(len(face), turn), face])


@dataclass(frozen=True)
class Weather:
    """Of each setup (setups,): °C, hPa and relative humidity in per cent, as read to 0.1."""

    celsius: FloatArray
    hectopascal: FloatArray
    humidity: FloatArray

    @classmethod
    def of_a_day(cls, setups: int, generator: np.random.Generator) -> Weather:
        """From a cool morning to a warm afternoon."""
        celsius = np.linspace(9.0, 27.0, setups) + generator.normal(0, 1.0, setups)
        return cls(
            np.round(celsius, 1),
            np.round(generator.normal(962.0, 4.0, setups), 1),
            np.round(generator.uniform(35.0, 85.0, setups)),
        )

    def velocity(self) -> FloatArray:
        """Factor (setups,) of the first velocity correction."""
        air = Air.of_readings(self.celsius, self.hectopascal, self.humidity / 100.0)
        wavelength, reference = (np.full(len(self.celsius), value) for value in (WAVELENGTH, REFERENCE_INDEX))
        return velocity_factor(reference, group_refractivity(wavelength, air))


def pointings_table(
    plan: Job, habits: Habits, generator: np.random.Generator, style: Style = EXACT
) -> tuple[Table, Sights]:
    """The book of a plan's rounds, zenith angles and slope distances, and the true values of its sights.

    Readings scatter by the sds of the plan's precision (constant and proportional parts; centring and heights not):
    by √2 of a direction's on one face. The proportional error of a distance is the same in all its repeats.
    """
    sights, models = Sights.of(plan), {type(rows): rows for rows in plan.observations}
    order = order_of_pointings(sights.setup, habits, generator)
    weather = Weather.of_a_day(len(plan.setups), generator)
    sight, first = order.sight, np.diff(sights.setup[order.sight], prepend=-1) != 0
    columns: Table = {
        "setup": [plan.setups[number] for number in sights.setup[sight]],
        "at": [plan.marks.names[mark] for mark in sights.marks[sight, 0]],
        "to": [plan.marks.names[mark] for mark in sights.marks[sight, 1]],
        "round": [str(turn + 1) for turn in order.turn],
        "face": ["LR"[face] for face in order.face],
    }
    columns |= style.angle("circle", _circle_readings(sights, order, habits, _sd(models, Directions), generator))
    columns |= style.angle("zenith", _zenith_readings(sights, order, habits, _sd(models, ZenithAngles), generator))
    shown = _shown_distances(sights, order, models, weather, generator)
    columns |= style.length("slope", shown)
    columns |= style.length("instrument_height", np.where(first, sights.heights[sight, 0], np.nan))
    columns |= style.length("target_height", np.where(order.turn == 0, sights.heights[sight, 1], np.nan))
    for name, values in (
        ("temperature_c", weather.celsius),
        ("pressure_hpa", weather.hectopascal),
        ("humidity_percent", weather.humidity),
    ):
        columns[name] = style.numbers(name, np.where(first, values[sights.setup[sight]], np.nan))
    return columns, sights


def _sd(models: dict[type[Observations], Observations], kind: type[Directions] | type[ZenithAngles]) -> float:
    rows = models.get(kind)
    return float(rows.precision.constant[0]) if isinstance(rows, kind) else 0.0


def _circle_readings(
    sights: Sights, order: Order, habits: Habits, sd: float, generator: np.random.Generator
) -> FloatArray:
    sight, side = order.sight, np.where(order.face == LEFT, 1.0, -1.0)
    zero = generator.uniform(0.0, FULL_TURN, (int(sights.setup.max()) + 1, habits.rounds))
    zenith = np.where(np.isnan(sights.zenith), HALF_TURN / 2, sights.zenith)[sight]
    exact = sights.direction[sight] - zero[sights.setup[sight], order.turn] + HALF_TURN * order.face
    exact = exact + side * effect_of_collimation(np.full(len(sight), habits.collimation), zenith)
    noise = generator.normal(0.0, np.sqrt(2.0) * sd, len(sight))
    reading: FloatArray = np.remainder(exact + habits.eccentricity * np.sin(exact) + noise, FULL_TURN)
    return reading


def _zenith_readings(
    sights: Sights, order: Order, habits: Habits, sd: float, generator: np.random.Generator
) -> FloatArray:
    as_left = sights.zenith[order.sight]
    exact = np.where(order.face == LEFT, as_left, FULL_TURN - as_left) + habits.index
    return exact + generator.normal(0.0, np.sqrt(2.0) * sd, len(exact))


def _shown_distances(
    sights: Sights,
    order: Order,
    models: dict[type[Observations], Observations],
    weather: Weather,
    generator: np.random.Generator,
) -> FloatArray:
    rows = models.get(SlopeDistances)
    if not isinstance(rows, SlopeDistances):
        return np.full(len(order.sight), np.nan)
    constant, proportional = rows.precision.constant[0], rows.precision.proportional[0]
    slope = sights.slope * (1.0 + generator.normal(0.0, proportional, len(sights.slope)))
    measured = slope[order.sight] + generator.normal(0.0, constant, len(order.sight))
    velocity = weather.velocity()[sights.setup[order.sight]]
    shown: FloatArray = (measured - TARGET_CONSTANT) / ((1.0 + SCALE) * velocity)
    return shown
