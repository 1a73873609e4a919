"""The phase budget: sums to whole half waves, with each end's known share."""

import numpy as np
import pytest

from bandwright import phase
from bandwright.constants import H2M, HBAR
from bandwright.profile import Polynomial, Profile, Sampled, Section


def section(thickness, *edge, mass=0.067, inverse_gap=0.0, layer=0):
    return Section(float(thickness), Polynomial(edge), Polynomial((mass,)),
                   Polynomial((inverse_gap,)), layer)


BARRIER = section(8, 0.25, mass=0.092)


def test_a_step_adds_the_arctangent_and_a_wall_nothing():
    stack = Profile((section(9, 0.0), BARRIER), ("wall", "open"))
    energy = phase.levels(stack, 0.0, 0.25)[1]
    (well,) = phase.budget(stack, energy)
    k, kappa = np.sqrt(0.067 * energy / H2M), np.sqrt(0.092 * (0.25 - energy) / H2M)
    assert well.end_left == 0.0
    assert well.end_right == pytest.approx(np.arctan((k / 0.067) / (kappa / 0.092)))
    assert well.action == pytest.approx(9 * k)
    assert well.half_waves == pytest.approx(2.0, abs=1e-8)
    assert (well.n, well.steps) == (2, 0.0)
    assert (well.barrier_left, well.barrier_right) == (np.inf, np.inf)


def test_times_of_a_well():
    stack = Profile((BARRIER, section(9, 0.0), BARRIER))
    energy = phase.levels(stack, 0.0, 0.25)[0]
    (well,) = phase.budget(stack, energy)
    speed = 2 * H2M * np.sqrt(0.067 * energy / H2M) / 0.067 / HBAR  # nm/fs
    assert well.round_trip_fs == pytest.approx(2 * 9 / speed, rel=1e-6)
    # the ends: the time the wave spends in the barriers
    def ratio(e):
        return np.sqrt(e / 0.067) / np.sqrt((0.25 - e) / 0.092)

    rate = (np.arctan(ratio(energy + 1e-6)) - np.arctan(ratio(energy - 1e-6))) / 2e-6
    assert well.phase_time_fs == pytest.approx(well.round_trip_fs + 4 * HBAR * rate, rel=1e-5)


def test_smooth_turning_points_add_a_quarter_of_pi():
    c = 4e-4
    stack = Profile((section(60, c * 900, -60 * c, c),))
    for n, energy in enumerate(phase.levels(stack, 0.0, 0.1), start=1):
        (well,) = phase.budget(stack, energy)
        assert well.n == n
        assert [well.end_left, well.end_right] == pytest.approx([np.pi / 4] * 2, abs=1e-6)
        reach = np.sqrt(energy / c)
        assert [well.start_nm, well.stop_nm] == pytest.approx([30 - reach, 30 + reach])
        assert well.phase_time_fs == pytest.approx(well.round_trip_fs, rel=1e-4)


def test_coupled_wells_name_their_layers_and_the_barrier_between():
    stack = Profile((
        section(8, 0.25, mass=0.092), section(6, 0.0, layer=1),
        section(3, 0.25, mass=0.092, layer=2), section(6.3, 0.0, layer=3),
        section(8, 0.25, mass=0.092, layer=4)))
    for energy in phase.levels(stack, 0.0, 0.25):
        left, right = phase.budget(stack, energy)
        assert (left.layers, right.layers) == ((1,), (3,))
        theta = 3 * np.sqrt(0.092 * (0.25 - energy) / H2M)
        assert left.barrier_right == right.barrier_left == pytest.approx(theta)
        for well in (left, right):
            assert well.half_waves == pytest.approx(well.n, abs=1e-7)


def test_a_step_inside_a_well_is_listed_apart():
    stack = Profile((BARRIER, section(6, 0.0, layer=1), section(8, 0.12, layer=2), BARRIER))
    (well,) = phase.budget(stack, phase.levels(stack, 0.0, 0.25)[2])
    assert well.layers == (1, 2)
    assert abs(well.steps) > 0.01
    assert well.half_waves == pytest.approx(3.0, abs=1e-7)


def curved(kind):
    if kind == "trough":
        edge = Sampled(lambda z: 0.3 * (1 - np.exp(-(((z - 13) / 5) ** 2))))
        return Profile((Section(26.0, edge, Polynomial((0.067,)), Polynomial((0.6,))),))
    if kind == "graded":
        return Profile((BARRIER, section(9, 0.0, 0.0, 0.002, inverse_gap=0.5), BARRIER))
    if kind == "brief":
        return Profile((BARRIER, section(9, 0.0), section(2, 0.0, 0.0, 0.01), BARRIER))
    if kind == "brief inside":
        return Profile((BARRIER, section(5, 0.0), section(1.5, 0.0, 0.0, 0.02, inverse_gap=0.7),
                        section(4, 0.045), BARRIER))
    tilt = [section(4, 0.3 - 0.008 * 0, -0.008, inverse_gap=0.6),
            section(7, -0.032, -0.008, inverse_gap=0.9),
            section(3, 0.3 - 0.088, -0.008, inverse_gap=0.6),
            section(6, -0.112, -0.008, inverse_gap=0.9)]
    return Profile(tuple(tilt), ("wall", "wall"))


@pytest.mark.parametrize("kind", ["trough", "graded", "tilt", "brief", "brief inside"])
def test_every_well_sums_to_whole_half_waves_at_a_level(kind):
    stack = curved(kind)
    energies = phase.levels(stack, -0.2, 0.24)
    assert len(energies) > 1
    for number, energy in enumerate(energies, start=1):
        wells = phase.budget(stack, energy)
        for well in wells:
            assert well.half_waves == pytest.approx(well.n, abs=1e-6)
            total = well.action + well.end_left + well.steps + well.end_right
            assert total == pytest.approx(np.pi * well.half_waves)
        if len(wells) == 1:
            assert wells[0].n == number


def test_below_every_edge_there_is_no_well():
    assert phase.budget(Profile((BARRIER,)), 0.1) == []
