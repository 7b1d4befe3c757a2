"""Published classes of tolerance: the printed figures, where they stand, and which of them were recalled.

Lengths K, E, D of a line or loop are its one-way length in kilometres, n the number of angles.
"""

from __future__ import annotations

from dataclasses import dataclass

from adjust.tolerances.rules import Quantity, Rule, per_root_kilometre
from adjust.units import ARCSEC

MILLIMETRE = 1e-3

FGCC = (
    "Federal Geodetic Control Committee (1984), Standards and Specifications for Geodetic Control Networks, "
    "3.5 (levelling), 3.4 (traverse)"
)
ICSM = "ICSM, Standards and Practices for Control Surveys (SP1), version 1, levelling classes"
ARMY = "US Army Engineer School (2001), Subcourse EN0593 Surveying III, p. 4-4"
WASHINGTON = "Washington Administrative Code 332-130-090"
TEXAS = "Texas Department of Transportation, accuracy table of right-of-way agreements"


@dataclass(frozen=True)
class Figure:
    """One printed tolerance of a standard."""

    quantity: Quantity
    rule: Rule


@dataclass(frozen=True)
class Standard:
    """One class of a published standard, by the name that a job chooses it by."""

    name: str
    source: str
    figures: tuple[Figure, ...]


class _Class:
    """Collects the figures of one class."""

    def __init__(self, name: str, source: str) -> None:
        self.name, self.source = name, source
        self.figures: list[Figure] = []

    def level(self, quantity: Quantity, millimetres: float, length: str, *, recalled: bool = False) -> _Class:
        """Millimetres times the root of kilometres."""
        return self._add(
            quantity,
            f"{millimetres:g} mm √{length}, {length} in km",
            recalled,
            per_root=per_root_kilometre(millimetres * MILLIMETRE),
        )

    def angles(self, arcseconds: float, *, recalled: bool = False) -> _Class:
        """Arcseconds times the root of the number of angles."""
        return self._add(Quantity.ANGLES, f'{arcseconds:g}" √n', recalled, per_root=arcseconds * ARCSEC)

    def ratio(self, denominator: int, *, recalled: bool = False) -> _Class:
        """One part in so many of the length."""
        return self._add(Quantity.POSITION, f"1:{denominator}", recalled, proportional=1.0 / denominator)

    def position(self, metres: float, *, recalled: bool = False) -> _Class:
        """Metres times the root of kilometres."""
        return self._add(Quantity.POSITION, f"{metres:g} m √K, K in km", recalled, per_root=per_root_kilometre(metres))

    def _add(self, quantity: Quantity, printed: str, recalled: bool, **factors: float) -> _Class:
        rule = Rule(printed, source=self.name, recalled=recalled, **factors)
        self.figures.append(Figure(quantity, rule))
        return self

    def done(self) -> Standard:
        return Standard(self.name, self.source, tuple(self.figures))


def _fgcc(order: str, run: float, loop: float, angle: float, metres: float, ratio: int) -> Standard:
    """Section and loop figures of levelling, azimuth and position figures of traverses.

    The loop figures 4 and 12 mm are corroborated in print; those between, and all of traverses, are recalled. Where two
    rules stand for the position the smaller closure counts (FGCC 1984, footnote of the table, from memory).
    """
    recalled = loop not in (4, 12)
    figures = _Class(f"FGCC 1984 {order}", FGCC)
    figures.level(Quantity.LEVEL_RUNS, run, "D").level(Quantity.LEVEL_LOOP, loop, "E", recalled=recalled)
    figures.angles(angle, recalled=True).position(metres, recalled=True).ratio(ratio, recalled=True)
    return figures.done()


def _icsm(name: str, millimetres: float, *, recalled: bool = True) -> Standard:
    """One printed figure, for forward against backward; taken for loops too (common practice, no source)."""
    figures = _Class(f"ICSM SP1 {name}", ICSM)
    for quantity in (Quantity.LEVEL_RUNS, Quantity.LEVEL_LOOP):
        figures.level(quantity, millimetres, "d", recalled=recalled)
    return figures.done()


def _traverse(name: str, source: str, arcseconds: float, ratio: int) -> Standard:
    return _Class(f"{name} 1:{ratio}", source).angles(arcseconds).ratio(ratio).done()


_ALL = (
    _fgcc("first order class I", 3, 4, 1.7, 0.04, 100_000),
    _fgcc("first order class II", 4, 5, 1.7, 0.04, 100_000),
    _fgcc("second order class I", 6, 6, 3.0, 0.08, 50_000),
    _fgcc("second order class II", 8, 8, 4.5, 0.20, 20_000),
    _fgcc("third order class I", 12, 12, 10.0, 0.40, 10_000),
    _fgcc("third order class II", 12, 12, 12.0, 0.80, 5_000),
    _icsm("L2A", 2, recalled=False),
    _icsm("LA", 4, recalled=False),
    _icsm("LB", 8),
    _icsm("LC", 12),
    _icsm("LD", 18),
    _icsm("LE", 36),
    _Class("US Army second order", ARMY)
    .level(Quantity.LEVEL_LOOP, 8.4, "K")
    .level(Quantity.LEVEL_RUNS, 9.0, "K")
    .done(),
    _traverse("WAC 332-130-090", WASHINGTON, 10, 10_000),
    _traverse("WAC 332-130-090", WASHINGTON, 30, 5_000),
    _traverse("TxDOT right of way", TEXAS, 15, 10_000),
    _traverse("TxDOT right of way", TEXAS, 10, 15_000),
)

STANDARDS: dict[str, Standard] = {standard.name: standard for standard in _ALL}
"""Every class by its name, in the order of the reference page."""
