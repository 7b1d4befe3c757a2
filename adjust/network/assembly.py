"""The whole plan: the network grown from known marks, and figures of their own laid over it where it does not reach."""

from __future__ import annotations

from collections.abc import Iterator

from adjust.network.constructions.loci import Circle, Ray
from adjust.network.constructions.similarity import Similarity
from adjust.network.deciding import grow_decidedly
from adjust.network.evidence import loci_of
from adjust.network.figure import Figure
from adjust.network.overlay import host_of_two, overlay, shared_marks
from adjust.network.searching import search
from adjust.network.seeds import figure_from_line, figure_from_round, lines_in_order, rounds_in_order
from adjust.network.survey import Survey

DRAWN_SIDE = 100.0
"""Length, metres, at which the first side of a free network without distances is drawn: a usual length of a sight."""


class Assembly:
    """Builds the plan of a network.

    `known` marks have points on the working plane; `wanted` marks need one. In a `free` network, without control, the
    largest figure may lie and turn as it was drawn. `world` holds what was found, `figures` what could not be laid
    over it, `notes` what was decided for the surveyor, `found_by_search` the marks that no construction reached. Where
    not `searching`, these stay without a point.
    """

    def __init__(
        self, survey: Survey, known: dict[int, complex], wanted: set[int], *, free: bool, searching: bool = True
    ) -> None:
        self.survey, self.free = survey, free
        self.world = Figure(survey, scaled=True)
        self.world.find_north()
        self.world.place_all(known.items())
        self.figures: dict[int, Figure] = {}
        self.notes: list[str] = []
        self.found_by_search: list[int] = []
        self._homes: dict[int, set[int]] = {}
        self._born = 0
        self._looked_at = 0
        self._open = sorted(wanted)
        constructions = (self._turn_hinges, self._decide, self._draw_freely)
        self._last_resorts = (*constructions, self._search) if searching else constructions

    def missing(self) -> list[int]:
        """Wanted marks that have no point yet."""
        return [mark for mark in self._open if mark not in self.world.points]

    def _complete(self) -> bool:
        while self._open and self._open[-1] in self.world.points:
            self._open.pop()
        return not self._open

    def run(self) -> None:
        """Place all that can be placed."""
        grow_decidedly(self.world)
        for figure in self._new_figures():
            self._fit_in(figure)
        while not self._complete() and any(step() for step in self._last_resorts):
            pass

    def _new_figures(self) -> Iterator[Figure]:
        """Figures grown from rounds, then from distances, that nothing placed so far accounts for."""
        for number in rounds_in_order(self.survey):
            if self._complete():
                return
            if not self._has_round(number) and (figure := figure_from_round(self.survey, number)) is not None:
                yield figure
        for one, other in lines_in_order(self.survey):
            if self._complete():
                return
            if not self._has_line(one, other) and (figure := figure_from_line(self.survey, one, other)) is not None:
                yield figure

    def _has_round(self, number: int) -> bool:
        station = self.survey.station[number]
        return any(number in figure.orientations for figure in self._figures_of(station))

    def _has_line(self, one: int, other: int) -> bool:
        return any(other in figure.points for figure in self._figures_of(one))

    def _figures_of(self, mark: int) -> list[Figure]:
        """The figures in which a mark has a point, the world first."""
        own = [self.figures[name] for name in sorted(self._homes.get(mark, ()))]
        return [self.world, *own] if mark in self.world.points else own

    def _fit_in(self, figure: Figure) -> None:
        """Join a figure with every other one it can be laid over; keep it where it is alone."""
        while (name := self._partner(figure)) is not None:
            partner = self._forget(name)
            figure = self._joined(*host_of_two(figure, partner))
        if not self._laid_over_world(figure):
            self._keep(figure)

    def _partner(self, figure: Figure) -> int | None:
        """Another figure that this one can be laid over; None where the world is to be tried."""
        names = {name for mark in figure.points for name in self._homes.get(mark, ())}
        for name in sorted(names):
            guest, host = host_of_two(figure, self.figures[name])
            if overlay(guest, host) is not None:
                return name
        return None

    def _joined(self, guest: Figure, host: Figure) -> Figure:
        similarity = overlay(guest, host)
        assert similarity is not None
        guest.transform(similarity)
        host.absorb(guest)
        grow_decidedly(host)
        return host

    def _laid_over_world(self, figure: Figure) -> bool:
        if overlay(figure, self.world) is None:
            return False
        self._joined(figure, self.world)
        self._look_again()
        return True

    def _look_again(self) -> None:
        """Lay over the world the figures that share marks it has found since it was looked at last."""
        while self._looked_at < len(self.world.points):
            new = list(self.world.points)[self._looked_at :]
            self._looked_at = len(self.world.points)
            for name in sorted({name for mark in new for name in self._homes.get(mark, ())}):
                if overlay(self.figures[name], self.world) is not None:
                    self._joined(self._forget(name), self.world)

    def _keep(self, figure: Figure) -> None:
        self._born += 1
        self.figures[self._born] = figure
        for mark in figure.points:
            self._homes.setdefault(mark, set()).add(self._born)

    def _forget(self, name: int) -> Figure:
        figure = self.figures.pop(name)
        for mark in figure.points:
            self._homes[mark].discard(name)
        return figure

    def _turn_hinges(self) -> bool:
        """Use what ties a figure to the world beyond the one mark they share.

        Its marks lie on circles about the hinge, or on rays from it where the figure knows north but not the metre.
        """
        before = len(self.world.points)
        for figure in list(self.figures.values()):
            shared = shared_marks(figure, self.world)
            if len(shared) == 1 and (figure.scaled or figure.northed):
                self._hint(figure, shared[0])
        grow_decidedly(self.world)
        self._look_again()
        return len(self.world.points) > before

    def _hint(self, figure: Figure, hinge: int) -> None:
        centre = self.world.points[hinge]
        for mark, point in figure.points.items():
            arm = point - figure.points[hinge]
            if mark == hinge or not arm or mark in self.world.hints or not loci_of(self.world, mark):
                continue
            locus = Circle(centre, abs(arm)) if figure.scaled else Ray(centre, arm / abs(arm))
            self.world.hints[mark] = [locus]
            self.world.call_up(mark)

    def _decide(self) -> bool:
        """Try once more to decide marks with two points left, now that more is known around them."""
        before = len(self.world.points)
        grow_decidedly(self.world)
        self._look_again()
        return len(self.world.points) > before

    def _draw_freely(self) -> bool:
        """In a free network, let the largest figure lie as it was drawn; whether there was one to draw."""
        candidates = [
            (len(figure.points), -name)
            for name, figure in self.figures.items()
            if len(shared_marks(figure, self.world)) < 2 and not len(self.world.points) > 1
        ]
        if not self.free or not candidates:
            return False
        figure = self._forget(-max(candidates)[1])
        turn = 1.0 if figure.scaled else DRAWN_SIDE
        shared = shared_marks(figure, self.world)
        shift = self.world.points[shared[0]] - turn * figure.points[shared[0]] if shared else 0j
        self._note_drawing(figure, bool(shared))
        figure.transform(Similarity(turn + 0j, shift))
        self.world.absorb(figure)
        grow_decidedly(self.world)
        self._look_again()
        return True

    def _search(self) -> bool:
        """Search for the marks that are left by fitting them all at once; whether they were found."""
        missing = self.missing()
        found = search(self.world, missing)
        if found is None:
            return False
        self.found_by_search = missing
        self.world.place_all(found.items())
        grow_decidedly(self.world)
        return True

    def _note_drawing(self, figure: Figure, placed: bool) -> None:
        arbitrary = [] if placed else ["origin"]
        arbitrary += [] if figure.northed else ["north"]
        if arbitrary:
            self.notes.append(f"free network: {' and '.join(arbitrary)} of the first sight drawn")
        if not figure.scaled:
            self.notes.append(f"free network without distances: its first side is drawn {DRAWN_SIDE:g} m long")
        if not figure.handed:
            self.notes.append("free network of distances alone: it may be a mirror image of the ground")
