"""Published Sturm-Liouville test problems, -y'' + q(x) y = lambda y, as profiles with h2m/m = 1.

Published digits are those of J. D. Pryce's standard problem set (version 1.2), the companion of
*Numerical Solution of Sturm-Liouville Problems* (Oxford 1993), unless another source is named;
"from memory" marks digits that were not read at their source. Beside them stand values computed
from the equation with more digits (reference_values.json), which decide: some printed values are
known to be wrong (problems 5, 36, 40, 53, each said below).
"""

import numpy as np
import pytest

from bandwright.constants import H2M
from bandwright.profile import Profile, Section
from bandwright.solver import solve_profile
from physics.build import liouville, poly, reference
from physics.matching import check, last_digit

RECORDS = reference()[1]
PRYCE = "Pryce 1993, standard problem set, problem"


def solve(case, high, tolerance):
    found = solve_profile(case, high=high, tolerance=tolerance)
    assert found.count_checked.all()
    assert found.complete
    return found.energies


def expect(label, found, expected, tolerance, name):
    record = RECORDS[name]
    check(label, found, expected, tolerance, f"{record['source']}; {record['equation']}")


def test_paine_exponential():
    """Digits to 8 from Paine, de Hoog, Anderssen, Computing 26, 123 (1981), from memory."""
    expected = RECORDS["B.paine1"]["outputs"]["lambda_0.."]
    found = solve(liouville(np.exp, 0.0, np.pi), 120.0, 1e-9)
    expect("exp(x)", found[:10], expected, 1e-9, "B.paine1")
    printed = ["4.8966694", "10.045190", "16.019267", "23.266271", "32.263707", "43.220020",
               "56.181594", "71.152998", "88.132119", "107.11668"]  # fmt: skip
    check("exp(x), printed", found[:10], printed, 1e-9, "Paine, de Hoog, Anderssen, from memory")


def test_paine_pole_near_the_wall():
    expected = RECORDS["B.paine2"]["outputs"]["lambda_0.."]
    found = solve(liouville(lambda x: 1 / (x + 0.1) ** 2, 0.0, np.pi), 110.0, 1e-9)
    expect("1/(x+0.1)^2", found[:10], expected, 1e-9, "B.paine2")
    printed = ["1.5198658211", "4.9433098221", "10.284662645", "17.559957746", "26.782863158"]
    check("1/(x+0.1)^2, printed", found[:5], printed, 1e-9, "Paine, de Hoog, Anderssen 1981")


@pytest.mark.parametrize(("beta", "printed"), [(20, "151.46322365766"), (50, "391.808191489")])
def test_coffey_evans(beta, printed):
    """Triples that agree to 5 digits at beta = 20 and to 15 at beta = 50."""
    expected = RECORDS[f"B.coffey.b{beta}"]["outputs"]["lambda_0..9"]
    case = liouville(lambda x: -2 * beta * np.cos(2 * x) + (beta * np.sin(2 * x)) ** 2,
                     -np.pi / 2, np.pi / 2)  # fmt: skip
    found = solve(case, float(expected[-1]) + 1.0, 1e-9)
    assert len(found) == 10
    expect(f"Coffey-Evans {beta}", found, [float(e) for e in expected], 1e-9, f"B.coffey.b{beta}")
    check("printed", [found[0], found[3]], ["0.0000000000000", printed], 1e-9, f"{PRYCE} 7")


@pytest.mark.parametrize("r", [1, 5, 10, 25])
def test_mathieu(r):
    """Dirichlet levels on [0, pi] are the characteristic values b_1, b_2, ... (DLMF 28.2)."""
    expected = RECORDS[f"B.mathieu.r{r}"]["outputs"]["lambda_0..7"]
    found = solve(liouville(lambda x: 2 * r * np.cos(2 * x), 0.0, np.pi), 70.0, 1e-9)
    expect(f"Mathieu r={r}", found[:8], expected, 1e-9, f"B.mathieu.r{r}")


def test_finite_superlattice():
    """Clusters of 6. Printed -3.484229 and -3.484187 are off in their 5th and 6th digit."""
    expected = RECORDS["B.pryce5"]["outputs"]["lambda_0,5,6,11,12,17 (double)"]
    found = solve(liouville(lambda x: 5 * np.cos(x), 0.0, 40.0, pieces=4), 2.2, 1e-9)
    expect("5 cos x", found[[0, 5, 6, 11, 12, 17]], expected, 1e-9, "B.pryce5")
    printed = ["-0.599543", "-0.595603", "1.932915", "1.995459"]
    check("5 cos x, printed", found[[6, 11, 12, 17]], printed, last_digit(printed[0]), f"{PRYCE} 5")


@pytest.mark.parametrize(
    ("power", "end", "printed", "printed_24"),
    [(3, 9.0, "3.4505626899", "228.52088139"), (4, 7.0, "3.7996730298", "397.14132678"),
     (5, 5.5, "4.0891593149", "588.17824969")],
)  # fmt: skip
def test_power_wells_on_the_half_line(power, end, printed, printed_24):
    """x^alpha from a wall at 0; the far wall stands where the 25th level has died out."""
    outputs = RECORDS[f"B.anh{power}"]["outputs"]
    found = solve(liouville(lambda x: x**power, 0.0, end, pieces=3),
                  float(outputs["lambda_24 (double)"][0]) + 3.0, 1e-9)  # fmt: skip
    expected = [*outputs["lambda_0,1"], *outputs["lambda_24 (double)"]]
    expect(f"x^{power}", found[[0, 1, 24]], expected, 2e-9, f"B.anh{power}")
    check(f"x^{power}, printed", found[[0, 24]], [printed, printed_24], 2e-9, f"{PRYCE} 17")


def test_raman_well():
    """Its weight is 1/2: lambda is twice the ordinary level."""
    expected = RECORDS["B.raman"]["outputs"]["lambda_0,1,5"]
    case = liouville(lambda x: x**4 + x**3 / 2 - 7 * x**2, -5.5, 5.5, pieces=4)
    found = 2 * solve(case, 5.0, 1e-9)
    expect("x^4 + x^3/2 - 7x^2", found[[0, 1, 5]], expected, 2e-9, "B.raman")
    check("printed", found[[0, 5]], ["-24.5175977072", "8.10470769427"], 2e-9, f"{PRYCE} 33")


def test_close_pairs():
    """x^4 - 25 x^2: five pairs, the first closer than 1e-20."""
    expected = RECORDS["B.close25"]["outputs"]["lambda_0..9"]
    found = solve(liouville(lambda x: x**4 - 25 * x**2, -7.5, 7.5, pieces=6), -90.0, 1e-9)
    assert len(found) == 10
    expect("x^4 - 25x^2", found, expected, 1e-9, "B.close25")
    check("printed", found[:2], ["-149.2194561"] * 2, 1e-9, f"{PRYCE} 38")


def test_quasi_exactly_solvable_sextic():
    """Levels 1, 3 and 5 of x^6 - 11 x^2 are exactly -8, 0 and 8."""
    expected = [float(e) for e in RECORDS["B.x6qes"]["outputs"]["lambda_0..9"]]
    found = solve(liouville(lambda x: x**6 - 11 * x**2, -4.0, 4.0, pieces=4), 50.0, 1e-9)
    expect("x^6 - 11x^2", found, expected, 1e-9, "B.x6qes")
    assert np.abs(found[[0, 2, 4]] - [-8.0, 0.0, 8.0]).max() < 1e-9


def test_molecular_well():
    """Printed lambda_1 = -177.2908125 has lost a digit; the rest of print is good to 1e-7."""
    expected = RECORDS["B.secrest"]["outputs"]["lambda_0,1,13 (double)"]

    def q(x):
        t = np.exp(-1.7 * (x - 1.3))
        return 2 / x**2 + 2000 * (t * t - 2 * t)

    found = solve(liouville(q, 0.4, 4.5, pieces=4), -460.0, 1e-8)
    expect("Secrest", found[[0, 1, 13]], expected, 1e-7, "B.secrest")
    check("Secrest, printed", found[[0, 13]], ["-1923.529653", "-473.29709743"], 1e-7 * 1923,
          f"{PRYCE} 36")  # fmt: skip


def test_spike_in_a_morse_well():
    """Printed 163.2238021 and 1277.536963 differ by 5e-7 and 1e-7 of their value."""
    expected = RECORDS["B.wicke"]["outputs"]["lambda_0,1,2,9 (double)"]

    def q(x):
        spike = 1250 * np.exp(-83.363 * (x - 2.47826) ** 2)
        return spike + 3906.25 * (1 - np.exp(2.3237 - x)) ** 2

    found = solve(liouville(q, 1.0, 6.0, pieces=6), 1300.0, 1e-8)
    expect("Wicke-Harris", found[[0, 1, 2, 9]], expected, 1e-7, "B.wicke")
    check("printed", found[[0, 9]], ["163.2238021", "1277.536963"], 2e-4, f"{PRYCE} 40")


def test_piecewise_linear_oscillator():
    """q linear through (n, n^2). Printed 0.3456792711 is impossible, since q >= x^2 everywhere."""
    expected = RECORDS["B.pl53"]["outputs"]["lambda_0..9"]
    sections = [Section(1.0, poly(n * n, 2 * n + 1), poly(H2M)) for n in range(-9, 9)]
    found = solve(Profile(tuple(sections), ("wall", "wall")), 20.0, 1e-9)
    expect("through (n, n^2)", found[:10], expected, 1e-9, "B.pl53")


@pytest.mark.parametrize(
    ("label", "q", "start", "end", "pieces", "high", "closed"),
    [
        ("14: -12 sech^2 x", lambda x: -12 / np.cosh(x) ** 2, -24, 24, 8, -0.5,
         [-9.0, -4.0, -1.0]),
        ("35: 9(e^-2x - 2e^-x)", lambda x: 9 * (np.exp(-2 * x) - 2 * np.exp(-x)), -2.5, 45, 16,
         -0.1, [-6.25, -2.25, -0.25]),
        ("27: x, u(0) = 0", lambda x: x, 0, 25, 2, 13.0,
         [2.33810741045977, 4.08794944413097, None, None, None, None, None, None, None,
          12.8287767528658]),
    ],
)  # fmt: skip
def test_closed_spectra(label, q, start, end, pieces, high, closed):
    """Elementary closed forms of the same set (its title of 35 has the exponentials swapped)."""
    found = solve(liouville(q, float(start), float(end), pieces), high, 1e-9)
    assert len(found) == len(closed)
    known = [(f, c) for f, c in zip(found, closed, strict=True) if c is not None]
    check(label, [f for f, _ in known], [c for _, c in known], 1e-9, PRYCE)


def test_morse_well_with_sixty_levels():
    """Problem 39: lambda_k = -(sqrt(8000) - 1.5 (k + 1/2))^2, all but the topmost, wide one."""
    k = np.arange(59)
    closed = -((np.sqrt(8000) - 1.5 * (k + 0.5)) ** 2)
    case = liouville(lambda x: 8000 * (np.exp(-3 * x) - 2 * np.exp(-1.5 * x)), -1.0, 16.0, 10)
    found = solve(case, -1.0, 1e-6)
    check("39: Morse", found, closed, 1e-6, f"{PRYCE} 39")
