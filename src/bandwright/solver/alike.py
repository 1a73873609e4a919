"""A family's levels from those of one of its designs, by first-order changes, proven by counts.

With z the state of the leading design at its level E0, K(E0) z = 0, and K_i the matrix of another
design of the same pattern, that design's level lies to first order at

    E0 - (z . K_i(E0) z) / (z . K'(E0) z) ,

the exact gradient times the change of all its numbers. Counts half-way between neighbouring
guesses then bracket every level, as a scan would; where they do not, the design is scanned.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
import numpy.typing as npt

from .find import Asked, Brackets, Found, Solvable, find, refine
from .matrix import Counts, Matrix
from .system import apply, chunks

Floats = npt.NDArray[np.float64]
Indices = npt.NDArray[np.int64]

#: a pattern of fewer designs is scanned
_FEW = 6
#: most designs that lead others
_LEADERS = 4


@dataclass(frozen=True)
class Some:
    """Some designs of a family, counted anew from 0."""

    family: Solvable
    which: Indices

    @property
    def ends(self) -> tuple[str, str]:
        """The family's."""
        return self.family.ends

    @property
    def nodes(self) -> int:
        """Number of free faces."""
        return self.family.nodes

    @property
    def rows(self) -> int:
        """Number of slices."""
        return self.family.rows

    def count_and_pivot(self, energies: Floats, owner: Indices) -> tuple[Counts, Floats]:
        """Return how many levels of each energy's design lie below it, and K's last pivot."""
        return self.family.count_and_pivot(energies, self.which[owner])

    def matrix(self, energies: Floats, owner: Indices) -> Matrix:
        """Return K of each energy's design."""
        return self.family.matrix(energies, self.which[owner])

    def matrix_and_slope(self, energies: Floats, owner: Indices) -> tuple[Matrix, Matrix]:
        """Return K of each energy's design, and its derivative by E."""
        return self.family.matrix_and_slope(energies, self.which[owner])


class _Led(NamedTuple):
    """Designs whose levels a leader's foretell, by index, and where those are looked for."""

    which: Indices
    brackets: Brackets


def find_alike(family: Solvable, asked: Asked, accuracy: float) -> Found:
    """Return the levels asked of a family, design after design.

    Parameters
    ----------
    family : Solvable
    asked : Asked
        Of each design; ``skip`` is 0.
    accuracy : float
        How well the zeros of K are met [eV].
    """
    left = np.arange(len(asked.low))
    found: list[Found] = []
    for _ in range(_LEADERS):
        if len(left) < _FEW:
            break
        middle = left[len(left) // 2 : len(left) // 2 + 1]
        leader = find(Some(family, middle), asked.of(middle), accuracy)
        others = left[left != middle[0]]
        found.append(leader._replace(owner=middle[leader.owner]))
        left = others
        if not len(leader.energies) or not leader.single.all():
            break
        led = _foretold(family, leader, middle, others, asked.of(others))
        found.append(refine(family, led.brackets, accuracy))
        left = others[~np.isin(others, led.which)]
        if 2 * len(left) > len(others):
            break
    if len(left):
        rest = find(Some(family, left), asked.of(left), accuracy)
        found.append(rest._replace(owner=left[rest.owner]))
    return _merged(found)


def _foretold(
    family: Solvable, leader: Found, lead: Indices, others: Indices, asked: Asked
) -> _Led:
    """Return brackets of the designs where the leader's levels foretell every level asked."""
    levels, designs = len(leader.energies), len(others)
    slope = family.matrix_and_slope(leader.energies, np.repeat(lead, levels))[1]
    z = leader.nodes / np.sqrt(np.abs((leader.nodes * apply(slope, leader.nodes)).sum(axis=0)))
    # one row a design, one column a level
    owner = np.repeat(others, levels)
    energies = np.tile(leader.energies, designs)
    level = np.tile(np.arange(levels), designs)
    shift = np.empty(len(energies))
    for part in chunks(len(energies), family.rows):
        matrix = family.matrix(energies[part], owner[part])
        u = z[:, level[part]]
        shift[part] = (u * apply(matrix, u)).sum(axis=0)
    guess = (energies + shift).reshape(designs, levels)
    full = levels == asked.at_most  # more may follow
    step = guess[:, -1] - (guess[:, -2] if levels > 1 else asked.low)
    top = np.where(full, np.minimum(asked.high, guess[:, -1] + 0.5 * step), asked.high)
    walls = np.column_stack((asked.low, 0.5 * (guess[:, 1:] + guess[:, :-1]), top))
    inside = (guess > walls[:, :-1]) & (guess < walls[:, 1:])
    fair = np.flatnonzero(inside.all(axis=1))
    counted, _ = family.count_and_pivot(walls[fair].ravel(), np.repeat(others[fair], levels + 1))
    good = fair[(counted.reshape(-1, levels + 1) == np.arange(levels + 1)).all(axis=1)]
    columns = (good[:, None] * levels + np.arange(levels)).ravel()
    lows, highs = walls[good, :-1].ravel(), walls[good, 1:].ravel()
    return _Led(
        others[good],
        Brackets(
            owner[columns], leader.numbers[level[columns]], np.ones(len(columns), dtype=bool),
            lows, highs, guess[good].ravel(), z[:, level[columns]],
        ),
    )  # fmt: skip


def _merged(parts: list[Found]) -> Found:
    """Return the levels of several finds, design after design."""
    owner = np.concatenate([part.owner for part in parts])
    order = np.argsort(owner, kind="stable")
    return Found(
        np.concatenate([part.numbers for part in parts])[order],
        np.concatenate([part.energies for part in parts])[order],
        np.concatenate([part.nodes for part in parts], axis=1)[:, order],
        np.concatenate([part.single for part in parts])[order],
        owner[order],
    )
