"""Everything that is supposed to be wrong, in turn: each observation, each correlated one as a whole, each group."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from scipy.sparse import block_diag, csc_array, csr_array, hstack

from adjust.arrays import FloatArray, IntArray
from adjust.blunders.evidence import Evidence
from adjust.blunders.groups import Group, find_groups
from adjust.blunders.hypothesis import Hypothesis
from adjust.blunders.information import DenseInformation, InformationMatrix, SparseInformation
from adjust.blunders.system import System
from adjust.model import Block

MOST_DENSE = 2500
"""Columns up to which all of G is held, 50 MB; beyond it comes column by column, from the factor."""


@dataclass(frozen=True)
class Hypotheses:
    """All hypotheses of a system, numbered: components in the order of system rows, then whole vectors, then groups."""

    system: System
    groups: tuple[Group, ...]

    @classmethod
    def of(cls, system: System, interesting: IntArray | None = None) -> Hypotheses:
        """All of a small job; of a large one, the groups that enter one of the `interesting` system rows."""
        mask = None
        if interesting is not None:
            mask = np.zeros(system.model.observation_rows, dtype=bool)
            mask[interesting] = True
        return cls(system, tuple(find_groups(system, mask)))

    @cached_property
    def rows(self) -> int:
        """System rows, which are the hypotheses of single components."""
        return self.system.model.observation_rows

    @cached_property
    def _correlated(self) -> list[Block]:
        return [block for block in self.system.model.blocks if block.components > 1]

    @cached_property
    def first_group(self) -> int:
        """Number of the first group."""
        return self.rows + sum(len(block.observations) for block in self._correlated)

    def hypothesis(self, number: int) -> Hypothesis:
        """One of them, with its words."""
        if number >= self.first_group:
            return self.groups[number - self.first_group].hypothesis
        if number >= self.rows:
            return self._whole(number - self.rows)
        place = max(i for i, block in enumerate(self.system.model.blocks) if block.offset <= number)
        block = self.system.model.blocks[place]
        row, component = divmod(number - block.offset, block.components)
        return _of_row(place, block, row, (block.observations.components[component],))

    def _whole(self, number: int) -> Hypothesis:
        for place, block in enumerate(self.system.model.blocks):
            if block.components > 1:
                if number < len(block.observations):
                    return _of_row(place, block, number, block.observations.components)
                number -= len(block.observations)
        raise IndexError(number)

    @cached_property
    def columns(self) -> csr_array:
        """H (rows, columns), whitened: what an error of one metre or radian does to each row in its own sds."""
        singles = [self._singles(block, factor) for block, factor in self.system.blocks()]
        return csr_array(
            hstack([block_diag(singles, format="csc"), *map(self._group_columns, self.groups)], format="csr")
        )

    @staticmethod
    def _singles(block: Block, factor: FloatArray) -> csc_array:
        width = block.components
        count = len(factor) * width
        row = np.repeat(np.arange(count), width)
        column = np.repeat(np.arange(count).reshape(-1, width), width, axis=0).ravel()
        return csc_array((factor.ravel(), (row, column)), shape=(count, count))

    def _group_columns(self, group: Group) -> csc_array:
        width = len(group.hypothesis.components)
        columns = csc_array((self.rows, width))
        for (place, rows), effect in zip(group.hypothesis.rows, group.effects, strict=True):
            block, factor = self.system.model.blocks[place], self.system.linearisation.factors[place]
            values = np.einsum("rij,rjq->riq", factor[rows], effect)
            row = block.offset + rows[:, None] * block.components + np.arange(block.components)
            places = (np.repeat(row.ravel(), width), np.tile(np.arange(width), row.size))
            columns = columns + csc_array((values.ravel(), places), shape=columns.shape)
        return csc_array(columns)

    @cached_property
    def information(self) -> InformationMatrix:
        """G of all columns."""
        columns, matrix = self.columns, self.system.matrix
        through = csr_array(matrix.T @ columns)
        if columns.shape[1] <= MOST_DENSE:
            spread = through.toarray()
            whole = (columns.T @ columns).toarray() - spread.T @ self.system.factor.normal_solve(spread)
            return DenseInformation((whole + whole.T) / 2)
        return SparseInformation(columns, through, self.system.factor, self._single_blocks())

    def evidence(self, chosen: Sequence[int] = (), errors: FloatArray | None = None) -> Evidence:
        """Scores and information of all columns.

        `chosen` hypotheses with their `errors` ∇₀ (s,) are known about already. The observations are freed of them
        before the residuals e₀ are taken, and score and vᵀPv put together again as g = Hᵀe₀ + G∇₀ and
        e₀ᵀe₀ + 2∇₀ᵀHᵀe₀ + ∇₀ᵀG∇₀: what is small then stays exact beside errors that are a million times as large.
        """
        members, numbers = self._members()
        owned = [members[size][numbers[size] == number][0] for number in chosen for size in [self._size(number)]]
        known = np.concatenate([np.empty(0, dtype=np.int64), *owned])
        sizes = np.empty(0) if errors is None else errors
        residual = self.system.residual_without(self.columns[:, known] @ sizes)
        score = np.asarray(self.columns.T @ residual)
        strips = self.information.columns(known)
        returned = strips @ sizes
        return Evidence(
            score=score + returned,
            information=self.information,
            weight=np.asarray(self.columns.multiply(self.columns).sum(axis=0)).ravel(),
            members=members,
            numbers=numbers,
            shared=np.arange(self.first_group + len(self.groups)) >= self.first_group,
            square_sum=float(residual @ residual + 2.0 * sizes @ score[known] + sizes @ returned[known]),
            freedom=self.system.freedom,
        )

    def _size(self, number: int) -> int:
        return len(self.hypothesis(number).components)

    def _members(self) -> tuple[dict[int, IntArray], dict[int, IntArray]]:
        """Columns (m, q) and numbers (m,) of the hypotheses by their size q."""
        parts: list[tuple[IntArray, int]] = [(np.arange(self.rows)[:, None], 0)]
        number, used = self.rows, self.rows
        for block in self._correlated:
            first = np.arange(len(block.observations))[:, None] * block.components + block.offset
            parts.append((first + np.arange(block.components), number))
            number += len(first)
        for group in self.groups:
            width = len(group.hypothesis.components)
            parts.append((np.arange(used, used + width)[None], number))
            number, used = number + 1, used + width
        sizes = sorted({part.shape[1] for part, _ in parts})
        of_size = {size: [(part, first) for part, first in parts if part.shape[1] == size] for size in sizes}
        return (
            {size: np.concatenate([part for part, _ in found]) for size, found in of_size.items()},
            {
                size: np.concatenate([first + np.arange(len(part)) for part, first in found])
                for size, found in of_size.items()
            },
        )

    def _single_blocks(self) -> tuple[tuple[int, FloatArray], ...]:
        """First column and information (rows, c, c) of the rows of each kind: L⁻ᵀ (I − leverage) L⁻¹."""
        blocks = zip(self.system.blocks(), self.system.leverage, strict=True)
        return tuple(
            (block.offset, np.einsum("rij,rik,rkl->rjl", factor, np.eye(block.components) - leverage, factor))
            for (block, factor), leverage in blocks
        )


def _of_row(place: int, block: Block, row: int, components: Sequence[str]) -> Hypothesis:
    rows = block.observations
    name = rows.provenance.label(row)
    nature = "vector" if len(components) > 1 else "observation"
    return Hypothesis(nature, name, ((place, np.array([row])),), tuple(components), rows.unit)  # type: ignore[arg-type]
