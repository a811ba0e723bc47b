"""Heat capacities of crystals and of internal rotations by a second route: mpmath, and Mathieu's functions of scipy.

Each test has the program run one script of cases and compares with sums in many digits, or with levels of a library.
"""
import json

import mpmath
import numpy as np
import pytest
from scipy import special
from test_second_route import C2, R, listed, ran


@pytest.fixture(autouse=True)
def many_digits():
    with mpmath.workdps(40):
        yield


# Crystals -------------------------------------------------------------------------------------------------------------


def debye(x):
    """Cv, U/T and S of one mole of modes over R: D3 by the sum in exp(-kx), or by quadrature where that is slow."""
    if x > 1:
        total, k = mpmath.mpf(0), 1
        while k * x < 110:
            total += mpmath.exp(-k * x) * (x**3 / k + 3 * x**2 / k**2 + 6 * x / k**3 + 6 / mpmath.mpf(k) ** 4)
            k += 1
        d3 = 3 * (mpmath.pi**4 / 15 - total) / x**3
    else:
        d3 = 3 * mpmath.quad(lambda t: t**3 / mpmath.expm1(t), [0, x]) / x**3
    return 4 * d3 - 3 * x / mpmath.expm1(x), d3, 4 * d3 / 3 - mpmath.log1p(-mpmath.exp(-x))


def einstein(x):
    n = 1 / mpmath.expm1(x)
    return x**2 * n * (n + 1), x * n, x * n - mpmath.log1p(-mpmath.exp(-x))


def test_functions_of_crystals_are_those_of_many_digits(tmp_path):
    cases, script = [], ["let c = 0;"]
    for nth, x in enumerate(np.logspace(-3, 3, 49)):
        # The temperatures differ, so that nothing hangs on one of them; H is from half of each.
        t_text = f"{[0.8, 5.0, 77.0, 298.15, 1000.0][nth % 5]}"
        for kind, of in (("debye", debye), ("einstein", einstein)):
            theta_text = f"{x * float(t_text):.12g}"
            cases.append((kind, of, theta_text, t_text))
            script.append(f'c = crystal(#{{ formula: "Cu", {kind}: "{theta_text} K" }});')
            at = f'"{t_text} K"'
            half = f'"{float(t_text) / 2!r} K"'
            script.append(
                f'print([c.heat_capacity_v({at}).value("J/(K mol)"), c.enthalpy_increment({at}, {half}).value("J/mol"),'
                f' c.entropy({at}).value("J/(K mol)")]);'
            )
    told = [json.loads(line) for line in ran("\n".join(script), tmp_path).splitlines() if line.startswith("[")]
    misses = []
    for (kind, of, theta_text, t_text), got in zip(cases, told, strict=True):
        theta, t, r3 = mpmath.mpf(theta_text), mpmath.mpf(t_text), 3 * mpmath.mpf(str(R))
        cv, u, s = of(theta / t)
        _, u_half, _ = of(2 * theta / t)
        want = (r3 * cv, r3 * t * (u - u_half / 2), r3 * s)
        for what, a, b in zip(("Cv", "H", "S"), got, want):
            # Bound: x is rounded twice, and exp(-x) loses x times that, 2e-13 at x = 1000; below 1e-290 numbers lose digits.
            allowed = 1e-12 * abs(b) + mpmath.mpf("1e-290")
            if not abs(mpmath.mpf(a) - b) <= allowed:
                off = float(abs(mpmath.mpf(a) / b - 1))
                misses.append((off, f"{what} of {kind} {theta_text} K at {t_text} K: {a}, {mpmath.nstr(b, 17)}"))
    assert not misses, listed(misses, 3 * len(cases))


# Internal rotations ---------------------------------------------------------------------------------------------------

# F and the barrier in cm^-1, from nearly free to stiff.
TORSIONS = [(10.68, 1024.0), (27.64, 373.2), (5.0, 50.0), (1.2, 0.5)]
# Too stiff for the library, which beyond q = 100 takes one characteristic value for another.
STIFF = [(6.0, 2500.0), (2.0, 8000.0)]


def plane_waves(f, barrier, fold):
    """Levels from the lowest, by a matrix of exp(imφ) far larger than any that is needed."""
    m = np.arange(-300, 301)
    h = np.diag(f * m**2.0 + barrier / 2)
    for i in range(len(m) - fold):
        h[i, i + fold] = h[i + fold, i] = -barrier / 4
    levels = np.linalg.eigvalsh(h)
    return levels - levels[0]


def mathieu(order, q):
    """All characteristic values of whole order up to one, whichever symmetry they have."""
    return np.array([special.mathieu_a(n, q) for n in order] + [special.mathieu_b(n, q) for n in order if n > 0])


def top(f, barrier, fold):
    # Ethane with all its other modes; only the torsion is looked at.
    return (
        'molecule(#{ name: "a top", formula: "C2H6", symmetry_number: 6, unit: "cm^-1",'
        " rotational_constants: [2.671, 0.66303, 0.66303],"
        " vibrations: [2954, 1388, 995, 2896, 1379, [2969, 2], [1468, 2], [1190, 2], [2985, 2], [1469, 2], [822, 2]],"
        f" torsions: [#{{ rotational_constant: {f!r}, barrier: {barrier!r}, fold: {fold}, symmetry_number: 1 }}] }})"
    )


def test_levels_of_a_torsion_are_characteristic_values_of_mathieu(tmp_path):
    count, cases, script = 30, [], []
    for f, barrier in TORSIONS:
        for fold in (1, 2, 3):
            cases.append((f, barrier, fold))
            script.append(
                f'print({top(f, barrier, fold)}.torsion_levels({count})[0].map(|level| level.value("cm^-1")));'
            )
    told = [json.loads(line) for line in ran("\n".join(script), tmp_path).splitlines() if line.startswith("[")]
    misses = []
    for (f, barrier, fold), got in zip(cases, told, strict=True):
        # -F y'' + V(1 - cos nφ)/2 y = E y is Mathieu's equation in z = nφ/2 with q = V/(n²F) and E = n²F a/4 + V/2. States of
        # period 2π in φ have period 4π/n in z: for n = 1 those of even order, for n = 2 all, for n = 3 those of A symmetry.
        q, scale = barrier / (fold**2 * f), fold**2 * f / 4
        order = range(0, 60) if fold == 2 else range(0, 120, 2)
        levels = np.sort(scale * (mathieu(order, q) - special.mathieu_a(0, q)))
        if fold < 3:
            pairs = list(zip(got, levels))
        else:
            # A third of the levels; each must be among them.
            pairs = [(min(got, key=lambda one, level=level: abs(one - level)), level) for level in levels[: count // 3]]
        for a, b in pairs:
            # Bound: that of the library, ten digits, and of eigenvalues of a matrix of size F m².
            if abs(a - b) > 1e-8 * max(1.0, b):
                misses.append((abs(a - b), f"F = {f}, V{fold} = {barrier}: {a}, {b}"))
    assert not misses, listed(misses, len(cases) * count)


def test_heat_capacity_and_entropy_of_a_torsion_are_sums_over_its_levels(tmp_path):
    tops = [(f, barrier, fold) for f, barrier in TORSIONS + STIFF for fold in (1, 2, 3)]
    cases, script = [], ["let rows = []; let row = #{};"]
    for nth, (f, barrier, fold) in enumerate(tops):
        script.append(f"let m{nth} = {top(f, barrier, fold)};")
        for t_k in (30.0, 300.0, 1500.0):
            cases.append((f, barrier, fold, t_k))
            script.append(
                f'rows = m{nth}.contributions("{t_k} K").rows; row = rows[rows.len() - 1];'
                " print([row.heat_capacity, row.entropy]);"
            )
    told = [json.loads(line) for line in ran("\n".join(script), tmp_path).splitlines() if line.startswith("[")]
    misses = []
    for (f, barrier, fold, t_k), got in zip(cases, told, strict=True):
        x = C2 * plane_waves(f, barrier, fold) / t_k
        p = np.exp(-x)
        mean = (p * x).sum() / p.sum()
        want = (R * ((p * x * x).sum() / p.sum() - mean**2), R * (np.log(p.sum()) + mean))
        for what, a, b in zip(("Cp", "S"), got, want):
            # Bound: levels far above the barrier are taken to second order there, which is 1e-8 of kT at most.
            if abs(a - b) > 1e-7:
                misses.append((abs(a - b), f"{what}, F = {f}, V{fold} = {barrier}, {t_k} K: {a}, {b}"))
    assert not misses, listed(misses, 2 * len(cases))
