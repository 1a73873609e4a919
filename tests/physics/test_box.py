"""The closed box of a stack in a field: which levels belong to the structure, which to the walls.

Judged by growing both outermost layers by 20 %: levels of the structure stay, levels of the box
move. The stacks are invented, of the usual detector and emitter kinds. (The field's potential
counts from the first-grown outer face, so all energies rise by e F d when that layer grows by d;
that is taken off. Levels are followed by the overlap of their states.)
"""

import numpy as np
import pytest

import bandwright as bw

pytestmark = pytest.mark.filterwarnings("ignore::bandwright.BandwrightWarning")
GROWTH = 0.2
STAYS = 0.1  # meV


def stack(widths, well, barrier, outer, field, **more):
    inner = [
        bw.Layer(f"{t} nm", barrier if i % 2 else well) for i, t in enumerate(widths)
    ]
    edge = bw.Layer(f"{outer} nm", barrier)
    return bw.Stack([edge, *inner, edge], field=f"{field} kV/cm", **more)


GAAS, ALGAAS = "GaAs", "Al0.3Ga0.7As"
STACKS = {
    "detector": stack([6.2], GAAS, ALGAAS, 30, 12),
    "detector, thick barriers": stack([5], GAAS, "Al0.25Ga0.75As", 50, 20),
    "stage": stack([1.9, 1.1, 5.4, 1.1, 4.8, 2.8, 3.4, 1.7, 3, 1.8, 2.8], GAAS, ALGAAS, 25, 48),
    "short-wave stage": stack([0.8, 3.5, 3.5, 3.0, 2.8], "Ga0.47In0.53As", "Al0.48In0.52As", 15,
                              95, substrate="InP"),
    "terahertz stage": stack([9, 2.4, 7.5, 4.2, 16], GAAS, "Al0.15Ga0.85As", 20, 11),
    "coupled wells, field reversed": stack([6, 3, 4], GAAS, ALGAAS, 20, -60),
    "two-band stage": stack([4, 2, 7], "InAs", "AlSb", 12, 30),
}  # fmt: skip


def grown(original):
    layers = list(original.layers)
    for i in (0, -1):
        layers[i] = layers[i].replace(thickness=f"{layers[i].thickness.value * (1 + GROWTH)!r} nm")
    return original.replace(layers=layers)


def moves(original):
    """Levels of a stack, and how far each moves [meV] when the outermost layers grow."""
    before = bw.solve(original, group="0 meV")
    after = bw.solve(grown(original), group="0 meV")
    extra = GROWTH * original.layers[0].thickness.value
    z = np.linspace(0.0, before.profile.faces[-1], 2001)
    same = np.abs(np.asarray(_u(before, z)) @ np.asarray(_u(after, z + extra)).T)
    partner = same.argmax(axis=1)
    there = after.energies[partner] - before.profile.field * extra
    return before, 1e3 * (there - before.energies), extra


def _u(levels, z):
    u = levels.states.sample(z)
    return u[0] if isinstance(u, tuple) else u


@pytest.mark.parametrize("name", STACKS)
def test_levels_of_the_structure_stay_and_levels_of_the_box_move(name):
    levels, moved, extra = moves(STACKS[name])
    shifts, of_box = 1e3 * np.abs(levels.wall_shifts), levels.of_box
    for i, energy in enumerate(levels.energies):
        print(f"{name}, level {i + 1}: {1e3 * energy:9.3f} meV, wall shift {shifts[i]:.1e} meV/nm, "
              f"of the box {of_box[i]!s:5}, moved {moved[i]:+.4f} meV")  # fmt: skip
    still = shifts < 1e-3
    assert still.any()
    assert np.abs(moved[still]).max() < STAYS
    assert of_box.any()
    assert np.abs(moved[of_box]).min() > STAYS
    assert np.array_equal(of_box, shifts > 0.1)
    # in between: no more than its rate times what both layers grew, by definition of the rate
    assert np.abs(moved[~of_box]).max() < 0.1 * 2 * extra


@pytest.mark.parametrize("name", ["detector", "stage"])
def test_wall_shift_is_the_derivative_of_the_energy_by_the_wall(name):
    """dE/dwall = -h2m m(E) p_wall^2 / <i|i> of the larger side, against moving each wall."""
    original, step = STACKS[name], 1e-3  # nm
    exact = {"group": "0 meV", "tolerance": "1e-10 eV"}
    before = bw.solve(original, **exact)
    rates = []
    for place in (0, -1):
        layers = list(original.layers)
        thickness = layers[place].thickness.value + step
        layers[place] = layers[place].replace(thickness=f"{thickness!r} nm")
        after = bw.solve(original.replace(layers=layers), **exact)
        rise = before.profile.field * step if place == 0 else 0.0
        number = min(len(before), len(after))
        rates.append(1e3 * (after.energies[:number] - rise - before.energies[:number]) / step)
    number = min(len(r) for r in rates)
    found = np.minimum(rates[0][:number], rates[1][:number])
    expected = 1e3 * before.wall_shifts[:number]
    sizeable = np.abs(expected) > 0.1
    assert sizeable.sum() >= 4
    print(found[sizeable], expected[sizeable])
    assert np.abs(found / expected - 1)[sizeable].max() < 2e-3
