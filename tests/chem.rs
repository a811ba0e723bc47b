//! Properties of formulas, species, equations and balancing, and molar masses against published ones.
//!
//! Seeds are fixed. Where the library's answer is checked, the test counts by another road: atoms by a stack over the
//! text, ranks of systems modulo a prime.

use std::collections::BTreeMap;

use proptest::prelude::*;
use proptest::test_runner::RngSeed;

use hessbook::chem::balance::{BalanceError, Balanced, Party, balance, solve};
use hessbook::chem::composition::Composition;
use hessbook::chem::element::{Element, atomic_weight};
use hessbook::chem::equation::Equation;
use hessbook::chem::equation_text::EquationText;
use hessbook::chem::formula::{Formula, FormulaError};
use hessbook::chem::species::{Species, SpeciesName};
use hessbook::fault::{Explain, Fault};
use hessbook::num::rational::Rational;

fn config() -> ProptestConfig {
    let cases = if cfg!(debug_assertions) { 500 } else { 100_000 };
    ProptestConfig {
        cases,
        rng_seed: RngSeed::Fixed(20_250_101),
        failure_persistence: None,
        ..ProptestConfig::default()
    }
}

fn find(text: &str) -> Result<Species, Fault> {
    Ok(Species::from_formula(text)?)
}

/// Atoms of a plain formula without dots, fractions and charge, by a stack; not the library's way.
fn atoms_by_stack(formula: &str) -> BTreeMap<String, i64> {
    fn number(rest: &mut &str) -> i64 {
        let digits = rest.len() - rest.trim_start_matches(|c: char| c.is_ascii_digit()).len();
        let n = if digits == 0 { 1 } else { rest[..digits].parse().unwrap() };
        *rest = &rest[digits..];
        n
    }
    let mut stack: Vec<Vec<(String, i64)>> = vec![Vec::new()];
    let mut rest = formula;
    while let Some(c) = rest.chars().next() {
        rest = &rest[1..];
        match c {
            '(' | '[' => stack.push(Vec::new()),
            ')' | ']' => {
                let n = number(&mut rest);
                let group = stack.pop().unwrap();
                stack.last_mut().unwrap().extend(group.into_iter().map(|(symbol, count)| (symbol, count * n)));
            }
            _ => {
                let small = rest.len() - rest.trim_start_matches(|c: char| c.is_ascii_lowercase()).len();
                let symbol = format!("{c}{}", &rest[..small]);
                rest = &rest[small..];
                let n = number(&mut rest);
                stack.last_mut().unwrap().push((symbol, n));
            }
        }
    }
    let mut sum = BTreeMap::new();
    for (symbol, count) in stack.pop().unwrap() {
        *sum.entry(symbol).or_insert(0) += count;
    }
    sum
}

#[test]
fn known_hard_equations_conserve_atoms_counted_another_way() {
    // Puzzles of balancing that circulate among teachers of chemistry; read from memory.
    let equations = [
        "K4Fe(CN)6 + KMnO4 + H2SO4 -> KHSO4 + Fe2(SO4)3 + MnSO4 + HNO3 + CO2 + H2O",
        "[Cr(N2H4CO)6]4[Cr(CN)6]3 + KMnO4 + H2SO4 -> K2Cr2O7 + MnSO4 + CO2 + KNO3 + K2SO4 + H2O",
        "H2 + Ca(CN)2 + NaAlF4 + FeSO4 + MgSiO3 + KI + H3PO4 + PbCrO4 + BrCl + CF2Cl2 + SO2 -> \
         PbBr2 + CrCl3 + MgCO3 + KAl(OH)4 + Fe(SCN)3 + PI3 + Na2SiO3 + CaF2 + H2O",
        "C7H6O2 + O2 -> CO2 + H2O",
    ];
    for text in equations {
        let Balanced { left, right } = balance(text, &Party::from_formula).unwrap();
        let total = |side: &[(i64, String)]| {
            let mut sum: BTreeMap<String, i64> = BTreeMap::new();
            for (n, formula) in side {
                for (symbol, count) in atoms_by_stack(formula) {
                    *sum.entry(symbol).or_insert(0) += n * count;
                }
            }
            sum
        };
        assert_eq!(total(&left), total(&right), "{text}");
        assert!(left.iter().chain(&right).all(|(n, _)| *n > 0));
    }
}

#[test]
fn molar_masses_agree_with_sums_by_hand() {
    // Added up by hand from the abridged CIAAW 2021 figures: H 1.0080, C 12.011, O 15.999, F 18.998403162, S 32.06,
    // Ca 40.078, Fe 55.845, Cu 63.546, U 238.02891.
    let rows = [
        ("CaCO3", 100.086),
        ("Fe2O3", 159.687),
        ("C6H12O6", 180.156),
        ("CuSO4.5H2O", 249.677),
        ("UF6", 352.019_328_972),
    ];
    for (text, by_hand) in rows {
        let mass = Formula::parse(text).unwrap().composition().molar_mass_g_mol().unwrap();
        assert!((mass - by_hand).abs() < 1e-14 * by_hand, "{text}: {mass}"); // some ten roundings of doubles
    }
}

#[test]
fn molar_masses_agree_with_an_older_published_table_within_the_printed_bounds() {
    // Molar masses in g/mol as NASA/TP-2002-211556 gives them, from older atomic weights (figures of a machine-readable
    // copy). The allowance is the printed bound of each atomic weight times the number of atoms, nothing else.
    let source = "NASA/TP-2002-211556";
    let rows = [
        ("H2O", 18.01528),
        ("CO2", 44.0095),
        ("CH4", 16.04246),
        ("NH3", 17.03052),
        ("SO2", 64.0638),
        ("Fe2O3", 159.6882),
        ("CaCO3", 100.0869),
    ];
    for (text, printed) in rows {
        let composition = Formula::parse(text).unwrap().composition().clone();
        let terms = composition.molar_mass_terms().unwrap();
        let bound: f64 = terms.iter().map(|&(e, n)| n * atomic_weight(e).unwrap().printed_u).sum();
        let off = (composition.molar_mass_g_mol().unwrap() - printed).abs();
        assert!(off <= bound, "{text}: off by {off:.5} from {source}, allowed {bound:.5}");
    }
}

const SYMBOLS: [&str; 14] = ["H", "D", "C", "N", "O", "S", "Cl", "Na", "Fe", "Co", "Ti", "U", "He", "Og"];

/// A formula's text, with the atoms that it was made to hold.
type Drawn = (String, Vec<(&'static str, Rational)>);

fn count_text() -> impl Strategy<Value = (String, Rational)> {
    prop_oneof![
        3 => Just((String::new(), Rational::ONE)),
        3 => (1..40_i32).prop_map(|n| (n.to_string(), Rational::from(n))),
        1 => (1..20_i64, 2..20_i64).prop_map(|(n, d)| (format!("{n}/{d}"), Rational::new(n, d).unwrap())),
        1 => (1..1000_i64).prop_map(|n| (format!("0.{n:03}"), Rational::new(n, 1000).unwrap())),
    ]
}

fn drawn_body() -> impl Strategy<Value = Drawn> {
    let atom = (proptest::sample::select(&SYMBOLS[..]), count_text())
        .prop_map(|(symbol, (text, n))| (format!("{symbol}{text}"), vec![(symbol, n)]));
    atom.prop_recursive(3, 12, 4, |inner| {
        (proptest::collection::vec(inner, 1..4), count_text(), any::<bool>()).prop_map(|(parts, (count, n), square)| {
            let inside: String = parts.iter().map(|part| part.0.as_str()).collect();
            let atoms = parts.into_iter().flat_map(|part| part.1).map(|(s, c)| (s, c.checked_mul(n).unwrap()));
            let (open, close) = if square { ('[', ']') } else { ('(', ')') };
            (format!("{open}{inside}{close}{count}"), atoms.collect())
        })
    })
}

fn drawn_formula() -> impl Strategy<Value = Drawn> {
    let water = proptest::option::of((1..13_i32, proptest::sample::select(&[".", "·"][..])));
    (proptest::collection::vec(drawn_body(), 1..4), water).prop_map(|(parts, water)| {
        let mut text: String = parts.iter().map(|part| part.0.as_str()).collect();
        let mut atoms: Vec<_> = parts.into_iter().flat_map(|part| part.1).collect();
        if let Some((n, dot)) = water {
            text.push_str(&format!("{dot}{n}H2O"));
            atoms.extend([("H", Rational::from(2 * n)), ("O", Rational::from(n))]);
        }
        (text, atoms)
    })
}

fn composition(atoms: &[(&str, Rational)]) -> Composition {
    let counts = atoms.iter().map(|(symbol, n)| (Element::from_symbol(symbol).unwrap(), *n));
    Composition::from_counts(counts).unwrap()
}

/// The ways to write one charge.
fn charge_texts(charge: i32) -> Vec<String> {
    let (sign, raised_sign) = if charge > 0 { ('+', '⁺') } else { ('-', '⁻') };
    let size = charge.unsigned_abs();
    let raised = ['⁰', '¹', '²', '³', '⁴', '⁵'][size as usize];
    let mut texts = vec![
        format!("{sign}{size}"),
        format!("^{size}{sign}"),
        format!("^{sign}{size}"),
        format!("{raised}{raised_sign}"),
    ];
    if size > 1 {
        texts.push(sign.to_string().repeat(size as usize));
    }
    texts
}

proptest! {
    #![proptest_config(config())]

    #[test]
    fn a_formula_holds_the_atoms_it_was_made_of_and_reads_back((text, atoms) in drawn_formula()) {
        let formula = Formula::parse(&text).unwrap();
        prop_assert_eq!(formula.composition(), &composition(&atoms));
        prop_assert_eq!(formula.charge(), 0);
        let again = Formula::parse(&formula.to_string()).unwrap();
        prop_assert_eq!(&again, &formula);
        prop_assert_eq!(&Formula::parse_record(&formula.reference_name()).unwrap(), &formula);
        let by_composition = Formula::parse(&formula.composition().to_string()).unwrap();
        prop_assert_eq!(by_composition.composition(), formula.composition());
    }

    #[test]
    fn all_ways_to_write_a_charge_agree((text, atoms) in drawn_formula(), charge in prop_oneof![-5..0_i32, 1..6_i32]) {
        let formulas: Vec<Formula> =
            charge_texts(charge).iter().map(|c| Formula::parse(&format!("{text}{c}")).unwrap()).collect();
        for formula in &formulas {
            prop_assert_eq!(formula, &formulas[0]);
            prop_assert_eq!((formula.composition(), formula.charge()), (&composition(&atoms), charge));
            prop_assert_eq!(&Formula::parse(&formula.to_string()).unwrap(), formula);
            prop_assert_eq!(&Formula::parse_record(&formula.reference_name()).unwrap(), formula);
        }
    }

    #[test]
    fn a_bare_sign_is_one_charge_or_refused_with_two_readings_that_differ((text, atoms) in drawn_formula(), plus: bool) {
        let sign = if plus { 1 } else { -1 };
        match Formula::parse(&format!("{text}{}", if plus { '+' } else { '-' })) {
            Ok(formula) => prop_assert_eq!((formula.composition(), formula.charge()), (&composition(&atoms), sign)),
            Err(FormulaError::UnclearCharge { readings, .. }) => {
                let first = Formula::parse(&readings[0].1).unwrap();
                let second = Formula::parse(&readings[1].1).unwrap();
                prop_assert_eq!((first.composition(), first.charge()), (&composition(&atoms), sign));
                prop_assert!(second.charge() * sign > 1);
                prop_assert_ne!(second.composition(), first.composition());
            }
            Err(other) => prop_assert!(false, "{}", other),
        }
    }

    #[test]
    fn no_text_makes_a_reader_panic(text in "[A-Za-z0-9()\\[\\].,/^+\\-=<>*· ½₂²⁺⁻→−'\"]{0,40}", any_text in ".{0,40}") {
        for text in [text, any_text] {
            let with_arrow = format!("{text} -> {text}");
            let faults = [
                Formula::parse(&text).err().map(Fault::from),
                Formula::parse_record(&text).err().map(Fault::from),
                text.parse::<SpeciesName>().err().map(Fault::from),
                EquationText::parse(&text).err().map(Fault::from),
                Equation::parse(&with_arrow, &find).err(),
                balance(&with_arrow, &Party::from_formula).err(),
            ];
            for fault in faults.into_iter().flatten() {
                prop_assert!(!fault.message().is_empty() && !fault.hint().is_empty() && !fault.code().is_empty());
            }
        }
    }

    #[test]
    fn a_species_name_reads_back(text in "[A-Za-z][A-Za-z0-9,\\- ]{0,20}(\\((g|l|cr|gl|aq|s)(,[a-z\\-.]{1,9})?\\))?") {
        let name: SpeciesName = text.parse().unwrap();
        prop_assert_eq!(&name.to_string().parse::<SpeciesName>().unwrap(), &name);
        prop_assert_eq!(name.phase.is_some(), text.ends_with(')'));
    }
}

/// Elements by number, with atoms of each; and a charge.
type DrawnParty = (Vec<(usize, i32)>, i32);

/// Both sides of an equation with few elements for many species, so that all kinds of answers come up.
fn drawn_sides() -> impl Strategy<Value = (Vec<DrawnParty>, Vec<DrawnParty>)> {
    (1..5_usize).prop_flat_map(|elements| {
        let atoms = proptest::collection::vec((0..elements, 1..5_i32), 1..5);
        let party = (atoms, prop_oneof![4 => Just(0), 1 => -3..4_i32]);
        let side = proptest::collection::vec(party, 1..4);
        (side.clone(), side)
    })
}

const SIX: [&str; 6] = ["H", "C", "N", "O", "S", "Fe"];

fn parties(drawn: &[DrawnParty], prefix: &str) -> Vec<Party> {
    let party = |(at, (atoms, charge)): (usize, &DrawnParty)| {
        let atoms: Vec<_> = atoms.iter().map(|&(e, n)| (SIX[e], Rational::from(n))).collect();
        Party { name: format!("{prefix}{at}"), composition: composition(&atoms), charge: *charge }
    };
    drawn.iter().enumerate().map(party).collect()
}

/// Amounts of the six elements and charge, as whole numbers.
fn amounts(party: &Party) -> Vec<i128> {
    let elements = SIX.map(|symbol| Element::from_symbol(symbol).unwrap());
    let counts = elements.iter().map(|&e| i128::from(party.composition.count(e).numerator()));
    counts.chain([i128::from(party.charge)]).collect()
}

/// Rank of the system of both sides, modulo a prime. Its minors are far below the prime, so the rank is exact.
fn rank(all: &[Party]) -> usize {
    const P: i128 = 1_000_000_000_039;
    let reduced = |party: &Party| amounts(party).iter().map(|x| x.rem_euclid(P)).collect();
    let mut rows: Vec<Vec<i128>> = all.iter().map(reduced).collect();
    let inverse = |x: i128| {
        let (mut result, mut base, mut exponent) = (1, x, P - 2);
        while exponent > 0 {
            if exponent % 2 == 1 {
                result = result * base % P;
            }
            base = base * base % P;
            exponent /= 2;
        }
        result
    };
    let mut rank = 0;
    for column in 0..7 {
        let Some(pivot) = (rank..rows.len()).find(|&r| rows[r][column] != 0) else { continue };
        rows.swap(rank, pivot);
        let pivot_row = rows[rank].clone();
        for row in &mut rows[rank + 1..] {
            let factor = row[column] * inverse(pivot_row[column]) % P;
            row.iter_mut().zip(&pivot_row).for_each(|(x, p)| *x = (*x - factor * p).rem_euclid(P));
        }
        rank += 1;
    }
    rank
}

fn conserves(balanced: &Balanced, all: &[Party]) -> bool {
    let total = |side: &[(i64, String)]| {
        let mut sum = vec![0_i128; 7];
        for (n, name) in side {
            let party = all.iter().find(|party| &party.name == name).unwrap();
            sum.iter_mut().zip(amounts(party)).for_each(|(sum, amount)| *sum += i128::from(*n) * amount);
        }
        sum
    };
    total(&balanced.left) == total(&balanced.right)
}

fn coefficients(balanced: &Balanced) -> BTreeMap<String, i64> {
    balanced.left.iter().chain(&balanced.right).map(|(n, name)| (name.clone(), *n)).collect()
}

fn coprime(numbers: &BTreeMap<String, i64>) -> bool {
    let least = *numbers.values().min().unwrap();
    (2..=least.min(1000)).all(|d| numbers.values().any(|n| n % d != 0))
}

/// A compound of the first elements, and molecules of each of them: always one balance.
fn drawn_decomposition() -> impl Strategy<Value = (Party, Vec<Party>)> {
    let counts = proptest::collection::vec((1..60_i32, 1..5_i32), 1..6);
    counts.prop_map(|counts| {
        let atoms: Vec<_> = counts.iter().zip(SIX).map(|(&(n, _), e)| (e, Rational::from(n))).collect();
        let compound = Party { name: "whole".into(), composition: composition(&atoms), charge: 0 };
        let parts = counts.iter().zip(SIX).map(|(&(_, size), e)| Party {
            name: format!("{e}{size}"),
            composition: composition(&[(e, Rational::from(size))]),
            charge: 0,
        });
        (compound, parts.collect())
    })
}

proptest! {
    #![proptest_config(config())]

    #[test]
    fn whatever_balancing_answers_is_true((left, right) in drawn_sides()) {
        let (left, right) = (parties(&left, "L"), parties(&right, "R"));
        let all = [left.clone(), right.clone()].concat();
        let free = all.len() - rank(&all);
        match solve(&left, &right) {
            Ok(balanced) => {
                prop_assert_eq!(free, 1);
                prop_assert!(conserves(&balanced, &all));
                prop_assert_eq!((balanced.left.len(), balanced.right.len()), (left.len(), right.len()));
                let numbers = coefficients(&balanced);
                prop_assert!(numbers.values().all(|&n| n > 0) && coprime(&numbers));
            }
            Err(BalanceError::WrongSide { otherwise, names }) => {
                prop_assert_eq!(free, 1);
                prop_assert!(conserves(&otherwise, &all) && 2 * names.len() <= all.len());
            }
            Err(BalanceError::TakesNoPart { .. }) => prop_assert_eq!(free, 1),
            Err(BalanceError::Several { reactions }) => {
                prop_assert_eq!(reactions.len(), free);
                prop_assert!(reactions.iter().all(|reaction| conserves(reaction, &all)));
            }
            Err(BalanceError::OneSided { elements, side }) => {
                let (here, there) = if side == "left" { (&left, &right) } else { (&right, &left) };
                for element in elements {
                    let held = |side: &[Party]| side.iter().any(|party| !party.composition.count(element).is_zero());
                    prop_assert!(held(here) && !held(there));
                }
            }
            Err(BalanceError::Obstructed { obstacles }) => {
                prop_assert_eq!(free, 0);
                for obstacle in obstacles {
                    prop_assert_ne!(obstacle.left, obstacle.right);
                    prop_assert!(!conserves(&obstacle.otherwise, &all));
                }
            }
            Err(BalanceError::Contradiction { .. }) => prop_assert_eq!(free, 0),
            Err(error) => prop_assert!(false, "{}", error),
        }
    }

    #[test]
    fn a_decomposition_has_the_coefficients_that_division_gives((compound, parts) in drawn_decomposition()) {
        let balanced = solve(std::slice::from_ref(&compound), &parts).unwrap();
        let numbers = coefficients(&balanced);
        for part in &parts {
            let (element, size) = part.composition.iter().next().unwrap();
            let number = |name: &str| Rational::new(numbers[name], 1).unwrap();
            let atoms = number("whole").checked_mul(compound.composition.count(element)).unwrap();
            prop_assert_eq!(atoms, number(&part.name).checked_mul(size).unwrap());
        }
        prop_assert!(coprime(&numbers));
    }

    #[test]
    fn a_formula_unit_k_times_as_large_needs_k_times_fewer((compound, parts) in drawn_decomposition(), k in 2..9_i32) {
        let before = coefficients(&solve(std::slice::from_ref(&compound), &parts).unwrap());
        let mut larger = Composition::default();
        larger.add_times(&compound.composition, Rational::from(k)).unwrap();
        let larger = Party { composition: larger, ..compound };
        let after = coefficients(&solve(&[larger], &parts).unwrap());
        for part in &parts {
            let cross = i128::from(after[&part.name]) * i128::from(before["whole"]);
            prop_assert_eq!(cross, i128::from(before[&part.name]) * i128::from(after["whole"]) * i128::from(k));
        }
    }

    #[test]
    fn the_order_of_species_does_not_matter((compound, mut parts) in drawn_decomposition()) {
        let before = coefficients(&solve(std::slice::from_ref(&compound), &parts).unwrap());
        parts.reverse();
        prop_assert_eq!(coefficients(&solve(&parts, &[compound]).unwrap()), before);
    }

    #[test]
    fn a_balanced_equation_stays_one_when_scaled_and_is_refused_when_one_number_changes(
        (compound, parts) in drawn_decomposition(), over in 1..30_i64, under in 1..30_i64, changed in 0..6_usize,
    ) {
        let named = |party: Party| Party { name: format!("{}(g)", party.composition), ..party };
        let parts: Vec<Party> = parts.into_iter().map(named).collect();
        let compound = named(compound);
        prop_assume!(parts.iter().all(|part| part.name != compound.name));
        let balanced = solve(&[compound], &parts).unwrap();
        let plain = Equation::parse(&balanced.to_string(), &find).unwrap();
        let plain_again = Equation::parse(&plain.to_string(), &find).unwrap();
        prop_assert_eq!(plain_again.terms(), plain.terms());

        let factor = Rational::new(over, under).unwrap();
        let written = |side: &[(i64, String)], change: Option<usize>| {
            let terms = side.iter().enumerate().map(|(at, (n, name))| {
                let n = Rational::new(*n, 1).unwrap().checked_mul(factor).unwrap();
                let n = if change == Some(at) { n.checked_add(factor).unwrap() } else { n };
                format!("{n} {name}")
            });
            terms.collect::<Vec<_>>().join(" + ")
        };
        let text = format!("{} -> {}", written(&balanced.left, None), written(&balanced.right, None));
        let scaled = Equation::parse(&text, &find).unwrap();
        for ((species, nu), (same, scaled_nu)) in plain.terms().iter().zip(scaled.terms()) {
            prop_assert_eq!(species, same);
            prop_assert_eq!(nu.checked_mul(factor).unwrap(), *scaled_nu);
        }
        prop_assert_eq!(scaled.delta_n_gas(), plain.delta_n_gas().checked_mul(factor).unwrap());
        let scaled_again = Equation::parse(&scaled.to_string(), &find).unwrap();
        prop_assert_eq!(scaled_again.terms(), scaled.terms());

        let change = Some(changed % parts.len());
        let wrong = format!("{} -> {}", written(&balanced.left, None), written(&balanced.right, change));
        let fault = Equation::parse(&wrong, &find).unwrap_err();
        prop_assert_eq!(fault.code(), "unbalanced-element");
        let offered = fault.hint().strip_prefix("balanced it reads ").unwrap().to_owned();
        let offered = Equation::parse(&offered, &find).unwrap();
        prop_assert_eq!(offered.terms(), plain.terms());
    }
}

#[test]
fn each_kind_of_fault_has_a_code_of_its_own_and_a_hint() {
    let texts = [
        "H2O",
        "Xx(g) -> O2(g)",
        "Ca2+(aq) -> O2(g)",
        "CH1.8O0.5(cr) -> O2(g)",
        "C02(g) -> O2(g)",
        "C(OH(g) -> O2(g)",
        "x(g) -> O2(g)",
        "O2(gas) -> O2(g)",
        "O2(g) O2(g) -> O3(g)",
        "O2 -> O3(g)",
        "O2(g) -> O3(g)",
        "Ag+(aq) -> Ag(cr)",
        "H2+ O2 -> O3(g)",
        "O2-->O3(g)",
        "O2(g) -> O2(g)",
        "O2(g) <- O3(g)",
        "0 O2(g) -> O3(g)",
        "2 -> O3(g)",
        "1 1/2 O2(g) -> O3(g)",
        "A - B -> O3(g)",
        "-> O3(g)",
        "O2(g) + -> O3(g)",
        "O2(g) -> O3(g) -> O4(g)",
        "(g) -> O3(g)",
        "1/0 O2(g) -> O3(g)",
    ];
    let mut codes: Vec<&str> = Vec::new();
    for text in texts {
        let fault = Equation::parse(text, &find).expect_err(text);
        assert!(!fault.hint().is_empty());
        codes.push(fault.code());
    }
    codes.sort_unstable();
    codes.dedup();
    assert_eq!(codes.len(), texts.len(), "{codes:?}");
    assert_eq!(Formula::parse("").unwrap_err().code(), "empty-formula");
}
