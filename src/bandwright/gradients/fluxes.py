"""What a flux does along a graded layer, to first order.

With X the element's fraction and r = X + d(ln monolayer)/df, a stretch dz grows to (1 + r df) dz,
so that a fixed fractional depth meets material that was grown at another depth.
"""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from ..formula import parse
from ..parameters.fluxes import cation_of
from ..shapes import Points
from .along import Along

Floats = npt.NDArray[np.float64]

_GAUSS, _WEIGHTS = np.polynomial.legendre.leggauss(12)


def graded_flux(along: Along, element: str) -> tuple[dict[str, Floats], Floats]:
    """Return the change of each letter by a factor on a flux, and that of each section's height.

    At fixed fractional depth of the sections; letters (n_points,), heights (n_sections,) [nm].

    Parameters
    ----------
    along : Along
        The layer at its points.
    element : str
        A cation whose fraction varies.
    """
    shapes = dict(along.site.layer.fractions)
    thickness = along.site.thickness
    breaks = {b for shape in shapes.values() for b in shape.breaks(thickness)}
    faces = np.array(sorted({0.0, thickness, *breaks}))
    if any(isinstance(shape, Points) for shape in shapes.values()):
        at_faces = _grown(along, element, faces)
        changes = {k: np.interp(along.depth, faces, v) for k, v in at_faces.items()}
        return changes, _taller(along, element, faces[:-1], faces[1:])
    [total] = _taller(along, element, faces[:1], faces[1:])
    up_to = _taller(along, element, np.zeros_like(along.depth), along.depth)
    shift = up_to - along.depth / thickness * total
    step = 1e-3 * thickness
    changes = {}
    for letter, change in _grown(along, element, along.depth).items():
        ahead, behind = (along.values(shapes[letter], along.depth + s) for s in (step, -step))
        changes[letter] = change - (ahead - behind) / (2.0 * step) * shift
    return changes, np.array([total])


def _grown(along: Along, element: str, depth: Floats) -> dict[str, Floats]:
    """Return the change of each letter of the material grown at each depth; anions' stay."""
    material = str(along.site.layer.material)
    values = along.letters(depth)
    composition = parse(material, **values)
    share = np.asarray(composition.fraction(element))
    found = {}
    for letter in values:
        cation = cation_of(material, letter)
        if cation is None:
            found[letter] = np.zeros_like(depth)
        else:
            found[letter] = composition.fraction(cation) * (float(cation == element) - share)
    return found


def _taller(along: Along, element: str, start: Floats, stop: Floats) -> Floats:
    """Return the change of the thickness between depths [nm], by Gauss's rule, (n,)."""
    half = 0.5 * (stop - start)[:, None]
    depth = (start[:, None] + half * (1.0 + _GAUSS)).reshape(-1)
    material = str(along.site.layer.material)
    composition = parse(material, **along.letters(depth))
    rate = np.asarray(composition.fraction(element), dtype=float)
    monolayer = np.asarray(along.monolayers(depth))
    for letter, change in _grown(along, element, depth).items():
        rate = rate + along.slopes(letter, depth).monolayer * change / monolayer
    return np.asarray((half * _WEIGHTS * rate.reshape(len(start), -1)).sum(axis=1))
