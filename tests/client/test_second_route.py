"""The program's figures computed a second time by other means: unit factors, uncertainties, reaction properties.

Each test makes its cases from a fixed seed, has the program run one script of them, and compares with a library or with
a computation in many digits from the shipped tables. What the two define differently is listed with its reason.
"""
import itertools
import json
import math
import os
import pathlib
import random
import re
import subprocess
import warnings
from fractions import Fraction

import mpmath
import numpy as np
import pint
import pytest
from jupyter_client.kernelspec import get_kernel_spec
from uncertainties import ufloat_fromstr, umath

DATA = pathlib.Path(__file__).parents[2] / "stdlib" / "data"
SEED = 20_260
UNIT_TEXTS = int(os.environ.get("HESSBOOK_UNIT_TEXTS", "3000"))  # The long checks ask for more.


def ran(script, folder, *options):
    """What the program prints for a script. It is the one that the kernel under test is."""
    path = folder / "cases.rhai"
    path.write_text(script, encoding="utf8")
    program = get_kernel_spec("hessbook").argv[0]
    done = subprocess.run([program, "run", *options, str(path)], capture_output=True, text=True, encoding="utf8")
    assert done.returncode == 0, done.stdout[-2000:] + done.stderr[-2000:]
    return done.stdout


def listed(misses, of):
    worst = sorted(misses, reverse=True)[:20]
    return f"{len(misses)} of {of}, worst first:\n" + "\n".join(f"{off:.3g}  {what}" for off, what in worst)


# Units ----------------------------------------------------------------------------------------------------------------

# Prefixes of the SI Brochure, 9th ed. (2019), Table 7, and of resolution 3 of the 27th CGPM (2022), both from memory.
PREFIXES = dict(
    da="deca", h="hecto", k="kilo", M="mega", G="giga", T="tera", P="peta", E="exa", Z="zetta", Y="yotta", R="ronna",
    Q="quetta", d="deci", c="centi", m="milli", µ="micro", u="micro", n="nano", p="pico", f="femto", a="atto",
    z="zepto", y="yocto", r="ronto", q="quecto",
)  # fmt: skip

# Units of the SI Brochure's Tables 2, 4 and 8 (from memory) that take every prefix: symbol, and the other side's name.
PREFIXED = dict(
    m="meter", g="gram", s="second", A="ampere", K="kelvin", mol="mole", cd="candela", rad="radian", sr="steradian",
    Hz="hertz", N="newton", Pa="pascal", J="joule", W="watt", C="coulomb", V="volt", F="farad", ohm="ohm", Ω="ohm",
    S="siemens", Wb="weber", T="tesla", H="henry", lm="lumen", lx="lux", Bq="becquerel", Gy="gray", Sv="sievert",
    kat="katal", L="liter", l="liter", Da="dalton", eV="electron_volt",
)  # fmt: skip

# Units that stand without a prefix here, of Table 8 and of the trade.
PLAIN = {
    "min": "minute", "h": "hour", "d": "day", "t": "tonne", "u": "unified_atomic_mass_unit", "E_h": "hartree",
    "D": "debye", "%": "percent", "ppm": "ppm", "Wh": "watt_hour", "cal_th": "thermochemical_calorie",
    "cal_IT": "international_calorie", "cal_15": "fifteen_degree_calorie",
    "Btu_th": "thermochemical_british_thermal_unit",
    "Btu_IT": "international_british_thermal_unit", "therm_EC": "therm", "therm_US": "US_therm", "t_TNT": "ton_TNT",
    "erg": "erg", "hp_550": "horsepower", "hp_metric": "metric_horsepower", "bar": "bar", "atm": "standard_atmosphere",
    "Torr": "torr", "mmHg": "millimeter_Hg", "inHg": "inch_Hg", "inH2O": "inch_H2O", "psi": "psi", "dyn": "dyne",
    "kgf": "force_kilogram", "lbf": "force_pound", "lb": "pound", "ton_short": "short_ton", "ton_long": "long_ton",
    "in": "inch", "ft": "foot", "angstrom": "angstrom", "Å": "angstrom", "gal_US": "gallon",
    "gal_UK": "imperial_gallon", "bbl": "oil_barrel", "degR": "degree_Rankine",
}  # fmt: skip

# Units the two define differently, as ratio of the definitions, ours over theirs. If either side changes its own, the
# test fails. Dalton and hartree are those of CODATA 2022 on both sides, so they are not here.
DIFFERENT = {
    "cal_15": 4.1858 / 4.1855,  # NIST SP 811 (2008), Appendix B; theirs is the CIPM's of 1950 (both from memory)
    "therm_EC": 1.05506 / 1.055056,  # NIST SP 811 (2008), Appendix B (from memory); theirs is 1e5 Btu of 1055.056 J
}

BASES = {"meter": "m", "kilogram": "kg", "second": "s", "ampere": "A", "kelvin": "K", "candela": "cd", "mole": "mol"}
RAISED = str.maketrans("0123456789-", "⁰¹²³⁴⁵⁶⁷⁸⁹⁻")


def power(exponent, chance):
    """An exponent as print and plain text have it."""
    if exponent == 1:
        return ""
    if exponent.denominator == 2:
        return chance.choice([f"^({exponent})", f"^{float(exponent)}", f"**({exponent})"])
    whole = str(exponent)
    return chance.choice([f"^{whole}", f"**{whole}", whole.translate(RAISED), f"^({whole})"])


def unit_text(factors, chance):
    """A product of powers, written with negative powers or below one fraction line, both as the SI Brochure has it."""
    if chance.random() < 0.5 or all(exponent < 0 for _, exponent in factors):
        joint = chance.choice([" ", "·", " * "])
        return joint.join(symbol + power(exponent, chance) for symbol, exponent in factors)
    above = [symbol + power(exponent, chance) for symbol, exponent in factors if exponent > 0]
    below = [symbol + power(-exponent, chance) for symbol, exponent in factors if exponent < 0]
    if not below:
        return " ".join(above)
    return " ".join(above) + "/" + (below[0] if len(below) == 1 else f"({' '.join(below)})")


def random_units(chance):
    """Endless lists of (symbol here, name there, exponent)."""
    plain = list(PLAIN.items())
    prefixed = list(PREFIXED.items())
    prefixes = [("", "")] + list(PREFIXES.items())
    exponents = [Fraction(n) for n in (1, 1, 1, 2, 3, -1, -1, -2, -3)] + [Fraction(1, 2), Fraction(-3, 2)]
    while True:
        factors = []
        for _ in range(chance.randint(1, 3)):
            if chance.random() < 0.3:
                symbol, name = chance.choice(plain)
            else:
                (prefix, prefix_name), (unit, unit_name) = chance.choice(prefixes), chance.choice(prefixed)
                symbol, name = prefix + unit, prefix_name + unit_name
            factors.append((symbol, name, chance.choice(exponents)))
        yield factors


def si_of(units, factors):
    """Factor and SI text of a product, by the other side with our definitions; None where no number holds it."""
    factor, bases = 1.0, {}
    try:
        for symbol, name, exponent in factors:
            one = units.Quantity(1.0, name).to_base_units()
            factor *= (one.magnitude * DIFFERENT.get(symbol, 1.0)) ** float(exponent)
            for base, count in one.unit_items():
                bases[base] = bases.get(base, 0) + Fraction(count).limit_denominator(2) * exponent
    except OverflowError:
        return None
    if not 1e-280 < factor < 1e280:
        return None
    # Angles and counted things are pure numbers here and there.
    bases = {base: exponent for base, exponent in bases.items() if base not in ("radian", "count") and exponent}
    text = " ".join(f"{BASES[base]}^({exponent})" for base, exponent in sorted(bases.items()))
    return factor, text or "1"


def test_unit_texts_have_the_factors_that_another_library_gives(tmp_path):
    units = pint.UnitRegistry()
    cases = []
    # Every unit once by itself, so that none is left to chance.
    alone = [[(symbol, name, Fraction(1))] for symbol, name in itertools.chain(PREFIXED.items(), PLAIN.items())]
    for factors in itertools.chain(alone, random_units(random.Random(SEED))):
        known = si_of(units, factors)
        if known:
            text = unit_text([(symbol, exponent) for symbol, _, exponent in factors], random.Random(len(cases)))
            cases.append((text, *known))
        if len(cases) == UNIT_TEXTS:
            break
    lines = [f'print(q("1 {text}").value("{base}"));' for text, _, base in cases]
    printed = [float(line) for line in ran("\n".join(lines), tmp_path).splitlines()]
    assert len(printed) == len(cases)
    misses = []
    for (text, factor, base), ours in zip(cases, printed):
        # Bound: roundings of some dozen products, and half a unit of the last of 14 digits in which the hartree is
        # printed and the Rydberg constant, from which the other side takes it; to the ninth power in all.
        off = abs(ours / factor - 1) / 1e-12
        if not off <= 1:
            misses.append((off, f"{text}: {ours!r} {base} here, {factor!r} there"))
    assert not misses, listed(misses, len(cases))


# Uncertainties --------------------------------------------------------------------------------------------------------

INPUTS = {"a": "1.2345(67)", "b": "0.857(12)", "c": "2.7100(43)", "d": "0.3141(9)"}


def random_expression(chance, depth):
    """An expression over the inputs that reads the same in both languages."""
    if depth == 0:
        return chance.choice(list(INPUTS))

    def inner():
        return random_expression(chance, depth - 1)

    number = round(chance.uniform(0.3, 3.0), 3)
    form = chance.randrange(10)
    if form < 5:
        return f"({inner()} {chance.choice('+-*/')} {inner()})"
    if form == 5:
        return f"({inner()} {chance.choice('+-*/')} {number})"
    if form == 6:
        return f"({number} {chance.choice('+-*/')} {inner()})"
    if form == 7:
        return f"({inner()} ** {number})"
    if form == 8:
        return f"({inner()} ** {chance.choice(list(INPUTS))})"
    return f"{chance.choice(['exp', 'ln'])}({inner()})"


def there(expression):
    """Value and standard uncertainty by the other side; None where it is no number or next to none."""
    names = {name: ufloat_fromstr(text) for name, text in INPUTS.items()}
    try:
        with warnings.catch_warnings():
            warnings.simplefilter("error")
            value = eval(expression, {"exp": umath.exp, "ln": umath.log, **names})
    except (ValueError, OverflowError, ZeroDivisionError, TypeError, Warning):
        return None
    if isinstance(value, complex) or not hasattr(value, "std_dev"):
        return None
    x, u = value.nominal_value, value.std_dev
    usable = math.isfinite(x) and math.isfinite(u) and 1e-6 < abs(x) < 1e6 and 1e-9 < u < 1e9
    return (x, u) if usable else None


def test_uncertainties_are_those_of_another_library(tmp_path):
    chance = random.Random(SEED)
    cases = {}
    while len(cases) < 60:
        expression = random_expression(chance, chance.randint(2, 5))
        known = there(expression)
        # Few inputs in large expressions: nearly all of these share inputs between their parts.
        if known and len(re.findall(r"\b[abcd]\b", expression)) > 2:
            cases[expression] = known
    inputs = "".join(f'let {name} = q("{text}");\n' for name, text in INPUTS.items())
    lines = [f'{{ let x = {text}; print(`${{x.value("1")}} ${{x.uncertainty("1")}}`); }}' for text in cases]
    printed = ran(inputs + "\n".join(lines), tmp_path).splitlines()
    misses = []
    for (expression, (x, u)), line in zip(cases.items(), printed, strict=True):
        ours_x, ours_u = map(float, line.split())
        # Bound: rounding of some dozen steps, of terms that may cancel to a millionth.
        off = max(abs(ours_x / x - 1), abs(ours_u / u - 1)) / 1e-9
        if not off <= 1:
            misses.append((off, f"{expression}: {ours_x!r} with u {ours_u!r} here, {x!r} with u {u!r} there"))
    assert not misses, listed(misses, len(cases))


# Reactions ------------------------------------------------------------------------------------------------------------


def tables():
    """Functions by record, and formation enthalpies in J/mol by dataset, best first; in many digits, as printed."""
    functions, datasets = {}, {}
    for path in sorted(DATA.glob("*.json")):
        table = json.loads(path.read_text(encoding="utf8"), parse_float=mpmath.mpf)
        kind = table.get("schema", "").split("/")[0]
        if kind == "hessbook-functions":
            for record in table["records"]:
                functions.setdefault(record["id"], dict(record, r=table["r_j_mol_k"], dataset=table["dataset"]["id"]))
        if kind == "hessbook-formation":
            known = datasets.setdefault((table["dataset"]["rank"], table["dataset"]["id"]), {})
            for record in table["records"]:
                if "dhf_298" in record:
                    known.setdefault(record["id"], mpmath.mpf(record["dhf_298"]["value"]) * 1000)
    return functions, {name: datasets[rank, name] for rank, name in sorted(datasets)}


def formation(function, dataset, known):
    """The formation enthalpy of a gas in one dataset; elements in their reference state belong to all."""
    if function["id"] in known:
        return known[function["id"]]
    if function["reference_element"] and function["dhf_298"] == 0:
        return mpmath.mpf(0)
    return function["dhf_298"] if function["dataset"] == dataset else None


def terms(function, t):
    """The terms of H in J/mol and of S in J/(mol K) at T: NASA/TP-2002-211556, equations (2) and (3)."""
    interval = next(one for one in function["intervals"] if t <= one["t"][1])
    a1, a2, a3, a4, a5, a6, a7 = interval["a"]
    b1, b2 = interval["b"]
    ln = mpmath.log(t)
    h = [-a1 / t, a2 * ln, a3 * t, a4 * t**2 / 2, a5 * t**3 / 3, a6 * t**4 / 4, a7 * t**5 / 5, b1]
    s = [-a1 / t**2 / 2, -a2 / t, a3 * ln, a4 * t, a5 * t**2 / 2, a6 * t**3 / 3, a7 * t**4 / 4, b2]
    return [function["r"] * term for term in h], [function["r"] * term for term in s]


def balanced(compositions):
    """The whole numbers that balance these, if there is one set of them and none is zero: Gauss on fractions."""
    elements = sorted(set().union(*compositions))
    rows = [[Fraction(one.get(element, 0)) for one in compositions] for element in elements]
    pivots = []
    for column in range(len(compositions)):
        row = next((r for r in range(len(pivots), len(rows)) if rows[r][column]), None)
        if row is None:
            continue
        rows[len(pivots)], rows[row] = rows[row], rows[len(pivots)]
        lead = rows[len(pivots)]
        lead[:] = [x / lead[column] for x in lead]
        for other in rows:
            if other is not lead and other[column]:
                other[:] = [x - other[column] * y for x, y in zip(other, lead)]
        pivots.append(column)
    free = [column for column in range(len(compositions)) if column not in pivots]
    if len(free) != 1:
        return None
    solution = [Fraction(0)] * len(compositions)
    solution[free[0]] = Fraction(1)
    for row, column in zip(rows, pivots):
        solution[column] = -row[free[0]]
    size = math.lcm(*(x.denominator for x in solution))
    whole = [int(x * size) for x in solution]
    whole = [n // math.gcd(*whole) for n in whole]
    return whole if all(0 < abs(n) <= 30 for n in whole) else None


def random_reactions(functions, count):
    """Balanced reactions of gases: species and stoichiometric numbers."""
    chance = random.Random(SEED)
    gases = [one for name, one in functions.items() if name.endswith("(g)") and one["intervals"][0]["t"][0] <= 298]
    found = {}
    while len(found) < count:
        elements = set(chance.sample(["C", "H", "O", "N", "S", "F", "Cl", "Br", "I", "P", "Si", "B"], 4))
        pool = [one for one in gases if elements >= one["composition"].keys()]
        species = chance.sample(pool, min(len(pool), chance.randint(2, 5)))
        numbers = balanced([one["composition"] for one in species])
        if numbers:
            found[frozenset(one["id"] for one in species)] = list(zip(species, numbers))
    return list(found.values())


def equation(reaction):
    def side(sign):
        return " + ".join(f"{abs(nu)} {one['id']}" for one, nu in reaction if nu * sign > 0)

    return f"{side(-1)} -> {side(1)}"


@pytest.fixture
def many_digits():
    with mpmath.workdps(40):
        yield


def test_reaction_properties_are_those_of_the_tables_in_many_digits(tmp_path, many_digits):
    functions, datasets = tables()
    chance = random.Random(SEED)
    script, cases = [], []
    for nth, reaction in enumerate(random_reactions(functions, 30)):
        t_text = f"{chance.uniform(250, min(one['intervals'][-1]['t'][1] for one, _ in reaction) - 1):.2f}"
        t, t0 = mpmath.mpf(t_text), mpmath.mpf("298.15")
        # Formation enthalpies of one dataset: the first that has all species.
        formations = ([formation(one, name, known) for one, _ in reaction] for name, known in datasets.items())
        first = next(figures for figures in formations if None not in figures)
        h, s, size_h, size_s = 0, 0, 0, 0
        for (one, nu), dhf in zip(reaction, first):
            (h_t, s_t), (h_0, _) = terms(one, t), terms(one, t0)
            h += nu * (dhf + sum(h_t) - sum(h_0))
            s += nu * sum(s_t)
            size_h += abs(nu) * (abs(dhf) + sum(map(abs, h_t)) + sum(map(abs, h_0)))
            size_s += abs(nu) * sum(map(abs, s_t))
        text = equation(reaction)
        script.append(f'let r = reaction("{text}");')
        for verb, value, size in [
            ("enthalpy", h / 1000, size_h / 1000),
            ("entropy", s, size_s),
            ("gibbs_energy", (h - t * s) / 1000, (size_h + t * size_s) / 1000),
        ]:
            label = f"{verb} of {text} at {t_text} K"
            script.append(f'report("{nth} {label}", r.{verb}("{t_text} K"));')
            cases.append((f"{nth} {label}", value, size, "J/(K mol[rxn])" if verb == "entropy" else "kJ/mol[rxn]"))
    reports = json.loads(ran("\n".join(script), tmp_path, "--format", "json"))["reports"]
    misses = []
    for report, (label, value, size, unit) in zip(reports, cases, strict=True):
        assert (report["label"], report["unit"]) == (label, unit)
        # Bound: a term is at most a fifth power with an integral's factor, so reading its figures and T and forming it
        # rounds some 16 times, by 2**-53 of it each; the terms cancel by orders of magnitude, hence their sizes.
        off = abs(mpmath.mpf(report["value"]) - value) / (16 * 2.0**-53 * size)
        if not off <= 1:
            misses.append((float(off), f"{label}: {report['value']} here, {mpmath.nstr(value, 17)} there, {unit}"))
    assert not misses, listed(misses, len(cases))


# Molecules --------------------------------------------------------------------------------------------------------------

# Weights of even and odd J of the two hydrogens with forms, from their nuclear spins of 1/2 and 1.
FORMS = {"H2": (1, 3), "D2": (2, 1)}
C2 = 1.4387768775039338  # K cm, of the SI of 2019
R = 8.31446261815324


def forms_of_hydrogen(record, weights, t_k, frozen):
    """Cp and S of rotation and vibration over R, by the sum over v and J in full, from the shipped constants."""
    we, wexe, be, alpha = (float(record[name]) for name in ("we", "wexe", "Be", "alpha_e"))
    de = 4 * be**3 / we**2  # Kratzer's relation
    he = 2 * de * (12 * be**2 - alpha * we) / (3 * we**2)
    v, j = np.meshgrid(np.arange(40.0), np.arange(80.0), indexing="ij")
    jj = j * (j + 1)
    e = we * (v + 0.5) - wexe * (v + 0.5) ** 2 + (be - alpha * (v + 0.5)) * jj - de * jj**2 + he * jj**3
    lowest = e[0, 0]
    # Up to 1000 K nothing counts beyond 30 kT, far below where either ladder turns.
    kept = (e - lowest < 0.8 * (we**2 / 4 / wexe - lowest)) & (np.diff(e, axis=1, prepend=-np.inf) > 0)
    kept &= np.diff(e, axis=0, prepend=-np.inf) > 0
    kept = np.logical_and.accumulate(kept, axis=1)

    def of(level, weight):
        x = C2 * (level - level.min()) / t_k
        p = weight * np.exp(-x)
        q = p.sum()
        mean = (p * x).sum() / q
        return (p * x * x).sum() / q - mean**2, np.log(q) + mean

    even, odd = (weight / sum(weights) for weight in weights)
    if not frozen:
        weight = (2 * j + 1) * np.where(j % 2 == 0, even, odd)
        return of(e[kept], weight[kept])
    parts = [of(e[kept & (j % 2 == parity)], (2 * j + 1)[kept & (j % 2 == parity)]) for parity in (0, 1)]
    return tuple(even * a + odd * b for a, b in zip(*parts))


def test_hydrogen_in_the_cold_is_the_sum_over_its_levels(tmp_path):
    table = json.loads((DATA / "molecular-constants.json").read_text(encoding="utf8"))
    records = {record["formula"]: record for record in table["records"]}
    cases = [(name, t_k, spin) for name in FORMS for t_k in (5, 20, 50, 77, 100, 150, 298.15, 1000)
             for spin in ("equilibrium", "frozen")]  # fmt: skip
    lines = [
        f'print([m.heat_capacity("{t_k} K").value("J/(mol K)"), m.entropy("{t_k} K").value("J/(mol K)")]);'
        for _, t_k, _ in cases
    ]
    made = [f'm = molecule("{name}").taken(#{{ nuclear_spin: "{spin}" }});' for name, _, spin in cases]
    script = 'let m = molecule("H2");\n' + "\n".join(a + b for a, b in zip(made, lines))
    told = [json.loads(line) for line in ran(script, tmp_path).splitlines() if line.startswith("[")]
    misses = []
    for (name, t_k, spin), (cp, s) in zip(cases, told, strict=True):
        rotation = forms_of_hydrogen(records[name], FORMS[name], t_k, spin == "frozen")
        mass = 1e-3 * {"H2": 2 * 1.0080, "D2": float(records["D2"]["isotopologue_mass"])}[name] / 6.02214076e23
        k, h = 1.380649e-23, 6.62607015e-34
        moved = 2.5 + 1.5 * np.log(2 * np.pi * mass * k * t_k / h**2) + np.log(k * t_k / 1e5)
        # Bound: rounding of sums of a few hundred terms, and what both cut off at 1000 K, 1e-12 of the weight.
        for what, got, want in (("Cp", cp, R * (2.5 + rotation[0])), ("S", s, R * (moved + rotation[1]))):
            if abs(got - want) > 1e-8:
                misses.append((abs(got - want), f"{what} of {name}, {spin}, at {t_k} K: {got}, {want}"))
    assert not misses, listed(misses, 2 * len(cases))
