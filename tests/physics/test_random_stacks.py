"""Random stacks of every class against the independent discretisation: none missed, none false.

The normal run takes 6 stacks of each of the 25 classes, three with fixed and three with fresh
seeds (printed in pytest's header, repeated by ``--stack-seed``); ``--all-stacks`` takes 80 of
each, 2,000 in all. Each is solved at 1e-6 and at 1e-9 eV; dipoles are compared at 1e-9 eV for
levels more than 1e-7 eV from their neighbours (closer ones are only promised as a subspace).
Each is also solved in a family of two, which must change nothing.
"""

import dataclasses
import warnings
from unittest import mock

import numpy as np
import pytest

from bandwright.profile import Ready
from bandwright.profile.alike import together
from bandwright.solver import alike, solve_profile
from bandwright.solver.family import solve_family
from physics.dense import NotSure, count, levels
from physics.randomstacks import CLASSES, random_case

TOLERANCES = (1e-6, 1e-9)  # eV
DIPOLE = 1e-4  # nm
APART = 1e-7  # eV
FIXED, FRESH, ALL = 3, 3, 80


def asked(case):
    """Return the reference's levels and an energy that no level is near, so that counts compare."""
    margin = 4e-6
    found, high = levels(case.profile, case.high), case.high
    near = len(found.energies) and high - found.energies[-1] < margin
    try:
        more = count(case.profile, high + margin) > len(found.energies)
    except ValueError:  # over an open end's edge
        more = False
    if near or more:
        bounds = np.concatenate(([high - 0.2], found.energies))
        wide = np.flatnonzero(np.diff(bounds) > 4 * margin)
        if not len(wide):
            raise NotSure("no gap between levels is wide enough")
        high = 0.5 * (bounds[wide[-1]] + bounds[wide[-1] + 1])
        found = levels(case.profile, high)
    return found, high


def in_company(profile, high, tolerance, found, where, few):
    """Solve the stack beside a slightly thicker one; return how many were left to be solved alone.

    What a family gives must be what each design gives alone, to 1e-10 eV, whether its levels
    are foretold by a leader's (families from ``few`` designs on) or scanned.
    """
    thicker = dataclasses.replace(
        profile,
        sections=tuple(
            dataclasses.replace(s, thickness=1.002 * s.thickness) for s in profile.sections
        ),
    )
    with warnings.catch_warnings(), mock.patch.object(alike, "_FEW", few):
        warnings.simplefilter("error")
        both = together([profile, thicker])
        batches = list(solve_family(both, np.array([high, high]), profile.ends, None, tolerance))
        beside = solve_profile(thicker, high=high, tolerance=tolerance)
    expected, good = (found, beside), 0
    for batch in batches:
        for place in np.flatnonzero(batch.good):
            alone = expected[batch.which[place]]
            one = batch.solution(place, Ready(profile))
            assert len(one.energies) == len(alone.energies), where
            gap = np.abs(one.energies - alone.energies).max(initial=0.0)
            assert gap < 1e-10, f"{where}: {gap:.3g} eV from what it is alone"
            assert one.count_checked.all() and one.complete, where
            good += 1
    return 2 - good


def compare(case):
    """Return energy errors at each tolerance [eV], dipole error [nm], levels, solved alone."""
    reference, high = asked(case)
    wanted = reference.energies
    errors, alone = [], 0
    for tolerance in TOLERANCES:
        with warnings.catch_warnings():
            warnings.simplefilter("error")
            found = solve_profile(case.profile, high=high, tolerance=tolerance)
        where = f"{case} below {high!r} eV at {tolerance:g} eV"
        assert len(found.energies) == len(wanted), (
            f"{where}: {len(found.energies)} levels for {len(wanted)}: {found.energies} / {wanted}"
        )
        errors.append(np.abs(found.energies - wanted).max(initial=0.0))
        assert errors[-1] < tolerance, f"{where}: off by {errors[-1]:.3g} eV"
        assert found.count_checked.all(), f"{where}: count_checked {found.count_checked}"
        assert found.complete, f"{where}: not complete"
        few = 2 if case.seed % 2 else 6
        alone += in_company(case.profile, high, tolerance, found, where, few)
    lone = np.minimum(np.diff(wanted, prepend=-9.0), np.diff(wanted, append=99.0)) > APART
    both = np.ix_(lone, lone)
    dipole = 0.0
    if lone.any():
        with warnings.catch_warnings():
            warnings.simplefilter("error")
            found_dipoles = found.dipoles()
        gap = np.abs(np.abs(found_dipoles) - np.abs(reference.dipoles()))[both]
        dipole = float(gap.max())
        assert dipole < DIPOLE, f"{case} below {high!r} eV: a dipole is off by {dipole:.3g} nm"
    return errors, dipole, len(wanted), alone


@pytest.mark.parametrize(("kind", "bands"), CLASSES)
def test_random_stacks(kind, bands, request):
    whole = request.config.getoption("--all-stacks")
    fresh = np.random.default_rng(request.config.getoption("--stack-seed"))
    seeds = [*range(ALL if whole else FIXED), *(int(s) for s in fresh.integers(1e3, 1e9, FRESH))]
    worst, worst_dipole, total, alone, unsure = np.zeros(len(TOLERANCES)), 0.0, 0, 0, []
    for seed in seeds:
        case = random_case(kind, bands, seed)
        try:
            errors, dipole, number, left = compare(case)
        except NotSure as doubt:
            unsure.append(f"{case}: {doubt}")
            continue
        worst, worst_dipole = np.maximum(worst, errors), max(worst_dipole, dipole)
        total += number
        alone += left
    print(
        f"\n{kind}, {bands}: {len(seeds)} stacks, {total} levels, worst errors "
        + ", ".join(f"{e:.1e} eV at {t:g}" for e, t in zip(worst, TOLERANCES, strict=True))
        + f", dipole {worst_dipole:.1e} nm, {alone} of {4 * len(seeds)} family members solved alone"
    )
    assert total > (len(seeds) / 2 if whole else 0)  # six seeds may be shallow wells all
    assert len(unsure) <= max(1, len(seeds) // 50), unsure
