"""What data tell of factors, and which they leave open: singular values and correlations."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
import scipy.linalg

Floats = npt.NDArray[np.float64]

#: a combination of factors is open where its singular value, of slopes scaled to unit length, is
#: below this share of the largest
SINGULAR = 1e-6
#: a factor is not seen where twice as much of it moves no datum by this many standard deviations
UNSEEN = 1e-3
#: correlations above this are said
CORRELATED = 0.95
#: least share of an open combination that a factor has a part in
_PART = 1e-3


@dataclass(frozen=True, eq=False)
class Told:
    """What slopes tell of coordinates.

    Attributes
    ----------
    slopes : array (n_data, n_factors)
        Of the data in standard deviations.
    open : array (n_factors, n_open)
        Orthonormal combinations of coordinates that no datum sees.
    unseen : array of bool (n_factors,)
        Factors that no datum sees, each alone.
    """

    slopes: Floats
    open: Floats
    unseen: npt.NDArray[np.bool_]

    @property
    def closed(self) -> Floats:
        """Orthonormal combinations that the data see, (n_factors, n_seen)."""
        if not self.open.shape[1]:
            return np.eye(len(self.open))
        return np.asarray(scipy.linalg.null_space(self.open.T))

    @property
    def members(self) -> npt.NDArray[np.bool_]:
        """Whether a factor has a part in what is open, (n_factors,)."""
        return np.asarray((self.open**2).sum(axis=1) > _PART)

    def covariance(self) -> Floats:
        """Return the covariance of the coordinates, inf for those that are open."""
        basis = self.closed
        inner = self.slopes @ basis
        # by its singular values, which loses half as many digits as the normal equations
        _, sizes, turns = np.linalg.svd(inner, full_matrices=False)
        root = basis @ turns.T / sizes
        found = root @ root.T
        found[self.members, :] = np.nan
        found[:, self.members] = np.nan
        found[self.members, self.members] = np.inf
        return np.asarray(found)


def told(slopes: Floats) -> Told:
    """Return what slopes tell of coordinates.

    Examples
    --------
    Both columns move every datum alike, so only their sum is seen:

    >>> found = told(np.array([[1.0, 1.0], [2.0, 2.0], [3.0, 3.0]]))
    >>> np.abs(found.closed.round(3)).tolist(), found.members.tolist()
    ([[0.707], [0.707]], [True, True])
    """
    sizes = np.linalg.norm(slopes, axis=0)
    unseen = sizes < UNSEEN
    seen = np.flatnonzero(~unseen)
    _, values, turns = np.linalg.svd(slopes[:, seen] / sizes[seen], full_matrices=True)
    values = np.concatenate((values, np.zeros(len(seen) - len(values))))
    weak = turns[values < SINGULAR * values.max(initial=0.0)]
    combinations = np.zeros((len(sizes), len(weak) + int(unseen.sum())))
    combinations[seen, : len(weak)] = (weak / sizes[seen]).T
    combinations[np.flatnonzero(unseen), np.arange(len(weak), combinations.shape[1])] = 1.0
    return Told(slopes, np.linalg.qr(combinations)[0], unseen)


def correlation(covariance: Floats) -> Floats:
    """Return the correlations of a covariance; nan with what is open.

    Examples
    --------
    >>> correlation(np.array([[4.0, 1.0], [1.0, 1.0]])).tolist()
    [[1.0, 0.5], [0.5, 1.0]]
    """
    sigmas = np.sqrt(np.diag(covariance))
    with np.errstate(invalid="ignore"):
        return np.asarray(covariance / np.outer(sigmas, sigmas))


def words(found: Told, names: Sequence[str], correlations: Floats) -> tuple[str, ...]:
    """Return in sentences which factors the data can't tell apart."""
    texts = []
    for name, alone in zip(names, found.unseen, strict=True):
        if alone:
            texts.append(f"{name}: these data do not see it; leave it out, or measure what it"
                         " moves")  # fmt: skip
    parts = zip(names, found.members, found.unseen, strict=True)
    together = [name for name, member, alone in parts if member and not alone]
    if together:
        texts.append(
            f"{_listed(together)} can't be told apart by these data: together they move nothing"
            f" that was measured (a singular value below {SINGULAR:g} of the largest), so the fit"
            " moved them as little as it must; leave one out"
        )
    for place, name in enumerate(names):
        for other in range(place):
            size = correlations[place, other]
            if abs(size) > CORRELATED:  # nan is not
                texts.append(
                    f"{_listed([names[other], name])} are hardly told apart: correlation"
                    f" {size:+.4f}, beyond {CORRELATED:g} in size; only one combination of both"
                    " is well known"
                )
    return tuple(texts)


def _listed(names: Sequence[str]) -> str:
    return f"{', '.join(names[:-1])} and {names[-1]}" if len(names) > 1 else names[0]
