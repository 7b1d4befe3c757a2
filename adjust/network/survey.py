"""The plan relations as lists of neighbours: what stands on a mark, what sees it, what is measured from it."""

from __future__ import annotations

from adjust.network.plan_relations import PlanRelations


class Survey:
    """Neighbours of marks and rounds. Lists run over marks or rounds; nothing changes once it is built.

    `sights[round]` maps targets to readings; `rounds[mark]` stand on it, `seen_by[mark]` see it; `distances[mark]` maps
    the other ends of its lines to their lengths. `north` lists the rounds whose circle counts from north.
    """

    def __init__(self, relations: PlanRelations, marks: int) -> None:
        self.station: list[int] = relations.station.tolist()
        self.northed: list[bool] = relations.northed.tolist()
        self.sights: list[dict[int, float]] = [{} for _ in self.station]
        self.rounds: list[list[int]] = [[] for _ in range(marks)]
        self.seen_by: list[list[int]] = [[] for _ in range(marks)]
        self.distances: list[dict[int, float]] = [{} for _ in range(marks)]
        for number, mark in enumerate(self.station):
            self.rounds[mark].append(number)
        rays = zip(relations.round.tolist(), relations.target.tolist(), relations.reading.tolist(), strict=True)
        for number, target, reading in rays:
            self.sights[number][target] = reading
            self.seen_by[target].append(number)
        for (one, other), length in zip(relations.ends.tolist(), relations.length.tolist(), strict=True):
            self.distances[one][other] = self.distances[other][one] = length

    @property
    def north(self) -> list[int]:
        """Rounds that carry their own orientation."""
        return [number for number, northed in enumerate(self.northed) if northed]

    def neighbours(self, mark: int) -> list[int]:
        """Marks that share a sight or a distance with a mark, in a fixed order, perhaps repeated."""
        seen = [target for number in self.rounds[mark] for target in self.sights[number]]
        seeing = [self.station[number] for number in self.seen_by[mark]]
        return [*seen, *seeing, *self.distances[mark]]
