"""Pieces much shorter than a wave: their slices against closed forms and integration."""

import numpy as np
import pytest
from scipy.integrate import solve_ivp

from bandwright import phase
from bandwright.constants import H2M
from bandwright.phase import brief
from bandwright.phase.pieces import Batch, pieces_of
from bandwright.phase.sections import flat_elements, piece_elements
from bandwright.profile import Polynomial, Profile, Sampled, Section


def batch(*sections):
    return Batch([piece for section in sections for piece in pieces_of(section)], 24, 2)


def bent(length, rise, inverse_gap=0.0):
    return Section(length, Polynomial((0.0, 0.0, rise / length**2)), Polynomial((0.067, 0.004)),
                   Polynomial((inverse_gap,)))


@pytest.mark.parametrize("inverse_gap", [0.0, 0.8])
def test_slices_are_the_equation_itself(inverse_gap):
    length, energy = 2.5, 0.12
    section = bent(length, 0.3, inverse_gap)

    def rate(z, f):
        z = np.array([z])
        x = energy - section.edge.at(z)
        return np.concatenate([section.mass.at(z) * (1 + x * inverse_gap) * f[1], -x / H2M * f[0]])

    a, b = (solve_ivp(rate, (0, length), start, rtol=1e-11, atol=1e-13).y[:, -1]
            for start in ([1.0, 0.0], [0.0, 1.0]))
    left, right, off = brief.followed(batch(section), np.array([0]), np.array([energy]))
    expected = [a[0] / b[0], b[1] / b[0], 1 / b[0]]
    assert [left[0, 0], right[0, 0], off[0, 0]] == pytest.approx(expected, rel=2e-6)


def test_a_brief_piece_that_hardly_bends_is_a_flat_section():
    energies = np.array([-0.05, 1e-4, 0.03, 0.08])
    section = Section(2.0, Polynomial((0.0, 0.0, 1e-12)), Polynomial((0.067,)))
    found = piece_elements(batch(section), energies)
    one = np.array([[1.0]])
    flat = flat_elements(2.0 * one, 0.0 * one, 0.067 * one, 0.0 * one, energies)
    for mine, exact in zip(found[:3], flat[:3], strict=True):
        assert mine[0] == pytest.approx(exact[0], rel=1e-9)


def test_pieces_longer_than_a_wave_keep_their_phase(monkeypatch):
    energies = np.array([0.05, 0.2])
    before = piece_elements(batch(bent(25.0, 0.3)), energies)
    monkeypatch.setattr(brief, "followed", None)  # would fail if called
    after = piece_elements(batch(bent(25.0, 0.3)), energies)
    assert (before.left == after.left).all()


def test_the_count_never_falls_where_slices_give_way_to_phases():
    barrier = Section(8.0, Polynomial((0.4,)), Polynomial((0.09,)))
    well = Section(4.0, Polynomial((0.0,)), Polynomial((0.067,)))
    for length in (1.0, 3.0, 5.0):
        soft = Sampled(lambda z, h=length: 0.2 * (1 - np.cos(np.pi * z / h)))
        grade = Section(length, soft, Polynomial((0.067,)))
        case = Profile((barrier, well, grade, barrier))
        for order in (1, 2):
            counts = phase.count(case, np.linspace(0.0, 0.399, 1500), phase_order=order)
            assert (np.diff(counts) >= 0).all()
            assert counts[-1] > 1
