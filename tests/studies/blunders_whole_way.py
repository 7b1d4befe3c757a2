"""Blunders in readings, found the whole way: start coordinates, adjustment, search, words."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from adjust import Job, adjust
from adjust.blunders import Findings, find_blunders, find_blunders_of
from adjust.errors import HubtackError
from adjust.frames import Geometry
from adjust.quality import non_centrality
from adjust.simulate import Blunder, observe
from tests.studies.blunder_networks import SEPARABLE, Network, levels, total_station, traverses, triangulation, vectors

SEED = 20261202
WHOLE_JOBS = 30
GROSS_JOBS = 30
GROSS_SHARE = 0.05
"""Of the observations that are grossly wrong."""
NEAR = 0.02
"""Metres: a network that stands within that of the one without gross errors stands where it should."""

SHAPES: dict[str, Callable[[np.random.Generator], Job]] = {
    "levels, 25 marks, run twice": levels(5, 5, 2),
    "tied traverses, 10 marks": traverses(4),
    "triangulation, 24 marks": triangulation(4, 6),
    "total station, 20 marks": total_station(4, 5),
    "GNSS, 20 marks": vectors(4, 5),
}


@dataclass(frozen=True)
class Outcome:
    """One job with gross errors."""

    adjusted: bool
    """Whether the adjustment settles with the errors in it."""
    settled: bool
    """Whether the search for blunders ends, with or without an adjustment to begin from."""
    near: bool
    """Whether the network without what was found stands where it should."""
    covered: bool
    """Whether every error is named or may stand in the place of what is."""
    right: bool
    """Whether exactly the wrong lines are named."""


def whole(jobs: int) -> str:
    """Two separable blunders in readings: `find_blunders`."""
    from tests.studies.blunders import percent, row, table

    lines = table("network", "jobs", "all named, nothing else", "in the sets")
    for name, plan in SHAPES.items():
        found = [outcome(*with_two_blunders(plan, number)) for number in range(jobs)]
        lines += row(name, jobs, percent([o.right for o in found]), percent([o.covered for o in found]))
    return "".join(lines)


def gross(jobs: int) -> str:
    """One observation in twenty wrong by up to its whole reading."""
    from tests.studies.blunders import percent, row, table

    lines = table(
        "network", "jobs", "gross errors", "adjustment settles", "search ends near the truth", "all in the sets"
    )
    for name, plan in SHAPES.items():
        made = [with_gross_errors(plan, number) for number in range(jobs)]
        found = [outcome(*job) for job in made]
        count = sum(len(blunders) for _, _, blunders in made)
        shares = [percent([getattr(o, part) for o in found]) for part in ("adjusted", "near", "covered")]
        lines += row(name, jobs, f"{count:,}", *shares)
    return "".join(lines)


def with_gross_errors(plan: Callable[[np.random.Generator], Job], number: int) -> tuple[Job, Job, tuple[Blunder, ...]]:
    """A job with gross errors, the same without them, and what they are."""
    drawn = plan(np.random.default_rng([SEED, number]))
    clean, _ = observe(drawn, np.random.default_rng([SEED, number, 1]))
    generator = np.random.default_rng([SEED, number, 2])
    rows = [(kind, row) for kind in clean.observations if kind.kind != "control" for row in range(len(kind))]
    chosen = generator.choice(len(rows), max(1, round(GROSS_SHARE * len(rows))), replace=False)
    blunders = []
    for kind, row in (rows[place] for place in chosen):
        component = int(generator.integers(len(kind.components)))
        size = float(generator.uniform(-1.0, 1.0) * kind.observed[row, component])
        blunders.append(Blunder(kind.provenance.label(row), size, component))
    wrong, _ = observe(drawn, np.random.default_rng([SEED, number, 1]), blunders)
    return wrong, clean, tuple(blunders)


def with_two_blunders(plan: Callable[[np.random.Generator], Job], number: int) -> tuple[Job, Job, tuple[Blunder, ...]]:
    """A job with two separable blunders of 2 to 10 times their minimal detectable bias."""
    drawn = plan(np.random.default_rng([SEED, number]))
    clean, _ = observe(drawn, np.random.default_rng([SEED, number, 1]))
    generator = np.random.default_rng([SEED, number, 2])
    network = Network.of(drawn, generator, False, False)
    detectable = np.sqrt(non_centrality(0.001, 0.80) / np.diagonal(network.information))
    apart = np.concatenate(network.places)[network.closest < SEPARABLE]
    chosen: dict[str, Blunder] = {}
    while len(chosen) < 2:
        place = int(generator.choice(apart))
        hypothesis = network.hypotheses.hypothesis(place)
        kind, _ = hypothesis.rows[0]
        rows = clean.observations[kind]
        if rows.kind == "control":
            continue
        component = rows.components.index(hypothesis.components[0])
        size = float(generator.uniform(2.0, 10.0) * generator.choice([-1.0, 1.0]) * detectable[place])
        chosen[hypothesis.name] = Blunder(hypothesis.name, size, component)
    wrong, _ = observe(drawn, np.random.default_rng([SEED, number, 1]), list(chosen.values()))
    return wrong, clean, tuple(chosen.values())


def outcome(wrong: Job, clean: Job, blunders: tuple[Blunder, ...]) -> Outcome:
    """What becomes of one job."""
    reference = adjust(clean).geometry
    adjusted, findings = _found(wrong)
    if findings is None:
        return Outcome(adjusted, settled=False, near=False, covered=False, right=False)
    planted = {blunder.source for blunder in blunders}
    named = [blunder.name for blunder in findings.blunders]
    sets = {*named, *(other.name for blunder in findings.blunders for other in blunder.alternatives)}
    return Outcome(
        adjusted=adjusted,
        settled=True,
        near=_apart(reference, findings.state.geometry) < NEAR,
        covered=planted <= sets,
        right=sorted(named) == sorted(planted),
    )


def _found(job: Job) -> tuple[bool, Findings | None]:
    try:
        return True, find_blunders(adjust(job))
    except HubtackError:
        pass
    try:
        return False, find_blunders_of(job)
    except HubtackError:
        return False, None


def _apart(one: Geometry, other: Geometry) -> float:
    """The longest way, metres, along one axis from a mark of one geometry to that of another."""
    away = one.frame.displacement(one.coordinates, other.coordinates)
    return float(np.nanmax(np.abs(away)))
