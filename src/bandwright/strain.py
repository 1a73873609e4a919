"""Strain of a layer grown coherently on a (001) substrate: plain functions of floats or arrays.

Source: Van de Walle, Phys. Rev. B 39, 1871 (1989). Tr is the trace of the strain tensor, the
relative change of volume, negative for a layer pressed together by its substrate.
"""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

Value = float | npt.NDArray[np.float64]


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
