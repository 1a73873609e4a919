"""What a flux does along a graded layer, to first order.

With X the element's fraction and r = X + d(ln monolayer)/df, a stretch dz grows to (1 + r df) dz,
so that a fixed fractional depth meets material that was grown at another depth.
"""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
from numpy.polynomial import chebyshev

from ..formula import parse
from ..parameters.fluxes import cation_of
from ..shapes import Points
from .along import Along

Floats = npt.NDArray[np.float64]

_GAUSS, _WEIGHTS = np.polynomial.legendre.leggauss(12)
_DEGREE = 24
_NODES = np.cos(np.pi * (np.arange(_DEGREE + 1) + 0.5) / (_DEGREE + 1))


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
        half = 0.5 * np.diff(faces)[:, None]
        inside = faces[:-1, None] + half * (1.0 + _GAUSS)
        rates = _rate(along, element, inside.reshape(-1)).reshape(inside.shape)
        return changes, np.asarray((half * _WEIGHTS * rates).sum(axis=1))
    series = chebyshev.chebfit(_NODES, _rate(along, element, 0.5 * thickness * (1.0 + _NODES)),
                               _DEGREE)  # fmt: skip
    taller = chebyshev.chebint(series, lbnd=-1.0, scl=0.5 * thickness)
    total = float(chebyshev.chebval(1.0, taller))
    share = along.depth / thickness
    shift = chebyshev.chebval(2.0 * share - 1.0, taller) - share * total
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


def _rate(along: Along, element: str, depth: Floats) -> Floats:
    """Return how much more a stretch grows at each depth."""
    composition = parse(str(along.site.layer.material), **along.letters(depth))
    rate = np.asarray(composition.fraction(element), dtype=float)
    monolayer = along.monolayers(depth)
    for letter, change in _grown(along, element, depth).items():
        rate = rate + along.slopes(letter, depth).monolayer * change / monolayer
    return rate
