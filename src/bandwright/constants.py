"""Physical constants in core units (eV, nm, free-electron masses), from `scipy.constants`."""

from __future__ import annotations

from typing import Final

from scipy import constants as _si

#: hbar^2 / (2 m0) [eV nm^2]
H2M: Final = float(_si.hbar**2 / (2.0 * _si.m_e) / _si.e * 1e18)
#: h c [eV nm], the photon energy times its vacuum wavelength
HC: Final = float(_si.h * _si.c / _si.e * 1e9)
#: hbar [eV fs]
HBAR: Final = float(_si.hbar / _si.e * 1e15)
#: photon energy of one wavenumber [eV cm]
EV_CM: Final = HC * 1e-7
#: photon energy of one terahertz [eV / THz]
EV_PER_THZ: Final = float(_si.h / _si.e * 1e12)
