"""Thicknesses that are asked for by a wavelength, against wells whose answer is known by hand.

Both forms are in every textbook of quantum mechanics: the infinite well, E_n = (hbar pi n / L)^2 /
2m, and the finite well with one mass in the well and another in the barriers (BenDaniel-Duke),
tan(kL/2) = kappa m_w / (k m_b) for even and -cot(kL/2) for odd states. The tolerance, 1e-6 nm, is
what was promised; energies good to 1e-9 eV give some 1e-8 nm.
"""

import math

import pytest
from scipy.optimize import brentq

import bandwright as bw
from bandwright.constants import H2M, HC

PROMISED = 1e-6


def agrees(found, reference):
    digits = -math.log10(max(abs(found / reference - 1.0), 1e-16))
    print(f"found {found:.12f} nm, reference {reference:.12f} nm, {digits:.1f} digits")
    return abs(found - reference) < PROMISED


def value(aimed, name):
    return aimed.values.set_index("parameter").value[name]


@pytest.mark.parametrize("micrometres", [4.3, 10.3, 38.0])
@pytest.mark.parametrize(("upper", "lower"), [(2, 1), (3, 1), (4, 2)])
def test_infinite_well(micrometres, upper, lower):
    mass = 0.067
    due = math.sqrt(
        H2M / mass * math.pi**2 * (upper**2 - lower**2) * micrometres * 1e3 / HC
    )  # fmt: skip
    well = bw.Layer(f"{1.3 * due} nm", edge="0 meV", mass=mass, label="well")
    aimed = bw.aim(
        bw.Stack([well], ends="wall"), {"well.thickness": f"{0.4 * due} nm..{2.2 * due} nm"},
        {(upper, lower): f"{micrometres} um"},
    )  # fmt: skip
    assert aimed.reached
    assert agrees(value(aimed, "well.thickness"), due)
    assert aimed.solves < 12


def width_by_hand(photon, depth, in_well, in_barrier):
    """Return the width [nm] of a finite well whose second level is a photon above its first."""

    def width(energy, odd):
        k = math.sqrt(energy * in_well / H2M)
        kappa = math.sqrt((depth - energy) * in_barrier / H2M)
        half = math.atan(kappa * in_well / (k * in_barrier)) + (math.pi / 2 if odd else 0.0)
        return 2.0 * half / k

    first = brentq(
        lambda e: width(e, odd=False) - width(e + photon, odd=True), 1e-6, depth - photon - 1e-9,
        xtol=1e-15, rtol=1e-14,
    )  # fmt: skip
    return width(first, odd=False)


@pytest.mark.parametrize(("photon", "start"), [(0.08, 7.0), (0.12, 10.4), (0.15, 8.5)])
def test_finite_well(photon, start):
    depth, in_well, in_barrier = 0.25, 0.067, 0.092
    due = width_by_hand(photon, depth, in_well, in_barrier)
    barrier = bw.Layer("20 nm", edge="250 meV", mass=in_barrier)
    well = bw.Layer(f"{start} nm", edge="0 meV", mass=in_well, label="well")
    aimed = bw.aim(
        bw.Stack([barrier, well, barrier]), {"well.thickness": "5 nm..16 nm"},
        {"2 to 1": f"{HC / photon * 1e-3!r} um"},
    )  # fmt: skip
    assert aimed.reached
    assert agrees(value(aimed, "well.thickness"), due)


def test_depth_and_width_of_a_finite_well_from_two_lines():
    # both numbers of a well are found again from two of its lines, starting 30 % off
    def stack(width, depth):
        barrier = bw.Layer("20 nm", edge=f"{depth} meV", mass=0.092, label="barrier")
        well = bw.Layer(f"{width} nm", edge="0 meV", mass=0.067, label="well")
        return bw.Stack([barrier, well, barrier])

    lines = bw.solve(stack(11.0, 290), tolerance="1e-10 eV").lines()
    targets = {pair: f"{lines.find(*pair).energy_meV!r} meV" for pair in ((2, 1), (3, 2))}
    free = {"well.thickness": "6 nm..18 nm", "barrier.edge": "150 meV..500 meV"}
    aimed = bw.aim(stack(11.0 * 1.3, 290 * 0.8), free, targets)
    assert agrees(value(aimed, "well.thickness"), 11.0)
    assert value(aimed, "barrier.edge") == pytest.approx(290.0, abs=1e-4)
    assert aimed.rounded is None  # own numbers have no monolayer
