//! Fits of measured heat capacities: what they give, and that their uncertainty is that of fits to other draws of the rows.
//!
//! The rows are invented: Cp = 180 + 72 (T/298.15 K) - 9 (T/298.15 K)² J/(mol K), with scatter where a test says so.

use std::cell::Cell;
use std::collections::BTreeMap;
use std::rc::Rc;

use hessbook::fault::Fault;
use hessbook::model::card::{self, Card, Cx, References, Value};
use hessbook::model::fit_card::{FIT_HEAT_CAPACITY, INTERPOLATE_HEAT_CAPACITY};
use hessbook::model::property_card::{SUBSTANCE_ENTROPY, SUBSTANCE_HEAT_CAPACITY};
use hessbook::model::substance::ENTHALPY_INCREMENT;
use hessbook::num::random::Generator;
use hessbook::quantity::{Quantity, text};
use hessbook::units::constants;

fn truth(t_k: f64) -> f64 {
    let x = t_k / 298.15;
    180.0 + 72.0 * x - 9.0 * x * x
}

/// Thirteen temperatures, and u growing from 0.4 to 1.6 J/(mol K).
fn rows() -> Vec<(f64, f64)> {
    (0..13).map(|n| (283.15 + 10.0 * f64::from(n), 0.4 + 0.1 * f64::from(n))).collect()
}

thread_local! {
    // Inputs are told apart by the count, so a test has one.
    static DESK: (References, Cell<u64>) = (References::new(constants::current()), Cell::new(0));
}

fn at_desk<T>(work: impl FnOnce(&Cx) -> T) -> T {
    DESK.with(|(references, ordinal)| work(&Cx { references, place: None, ordinal, halted: &|| None }))
}

fn quantity(written: &str) -> Value {
    Value::Quantity(at_desk(|cx| text::parse(written, None, cx.next_ordinal())).unwrap())
}

/// A map of two lists; `u` says whether rows state their uncertainty.
fn table(measured: &[(f64, f64, f64)], u: bool) -> Value {
    let t = measured.iter().map(|row| quantity(&format!("{} K", row.0))).collect();
    let cp = measured.iter().map(|(_, cp, of_row)| {
        let half = if u { format!(" ± {of_row:.6} J/(mol K), k=1") } else { " J/(mol K)".to_owned() };
        quantity(&format!("{cp:.9}{half}"))
    });
    let map = BTreeMap::from([("T".to_owned(), Value::List(t)), ("Cp".to_owned(), Value::List(cp.collect()))]);
    Value::Options(Rc::new(map))
}

fn terms(exponents: &[f64]) -> Value {
    Value::List(exponents.iter().map(|one| Value::Number(*one)).collect())
}

fn options(all: &[(&str, &str)]) -> Value {
    Value::Options(Rc::new(all.iter().map(|(name, text)| ((*name).to_owned(), Value::Text((*text).into()))).collect()))
}

fn exact() -> Vec<(f64, f64, f64)> {
    rows().into_iter().map(|(t, u)| (t, truth(t), u)).collect()
}

fn asked(card: &'static Card, of: &Value, t: &str, more: Option<Value>) -> Result<Quantity, Fault> {
    at_desk(|cx| {
        let given = [of.clone(), Value::Text(t.into())].into_iter().chain(more).collect();
        match card::call(cx, card, given)? {
            Value::Quantity(quantity) => Ok(quantity),
            _ => unreachable!("a property is a quantity"),
        }
    })
}

fn fitted(of: Value, exponents: &[f64], more: &[(&str, &str)]) -> Result<Value, Fault> {
    at_desk(|cx| card::call(cx, &FIT_HEAT_CAPACITY, vec![of, terms(exponents), options(more)]))
}

fn interpolated(of: Value) -> Value {
    at_desk(|cx| card::call(cx, &INTERPOLATE_HEAT_CAPACITY, vec![of])).unwrap()
}

#[test]
fn a_fit_gives_back_what_its_rows_were_made_of() {
    let fit = fitted(table(&exact(), true), &[0.0, 1.0, 2.0], &[("entropy", "300 J/(mol K)")]).unwrap();
    let t_k: f64 = 371.0;
    let (x, one) = (t_k / 298.15, 298.15);
    let h = one * (180.0 * (x - 1.0) + 36.0 * (x * x - 1.0) - 3.0 * (x * x * x - 1.0));
    let s = 300.0 + 180.0 * hessbook::num::math::ln(x) + 72.0 * (x - 1.0) - 4.5 * (x * x - 1.0);
    // Bound: rows written to nine decimals, carried by weights that add up to a few hundred K.
    let close = |card, t: &str, want: f64| {
        let got = asked(card, &fit, t, None).unwrap().si();
        assert!((got - want).abs() < 1e-5, "{got} {want}");
    };
    close(&SUBSTANCE_HEAT_CAPACITY, "371 K", truth(t_k));
    close(&ENTHALPY_INCREMENT, "371 K", h);
    close(&SUBSTANCE_ENTROPY, "371 K", s);
}

/// Standard deviation of the increment over fits to rows drawn anew, and u as one fit states it.
fn by_draws(
    draws: usize,
    stated: bool,
    ask: impl Fn(&Value) -> Quantity,
    of_rows: impl Fn(Value) -> Value,
) -> (f64, f64) {
    let mut random = Generator::new(20_261_201);
    let (mut sum, mut squares, mut u_sum) = (0.0, 0.0, 0.0);
    let u_one = ask(&of_rows(table(&exact(), true))).spread().u().unwrap();
    let middle = ask(&of_rows(table(&exact(), true))).si();
    for _ in 0..draws {
        let drawn: Vec<_> = rows()
            .into_iter()
            .map(|(t, u)| {
                let u = if stated { u } else { 0.8 };
                (t, truth(t) + u * random.normal(), u)
            })
            .collect();
        let value = ask(&of_rows(table(&drawn, stated)));
        sum += value.si() - middle;
        squares += (value.si() - middle) * (value.si() - middle);
        let u = value.spread().u().unwrap();
        u_sum += u * u;
    }
    let n = draws as f64;
    let spread = ((squares - sum * sum / n) / (n - 1.0)).sqrt();
    (spread, if stated { u_one } else { (u_sum / n).sqrt() })
}

#[test]
fn figures_per_mole_of_something_named_are_answered_per_mole_of_it() {
    let list = |texts: [&str; 3]| Value::List(texts.map(|text| Value::Text(text.into())).to_vec());
    let named = |cp: [&str; 3]| {
        let map = [("T", list(["290 K", "300 K", "310 K"])), ("Cp", list(cp))];
        fitted(Value::Options(Rc::new(map.map(|(name, list)| (name.to_owned(), list)).into())), &[0.0], &[])
    };
    let fit = named(["75.1(2) J/(mol[larkol] K)", "75.4(2) J/(mol[larkol] K)", "75.2(2) J/(mol[larkol] K)"]).unwrap();
    let increment = asked(&ENTHALPY_INCREMENT, &fit, "305 K", None).unwrap();
    let unit = hessbook::units::parse::unit("kJ/mol[larkol]").unwrap();
    assert_eq!(*increment.dim(), unit.dim, "{}", increment.dim());
    let mixed = named(["75.1(2) J/(mol[larkol] K)", "75.4(2) J/(mol[H2O] K)", "75.2(2) J/(mol[larkol] K)"]);
    assert_eq!(mixed.err().map(|fault| fault.code()), Some("fit-unit"));
}

#[test]
fn u_of_an_integral_over_a_fit_agrees_with_draws_within_five_per_cent() {
    // 2000 draws, seed in `by_draws`: the standard deviation itself is known to 1.6 %, so 5 % is three of its own u.
    let increment = |fit: &Value| asked(&ENTHALPY_INCREMENT, fit, "400 K", None).unwrap();
    let entropy = |fit: &Value| asked(&SUBSTANCE_ENTROPY, fit, "285 K", None).unwrap();
    let full =
        |of: Value| fitted(of, &[0.0, 1.0, -2.0], &[("entropy", "300.0 J/(mol K) ± 1e-9 J/(mol K), k=1")]).unwrap();
    for (what, (drawn, stated)) in [
        ("increment", by_draws(2000, true, increment, full)),
        ("entropy", by_draws(2000, true, entropy, full)),
        ("increment, u from the scatter", by_draws(2000, false, increment, full)),
    ] {
        assert!((drawn / stated - 1.0).abs() < 0.05, "{what}: {drawn} by draws, {stated} stated");
    }
}

#[test]
fn the_correlation_of_the_coefficients_is_carried() {
    // By a second route: u² = gᵀ C g with the coefficients' covariance C of an independent normal-equation solution.
    let exponents = [0.0, 1.0];
    let fit = fitted(table(&exact(), true), &exponents, &[]).unwrap();
    let stated = asked(&ENTHALPY_INCREMENT, &fit, "400 K", None).unwrap().spread().u().unwrap();
    let x = |t: f64| t / 298.15;
    let (mut a, mut b, mut c) = (0.0, 0.0, 0.0);
    for (t, u) in rows() {
        let w = 1.0 / (u * u);
        a += w;
        b += w * x(t);
        c += w * x(t) * x(t);
    }
    let determinant = a * c - b * b;
    let g = [400.0 - 298.15, 298.15 * (x(400.0) * x(400.0) - 1.0) / 2.0];
    let variance = (g[0] * g[0] * c - 2.0 * g[0] * g[1] * b + g[1] * g[1] * a) / determinant;
    // Bound: the determinant loses four digits.
    assert!((stated - variance.sqrt()).abs() < 1e-8 * stated, "{stated} {}", variance.sqrt());
    let alone = ((g[0] * g[0] * c + g[1] * g[1] * a) / determinant).sqrt();
    assert!(alone > 5.0 * stated, "without the correlation u would be {alone}");
}

#[test]
fn u_of_an_integral_over_an_interpolation_agrees_with_draws() {
    let increment = |fit: &Value| asked(&ENTHALPY_INCREMENT, fit, "400 K", None).unwrap();
    let (drawn, stated) = by_draws(2000, true, increment, interpolated);
    // Besides 1.6 % of the draws: slopes are not linear in the rows where neighbours nearly agree.
    assert!((drawn / stated - 1.0).abs() < 0.05, "{drawn} by draws, {stated} stated");
}

#[test]
fn a_fit_is_not_carried_beyond_its_rows_unless_asked() {
    let ask = |more: &[(&str, &str)], t: &str| {
        asked(&SUBSTANCE_HEAT_CAPACITY, &fitted(table(&exact(), true), &[0.0, 1.0], more).unwrap(), t, None)
    };
    assert_eq!(ask(&[], "410 K").unwrap_err().code(), "temperature-out-of-range");
    assert!(ask(&[("extrapolate", "420 K")], "410 K").is_ok());
    assert_eq!(ask(&[("extrapolate", "420 K")], "430 K").unwrap_err().code(), "temperature-out-of-range");
}
