"""Published accuracy standards: the printed figures, where they stand, and which of them were recalled.

D is the distance between two marks. All figures are at 95 %.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

from adjust.standards.requirements import Measure, Requirement, RootSum
from adjust.tolerances import Rule

CENTIMETRE = 0.01
KILOMETRE = 1000.0
PART_PER_MILLION = 1e-6

ALTA = "ALTA/NSPS, Minimum Standard Detail Requirements for Land Title Surveys ({year}), section 3.E"
FGDC = (
    "FGDC-STD-007.2-1998, Geospatial Positioning Accuracy Standards, part 2: Standards for Geodetic Networks, table 2.1"
)
LINZ = "LINZ, Standard for tiers, classes, and orders of LINZ data, LINZS25006 (2009)"
CANADA = (
    "Surveys and Mapping Branch, Energy, Mines and Resources Canada (1978), "
    "Specifications and Recommendations for Control Surveys and Survey Markers"
)
NEVADA = "Nevada Administrative Code 625.666, positional certainty (year of the edition not recorded)"


@dataclass(frozen=True)
class AccuracyStandard:
    """One class of a published standard, by the name that a job chooses it by."""

    name: str
    source: str
    requirements: tuple[Requirement, ...]

    @property
    def recalled(self) -> bool:
        """Whether one of its figures was written down from memory, without the page at hand."""
        return any(requirement.rule.recalled for requirement in self.requirements)


def _alta(year: int) -> AccuracyStandard:
    """Relative positional precision between monuments: 2 cm + 50 ppm of their direct distance."""
    name = f"ALTA/NSPS {year}"
    rule = Rule("20 mm + 50 ppm of D", constant=2 * CENTIMETRE, proportional=50 * PART_PER_MILLION, source=name)
    return AccuracyStandard(name, ALTA.format(year=year), (Requirement(Measure.PAIR_PLAN, rule),))


def _fgdc(metres: float, printed: str) -> AccuracyStandard:
    name = f"FGDC 1998 {printed}"
    rule = Rule(printed, constant=metres, source=name, recalled=True)
    measures = (Measure.MARK_PLAN, Measure.MARK_HEIGHT)
    return AccuracyStandard(name, FGDC, tuple(Requirement(measure, rule) for measure in measures))


def _canada(order: str, factor: float) -> AccuracyStandard:
    """r = C (d + 0.2) cm, d in kilometres. The formula is read from print, the values of C are recalled."""
    name = f"Canada 1978 {order}"
    rule = Rule(
        f"{factor:g} (D + 0.2) cm, D in km",
        constant=factor * 0.2 * CENTIMETRE,
        proportional=factor * CENTIMETRE / KILOMETRE,
        source=name,
        recalled=True,
    )
    return AccuracyStandard(name, CANADA, (Requirement(Measure.PAIR_PLAN, rule),))


def _nevada(name: str, metres: float, measure: Measure = Measure.MARK_PLAN) -> AccuracyStandard:
    name = f"NAC 625.666 {name}"
    rule = Rule(f"{metres:g} m", constant=metres, source=name)
    return AccuracyStandard(name, NEVADA, (Requirement(measure, rule),))


def _order(
    name: str, plan: tuple[float, float, float] | None, height: tuple[float, float, float] | None
) -> AccuracyStandard:
    """Tier, then c and p of the class, of plan and of height: √(c² + (p D)²) between marks."""
    full = f"LINZ 2009 order {name}"
    requirements: list[Requirement] = []
    for figures, of_mark, of_pair in (
        (plan, Measure.MARK_PLAN, Measure.PAIR_PLAN),
        (height, Measure.MARK_HEIGHT, Measure.PAIR_HEIGHT),
    ):
        if figures is not None:
            requirements += [
                Requirement(of_mark, _tier(full, figures[0])),
                Requirement(of_pair, _class(full, *figures[1:])),
            ]
    return AccuracyStandard(full, LINZ, tuple(requirements))


def _tier(name: str, metres: float) -> Rule:
    return Rule(f"{metres:g} m", constant=metres, source=name)


def _class(name: str, constant: float, proportional: float) -> Rule:
    printed = f"√((D · {proportional / PART_PER_MILLION:g} ppm)² + ({constant:g} m)²)"
    return RootSum(printed, constant=constant, proportional=proportional, source=name)


_FGDC_CLASSES = (
    *((0.001 * number, f"{number} mm") for number in (1, 2, 5)),
    *((0.01 * number, f"{number} cm") for number in (1, 2, 5)),
    *((0.1 * number, f"{number} dm") for number in (1, 2, 5)),
    *((float(number), f"{number} m") for number in (1, 2, 5, 10)),
)

_LINZ_TIERS = {
    **dict(zip("ABCDEFGHJK", (0.05, 0.10, 0.15, 0.20, 0.25, 0.35, 0.50, 1.0, 2.0, 5.0), strict=True)),
    **{"M": 10.0, "N": 20.0, "P": 50.0, "R": 100.0},
}

_LINZ_ORDERS = (
    ("0", (0.05, 0.003, 3e-8), (0.05, 0.003, 3e-8)),
    ("1", (0.05, 0.003, 1e-7), (0.10, 0.003, 3e-7)),
    ("2", (0.10, 0.003, 1e-6), (0.25, 0.010, 3e-6)),
    ("3", (0.10, 0.01, 3e-6), (0.35, 0.01, 1e-5)),
    ("4", (0.15, 0.01, 1e-5), (0.35, 0.01, 3e-5)),
    ("5", (0.15, 0.01, 5e-5), (0.35, 0.02, 1e-4)),
    ("6", (0.15, 0.03, 1.5e-4), None),
    ("7", (0.2, 0.06, 1.5e-4), None),
    ("8", (0.5, 0.3, 6e-4), None),
    ("9", (5.0, 1.0, 0.003), None),
    ("1V", None, (0.30, 0.01, 3e-6)),
    ("2V", None, (0.35, 0.01, 1e-5)),
    ("3V", None, (0.35, 0.02, 1e-4)),
    ("4V", None, (0.50, 0.02, 1.5e-4)),
    ("5V", None, (1.0, 0.30, 6e-4)),
)


def _all() -> Iterator[AccuracyStandard]:
    yield from (_alta(2021), _alta(2026))
    yield from (_fgdc(metres, printed) for metres, printed in _FGDC_CLASSES)
    yield from (_order(name, plan, height) for name, plan, height in _LINZ_ORDERS)
    for letter, metres in _LINZ_TIERS.items():
        name = f"LINZ 2009 tier {letter}"
        measures = (Measure.MARK_PLAN, Measure.MARK_HEIGHT)
        yield AccuracyStandard(name, LINZ, tuple(Requirement(measure, _tier(name, metres)) for measure in measures))
    orders = (("first order", 2), ("second order", 5), ("third order", 12), ("fourth order", 30))
    yield from (_canada(order, factor) for order, factor in orders)
    for name, metres in (
        *(("boundary, high urban", 0.02), ("boundary, low urban", 0.04)),
        *(("boundary, high rural", 0.1), ("boundary, low rural", 0.15)),
        *(("control, state network", 0.02), ("control, county", 0.04), ("control, local", 0.06)),
    ):
        yield _nevada(name, metres)
    yield _nevada("boundary, vertical", 0.05, Measure.MARK_HEIGHT)


ACCURACY_STANDARDS: dict[str, AccuracyStandard] = {standard.name: standard for standard in _all()}
"""Every class by its name, in the order of the reference page."""
