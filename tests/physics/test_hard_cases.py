"""Structures that break careless solvers: all answered, counts agree, no overflow, no false level.

Compared with closed forms where there are any, else with the independent discretisation. Every
warning is an error here.
"""

import numpy as np
import pytest
from scipy.optimize import brentq

from bandwright.profile import Profile
from bandwright.solver import solve_profile
from physics.build import curved, flat, poly, profile, reference
from physics.dense import levels
from physics.matching import check
from physics.randomstacks import clamps, lowest, tilt

pytestmark = pytest.mark.filterwarnings("error")
C = reference()[0]
TOLERANCE = 1e-9


def solve(case, high, tolerance=TOLERANCE):
    with np.errstate(over="raise", divide="raise", invalid="raise"):
        found = solve_profile(case, high=high, tolerance=tolerance)
        dipoles = found.dipoles()
    assert np.isfinite(found.energies).all()
    assert np.isfinite(dipoles).all()
    assert found.count_checked.all()
    assert found.complete
    return found


def against_dense(label, case, high, tolerance=TOLERANCE):
    found, dense = solve(case, high, tolerance), levels(case, high)
    check(label, found.energies, dense.energies, tolerance, "independent discretisation")
    return found, dense


@pytest.mark.parametrize("gaps", [(None, None), (0.816, 1.53)])
@pytest.mark.parametrize("ends", ["open", "wall"])
def test_200_nm_barriers(ends, gaps):
    """Decays of exp(-180) on the way: each well's levels are those it has alone."""
    outer, well = flat(200, 0.52, 0.075, gaps[1]), flat(5, 0, 0.043, gaps[0])
    wide = flat(7, 0, 0.043, gaps[0])
    found, _ = against_dense("200 nm", profile(outer, well, outer, wide, outer, ends=ends), 0.5199)
    alone = [solve(profile(outer, w, outer), 0.5199).energies for w in (well, wide)]
    check("alone", found.energies, np.sort(np.concatenate(alone)), TOLERANCE, "single wells")


def test_200_nm_barriers_in_a_field():
    """Walls at both ends, 40 kV/cm: 1.6 eV from end to end."""
    outer = flat(200, 0.25, 0.092)
    case = Profile(tilt((outer, flat(8, 0, 0.067), outer), 0.004), ("wall", "wall"), 0.004)
    against_dense("200 nm in a field", case, 0.6, 1e-8)


@pytest.mark.parametrize("gaps", [(None, None), (1.519, 1.9)])
def test_layers_of_one_monolayer(gaps):
    """A digital alloy of 80 layers of 0.28 nm as a well between two barriers."""
    pair = [flat(0.28, 0, 0.067, gaps[0]), flat(0.28, 0.25, 0.092, gaps[1])]
    outer = flat(10, 0.25, 0.092, gaps[1])
    against_dense("0.28 nm", profile(outer, *(40 * pair), outer), 0.2499)


def periodic_levels(times, well, barrier, high):
    """Levels of N cells (half barrier, well, half barrier) between walls.

    With cos(theta) half the trace of one cell's matrix M and M^N = U_(N-1) M - U_(N-2), walls
    want B U_(N-1) = 0: theta = j pi / N in each band, or B = 0 of the cell itself.
    """

    def matrix(energy):
        total = np.eye(2)
        for width, edge, mass, gap in ((0.5 * barrier[0], *barrier[1:]), well,
                                       (0.5 * barrier[0], *barrier[1:])):  # fmt: skip
            heavy = mass * (1 + (energy - edge) * gap)
            k = np.sqrt(complex(heavy * (energy - edge) / C))
            c, s = np.cos(k * width), np.sin(k * width)
            total = np.array([[c, heavy * s / k], [-k * s / heavy, c]]).real @ total
        return total

    scan = np.linspace(1e-6, high, 6001)
    matrices = [matrix(e) for e in scan]
    found = []
    for j in range(1, times):
        target = np.cos(j * np.pi / times)

        def mismatch(energy, target=target):
            return 0.5 * np.trace(matrix(energy)) - target

        value = np.array([0.5 * np.trace(m) - target for m in matrices])
        for i in np.flatnonzero(np.signbit(value[:-1]) != np.signbit(value[1:])):
            found.append(brentq(mismatch, scan[i], scan[i + 1], xtol=1e-15))
    value = np.array([m[0, 1] for m in matrices])
    for i in np.flatnonzero(np.signbit(value[:-1]) != np.signbit(value[1:])):
        found.append(brentq(lambda e: matrix(e)[0, 1], scan[i], scan[i + 1], xtol=1e-15))
    return np.sort(found)


@pytest.mark.parametrize("gaps", [(None, None), (1.519, 1.9)])
@pytest.mark.parametrize(("width", "between"), [(5.0, 3.0), (6.0, 8.0)])
def test_100_periods(width, between, gaps):
    """Minibands of 100 levels each, 26 meV and 0.2 meV wide, against the closed form."""
    inverse = [0.0 if g is None else 1.0 / g for g in gaps]
    high = 0.3
    closed = periodic_levels(100, (width, 0.0, 0.067, inverse[0]),
                             (between, 0.25, 0.092, inverse[1]), high)  # fmt: skip
    half, well = flat(between / 2, 0.25, 0.092, gaps[1]), flat(width, 0, 0.067, gaps[0])
    found = solve(profile(*(100 * [half, well, half]), ends="wall"), high)
    assert len(closed) >= 101
    check(f"100 periods of {width} + {between} nm", found.energies, closed, TOLERANCE,
          "Chebyshev form of M^N")  # fmt: skip


@pytest.mark.parametrize("gaps", [(None, None), (1.519, 1.9)])
@pytest.mark.parametrize("wells", [2, 3, 5])
def test_levels_split_by_1e_11(wells, gaps):
    """Equal 6 nm wells behind 34 nm: the spread of each group, and that no member is lost."""
    outer, inner = flat(20, 0.25, 0.092, gaps[1]), flat(6, 0, 0.067, gaps[0])
    between = flat(34, 0.25, 0.092, gaps[1])
    case = profile(outer, *((wells - 1) * [inner, between]), inner, outer)
    found, dense = against_dense(f"{wells} equal wells", case, 0.12, 1e-10)
    assert len(found.energies) == wells
    spread, wanted = np.ptp(found.energies), np.ptp(dense.energies)
    print(f"  spread {spread:.4e} eV, reference {wanted:.4e}")
    assert 1e-12 < wanted < 2e-10
    assert abs(spread - wanted) < 1e-13


def test_steps_of_1_75_ev():
    """As between GaN and AlN, flat and with internal fields of 3 MV/cm of alternate sign."""
    outer, well = flat(3, 1.75, 0.3, 6.0), flat(2, 0, 0.2, 3.4)
    against_dense("1.75 eV", profile(outer, well, flat(1, 1.75, 0.3, 6.0), well, outer), 1.7499)


@pytest.mark.parametrize("field", [0.3, 0.15])
def test_internal_fields_of_3_mv_per_cm(field):
    sections, potential = [], 0.0
    for i in range(13):
        edge, mass, gap, width, slope = (
            (0.0, 0.2, 3.4, 2.2, field) if i % 2 else (1.75, 0.3, 6.0, 2.2, -field)
        )
        sections.append(curved(width, poly(edge + potential, slope), mass, gap))
        potential += slope * width
    case = profile(*sections, ends="wall")
    assert not clamps(sections, lowest(sections))
    against_dense(f"{10 * field} MV/cm", case, lowest(sections) + 1.6)


@pytest.mark.parametrize("field", [0.008, -0.008])
def test_three_two_band_periods_of_41_nm_at_80_kv_per_cm(field):
    """123 nm and 0.98 eV of field: upfield wells stand clamped for the lowest levels."""
    widths = (4.5, 1.9, 0.7, 5.8, 0.9, 5.7, 0.9, 5.0, 2.2, 3.4, 1.4, 3.3, 1.3, 3.2, 0.8)
    assert np.isclose(sum(widths), 41.0)
    period = [
        flat(w, 0.0, 0.043, 0.816) if i % 2 else flat(w, 0.52, 0.075, 1.53)
        for i, w in enumerate(widths)
    ]
    sections = tilt(3 * period, field)
    bottom = lowest(sections)
    assert clamps(sections, bottom)
    case = Profile(sections, ("wall", "wall"), field, bands="two-band")
    found, dense = against_dense("3 x 41 nm", case, bottom + 1.5, 1e-8)
    if field > 0:  # the other way round the upfield end is a well's width short of it
        assert clamps(sections, dense.energies[0])
    assert len(found.energies) > 30
