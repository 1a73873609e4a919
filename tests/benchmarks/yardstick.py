"""The yardstick: finite volumes as a careful engineer writes them, with LAPACK underneath.

A uniform grid with walls at its ends, V averaged over each cell exactly. For the flux between two
neighbours there are two habits: "m", h2m (u' - u) / (integral of m between them), keeps second
order wherever the faces fall; "1/m", the mean of 1/m in place of 1 over the mean of m, is as often
seen and of first order where a face falls between nodes. `scipy.linalg.eigh_tridiagonal` with
`select` then returns the levels asked and no others.
"""

from __future__ import annotations

import numpy as np
from scipy.linalg import eigh_tridiagonal

from bandwright.constants import H2M

NEWTON_STEPS = 12


class TooFine(RuntimeError):
    """No grid within reason holds the error asked."""


def running(faces, powers, z):
    """Integral from the first face to each z, of a piecewise polynomial; z ascending."""
    thickness = np.diff(faces)
    order = np.arange(1, len(powers) + 1)[:, None]
    rising = powers / order
    whole = np.zeros(len(thickness))
    for row in rising[::-1]:
        whole = (whole + row) * thickness
    total = np.concatenate(([0.0], np.cumsum(whole)))
    where = np.clip(np.searchsorted(faces, z, side="right") - 1, 0, len(thickness) - 1)
    depth = z - faces[where]
    part = np.zeros(len(z))
    for row in rising[::-1]:
        part = (part + row[where]) * depth
    return total[where] + part


def averages(plain, cells, mean="m"):
    """V averaged over the cells, and the mean mass and its slope by E from node to node."""
    step = plain.faces[-1] / cells
    nodes = step * np.arange(cells + 1)
    edge = np.diff(running(plain.faces, plain.edge, nodes[:-1] + 0.5 * step)) / step
    if mean == "m":
        mass = np.diff(running(plain.faces, plain.mass, nodes)) / step
    else:
        mass = step / np.diff(running(plain.faces, plain.light, nodes))
    slope = np.diff(running(plain.faces, plain.slope, nodes)) / step if plain.two_band else None
    return step, edge, mass, slope


def matrix(step, edge, mass):
    """Diagonal and off-diagonal of the tridiagonal matrix at the nodes between the walls."""
    flux = H2M / (step * step * mass)
    return flux[:-1] + flux[1:] + edge, -flux[1:-1]


def solve(plain, cells, high, *, states=False, mean="m", tol=0.0):
    """Return the levels below ``high`` of the one-band model, and states (n_nodes, n_levels).

    ``tol`` is the accuracy asked of LAPACK's bisection; 0 is its default, about rounding.
    """
    step, edge, mass, _ = averages(plain, cells, mean)
    diagonal, off = matrix(step, edge, mass)
    wanted = {"select": "v", "select_range": (float(edge.min()), high), "tol": tol}
    if not states:
        return eigh_tridiagonal(diagonal, off, eigvals_only=True, **wanted)
    energies, u = eigh_tridiagonal(diagonal, off, **wanted)
    return energies, u / np.sqrt(step)


def dipoles(plain, cells, u):
    """Matrix elements of z [nm] from the states of `solve`."""
    step = plain.faces[-1] / cells
    z = step * np.arange(1, cells)
    return (u.T * z) @ u * step


def solve_two_band(plain, cells, levels, *, tol=0.0):
    """Return the lowest levels of the two-band model by Newton on E, one level at a time.

    The matrix at a mass frozen at E has the level mu(E); E = mu(E) is wanted, and
    d mu/dE = -(sum of flux' (u' - u)^2) follows from the eigenvector of the same solve.
    """
    step, edge, mass, slope = averages(plain, cells)
    energies = np.empty(levels)
    guess = float(edge.min())
    for level in range(levels):
        energy = guess
        for _ in range(NEWTON_STEPS):
            local = mass + energy * slope
            mu, u = eigh_tridiagonal(
                *matrix(step, edge, local), select="i", select_range=(level, level), tol=tol
            )
            jump = np.diff(u[:, 0], prepend=0.0, append=0.0)
            rate = -np.sum(H2M * slope / (step * local) ** 2 * jump * jump)
            move = (mu[0] - energy) / (1.0 - rate)
            energy += move
            if abs(move) < 1e-9:
                break
        energies[level] = guess = energy
    return energies


def grid(question, tolerance, solver, most=1_000_000):
    """Return the fewest cells found whose true error over all levels stays within a tolerance.

    ``solver(cells)`` returns the energies. Doubling, on the way grids that have faces at whole
    tenths of a nanometre as nodes; then bisection; then smaller grids on which the error may
    happen to be small. Not timed.
    """

    def holds(cells):
        return question.error(solver(cells)) <= tolerance

    length = float(question.plain.faces[-1])
    tenths = round(length * 10)
    fine = max(32, int(length / 0.5))
    while not holds(fine):
        coarse, fine = fine, 2 * fine
        whole = [tenths * k for k in range(coarse // tenths + 1, (fine - 1) // tenths + 1)][:8]
        found = next((cells for cells in whole if holds(cells)), None)
        if found:
            fine = found
            break
        if fine > most:
            raise TooFine(f"no grid below {most} cells holds {tolerance} eV")
    coarse = fine // 2
    while fine - coarse > 0.04 * fine:
        middle = (fine + coarse) // 2
        fine, coarse = (middle, coarse) if holds(middle) else (fine, middle)
    trials = [int(fine * share) for share in (0.97, 0.94, 0.9, 0.84, 0.77, 0.7, 0.6)]
    return min([fine, *(c for c in trials if holds(c))])
