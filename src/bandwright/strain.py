"""Strain of a layer grown coherently on a (001) substrate: plain functions of floats or arrays.

Source: Van de Walle, Phys. Rev. B 39, 1871 (1989). Tr is the trace of the strain tensor, the
relative change of volume, negative for a layer pressed together by its substrate.
"""

from __future__ import annotations

import math

import numpy as np
import numpy.typing as npt

from .errors import UnknownName, close_matches

Value = float | npt.NDArray[np.float64]

#: K of `critical_thickness`: a film with nothing on it (one dislocation line at its foot), a film
#: between others (two lines, so half the force on each), and the layers of a superlattice that
#: lies on its own mean lattice (each layer bears half the misfit to its neighbour)
CASES = {
    "free surface": 8.0 * math.pi,
    "single layer": 4.0 * math.pi,
    "superlattice": 2.0 * math.pi,
}


def in_plane(lattice: Value, substrate: float) -> Value:
    """Return exx, the strain in the plane of the layer.

    Parameters
    ----------
    lattice : float or array
        The layer's relaxed lattice constant [nm].
    substrate : float
        The substrate's [nm].

    Examples
    --------
    >>> round(in_plane(0.573426, 0.565325), 8)
    -0.01412737
    """
    return (substrate - lattice) / lattice


def along_growth(exx: Value, c11: Value, c12: Value) -> Value:
    """Return ezz = -2 (C12/C11) exx, the strain along growth of a layer free to move there.

    Parameters
    ----------
    exx : float or array
        Strain in the plane.
    c11, c12 : float or array
        Elastic constants; only their ratio matters.

    Examples
    --------
    >>> along_growth(-0.01, 100.0, 50.0)
    0.01
    """
    return -2.0 * (c12 / c11) * exx


def trace(exx: Value, ezz: Value) -> Value:
    """Return Tr = 2 exx + ezz, the relative change of volume.

    Examples
    --------
    >>> trace(-0.01, 0.01)
    -0.01
    """
    return 2.0 * exx + ezz


def edge_shift(a_c: Value, tr: Value) -> Value:
    """Return a_c Tr, the hydrostatic shift of the conduction edge [eV].

    Parameters
    ----------
    a_c : float or array
        Deformation potential of the conduction edge [eV].
    tr : float or array
        Trace of the strain.

    Examples
    --------
    >>> edge_shift(-7.0, -0.01)
    0.07
    """
    return a_c * tr


def gap_shift(a_c: Value, a_v: Value, tr: Value) -> Value:
    """Return (a_c + a_v) Tr, the hydrostatic shift of the gap [eV]; no shear.

    Parameters
    ----------
    a_c, a_v : float or array
        Deformation potentials [eV], a_v in the convention in which GaAs has -1.16 eV.
    tr : float or array
        Trace of the strain.

    Examples
    --------
    >>> gap_shift(-7.0, -1.0, -0.01)
    0.08
    """
    return (a_c + a_v) * tr


def monolayer(lattice: Value, ezz: Value) -> Value:
    """Return the thickness of one monolayer of the strained film, half its lattice constant [nm].

    Parameters
    ----------
    lattice : float or array
        The relaxed lattice constant [nm].
    ezz : float or array
        Strain along growth.

    Examples
    --------
    >>> monolayer(0.5, 0.01)
    0.2525
    """
    return 0.5 * lattice * (1.0 + ezz)


def biaxial_stiffness(c11: Value, c12: Value) -> Value:
    """Return A = C11 + C12 - 2 C12^2/C11, the stress in the plane per strain in the plane.

    Parameters
    ----------
    c11, c12 : float or array
        Elastic constants of a layer free to move along growth [GPa].

    Returns
    -------
    float or array
        [GPa].

    Examples
    --------
    >>> biaxial_stiffness(100.0, 50.0)
    100.0
    """
    return c11 + c12 - 2.0 * c12 * c12 / c11


def critical_thickness(
    misfit: float, lattice: float, poisson: float = 1.0 / 3.0, case: str = "single layer"
) -> float:
    """Return the thickness [nm] beyond which a strained layer makes misfit dislocations.

    Parameters
    ----------
    misfit : float
        Relative difference of the layer's relaxed lattice from what it lies on, of either sign:
        the substrate; for ``"superlattice"`` the layers beside it.
    lattice : float
        The lattice constant of what it lies on [nm].
    poisson : float
        C12/(C11 + C12) of the layer.
    case : {"single layer", "free surface", "superlattice"}
        Buried between others, nothing on it, or one of a superlattice on its own mean lattice:
        K = 4 pi, 8 pi, 2 pi.

    Returns
    -------
    float
        0 where even the thinnest layer is too much, inf without misfit.

    Raises
    ------
    UnknownName
        If there is no such case.

    Notes
    -----
    h = b (1 - nu cos^2 a) [ln(h/b) + 1] / (K f (1 + nu) cos l), with b = lattice/sqrt 2 and
    cos a = cos l = 1/2 of 60 degree dislocations: J. W. Matthews and A. E. Blakeslee, J. Cryst.
    Growth 27, 118 (1974). The three values of K are from memory.

    Examples
    --------
    >>> print(f"{critical_thickness(0.0143298103, 0.565325, 0.322120116):.4f} nm")
    14.0863 nm
    """
    if case not in CASES:
        raise UnknownName(f"case: there is no {case!r}{close_matches(str(case), CASES)}")
    if misfit == 0.0:
        return math.inf
    from scipy.special import lambertw

    b = lattice / math.sqrt(2.0)
    scale = (1.0 - 0.25 * poisson) / (CASES[case] * abs(misfit) * (1.0 + poisson) * 0.5)
    if scale <= 1.0:  # h/b = scale [ln(h/b) + 1] then has no root above b
        return 0.0
    return -b * scale * float(lambertw(-math.exp(-1.0) / scale, -1).real)
