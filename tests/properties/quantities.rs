//! Arithmetic on quantities: identities that keep value and u, partials against differences, and print read back.

use std::cell::Cell;

use proptest::prelude::*;

use crate::{check, near};
use hessbook::num::math;
use hessbook::quantity::{Quantity, text};
use hessbook::record::spread::Spread;
use hessbook::units::parse as unit_parse;

thread_local! {
    static ORDINAL: Cell<u64> = const { Cell::new(0) };
}

/// A typed quantity that is no other one's input.
fn typed(value: f64, u: f64, unit: &str) -> Quantity {
    let ordinal = ORDINAL.replace(ORDINAL.get() + 1);
    let written = format!("({value} ± {u}) {unit}, k=1");
    text::parse(&written, None, ordinal).unwrap_or_else(|error| panic!("{written}: {error}"))
}

fn u_of(value: &Quantity) -> f64 {
    match value.spread() {
        Spread::Full(u) => u,
        other => panic!("{value:?} has {other:?}"),
    }
}

/// Sizes within so many powers of ten of 1, of both signs.
fn size(tens: i32) -> impl Strategy<Value = f64> {
    (1.0..10.0, -tens..tens, any::<bool>()).prop_map(|(mantissa, ten, negative): (f64, i32, bool)| {
        let value: f64 = format!("{mantissa}e{ten}").parse().unwrap();
        if negative { -value } else { value }
    })
}

/// A size and a standard uncertainty of 1e-5 to 0.1 of it.
fn uncertain() -> impl Strategy<Value = (f64, f64)> {
    (size(6), 1e-5..0.1).prop_map(|(value, relative): (f64, f64)| (value, value.abs() * relative))
}

const ROUNDING: f64 = 4.0 * f64::EPSILON;

#[test]
fn adding_back_what_was_taken_away_keeps_value_and_u() {
    check(1_000, &(uncertain(), uncertain()), |((a, u_a), (b, u_b))| {
        let (x, y) = (typed(a, u_a, "kJ/mol[H2O]"), typed(b, u_b, "kJ/mol[H2O]"));
        let back = x.minus(&y, None).unwrap().plus(&y, None).unwrap();
        near("value", back.si(), x.si(), ROUNDING * (x.si().abs() + y.si().abs()))?;
        near("u", u_of(&back), u_of(&x), ROUNDING * u_of(&x))?;
        prop_assert_eq!(back.sensitivities().len(), 1, "y is still an input");
        Ok(())
    });
}

#[test]
fn a_value_less_itself_is_exactly_nothing_however_it_was_made() {
    check(500, &(uncertain(), uncertain()), |((a, u_a), (b, u_b))| {
        let (x, y) = (typed(a, u_a, "J"), typed(b, u_b, "K"));
        for value in [x.clone(), x.times(&y, None).unwrap(), x.over(&y, None).unwrap(), x.scaled(0.1, None).unwrap()] {
            let nothing = value.minus(&value, None).unwrap();
            prop_assert_eq!((nothing.si(), nothing.spread()), (0.0, Spread::Full(0.0)));
        }
        Ok(())
    });
}

#[test]
fn dividing_by_what_was_multiplied_keeps_value_and_u() {
    check(1_000, &(uncertain(), uncertain()), |((a, u_a), (b, u_b))| {
        let (x, y) = (typed(a, u_a, "J"), typed(b, u_b, "mol"));
        let back = x.times(&y, None).unwrap().over(&y, None).unwrap();
        prop_assert_eq!(back.dim(), x.dim());
        near("value", back.si(), x.si(), ROUNDING * x.si().abs())?;
        // The derivative with respect to y is the difference of two numbers of the size of x/y.
        let left = ROUNDING * (x.si() / y.si()).abs() * u_of(&y);
        near("u", u_of(&back), u_of(&x), ROUNDING * u_of(&x) + left)
    });
}

#[test]
fn the_order_of_a_sum_changes_neither_value_nor_u() {
    let terms = proptest::collection::vec((uncertain(), any::<prop::sample::Index>()), 2..12);
    let strategy = terms.prop_flat_map(|terms| {
        let order: Vec<usize> = (0..terms.len()).collect();
        (Just(terms), Just(order).prop_shuffle())
    });
    check(300, &strategy, |(terms, order)| {
        let leaves: Vec<Quantity> = terms.iter().map(|((value, u), _)| typed(*value, *u, "Pa")).collect();
        // Each term is a leaf plus one that others may share, so that inputs are correlated.
        let term = |i: usize| leaves[i].plus(&leaves[terms[i].1.index(leaves.len())], None).unwrap();
        let sum = |order: &[usize]| {
            let mut terms = order.iter().map(|i| term(*i));
            let first = terms.next().unwrap();
            terms.fold(first, |sum, next| sum.plus(&next, None).unwrap())
        };
        let straight: Vec<usize> = (0..leaves.len()).collect();
        let (one, other) = (sum(&straight), sum(&order));
        let total: f64 = straight.iter().map(|i| term(*i).si().abs()).sum();
        near("value", one.si(), other.si(), ROUNDING * leaves.len() as f64 * 2.0 * total)?;
        near("u", u_of(&one), u_of(&other), ROUNDING * u_of(&one))?;
        // By hand: how often each leaf stands in the sum, times its u, in quadrature.
        let mut counts = vec![1.0; leaves.len()];
        terms.iter().for_each(|(_, shared)| counts[shared.index(leaves.len())] += 1.0);
        let variance: f64 = terms.iter().zip(&counts).map(|(((_, u), _), n)| n * u * n * u).sum();
        near("u by hand", u_of(&one), f64::sqrt(variance), ROUNDING * leaves.len() as f64 * u_of(&one))
    });
}

/// A result, and the same as a plain function of its one input.
type Case = (&'static str, Quantity, Box<dyn Fn(f64) -> f64>);

#[test]
fn partials_are_the_slopes_of_the_functions() {
    // Of pure numbers, by central differences of the elementary functions themselves. Bound: h² times a third derivative
    // is 1e-10 of the slope for a relative h of 1e-5, and rounding over 2 h is 1e-11.
    let strategy = (0.1..5.0, -3.0..3.0, 0.1..5.0);
    check(500, &strategy, |(x, exponent, y): (f64, f64, f64)| {
        let q = typed(x, 0.01, "1");
        let other = typed(y, 0.01, "1");
        let h = 1e-5 * x;
        let cases: Vec<Case> = vec![
            ("power", q.power(exponent, None).unwrap(), Box::new(move |x| math::pow(x, exponent))),
            ("exp", q.exp(None).unwrap(), Box::new(math::exp)),
            ("ln", q.ln(None).unwrap(), Box::new(math::ln)),
            ("reciprocal", q.reciprocal(y, None).unwrap(), Box::new(move |x| y / x)),
            ("negated absolute", q.negated(None).unwrap().absolute(None).unwrap(), Box::new(|x| x)),
            ("product", q.times(&other, None).unwrap(), Box::new(move |x| x * y)),
            ("quotient", other.over(&q, None).unwrap(), Box::new(move |x| y / x)),
            ("mean", Quantity::mean(&[q.clone(), other.clone()], None).unwrap(), Box::new(move |x| 0.5 * (x + y))),
            ("chain", q.exp(None).unwrap().shifted(1.0, None).unwrap().ln(None).unwrap(), {
                Box::new(|x| math::ln(math::exp(x) + 1.0))
            }),
        ];
        let key = &q.node().input().unwrap().key;
        for (name, value, of) in cases {
            near(name, value.si(), of(x), 8.0 * f64::EPSILON * (1.0 + of(x).abs()))?;
            let slope = (of(x + h) - of(x - h)) / (2.0 * h);
            let found = value.sensitivities().into_iter().find(|s| s.input().unwrap().key == *key);
            let partial = found.map_or(0.0, |s| s.derivative);
            let rounding = 4.0 * f64::EPSILON * of(x).abs() / h;
            near(&format!("slope of {name}"), partial, slope, 1e-9 * slope.abs() + rounding)?;
        }
        Ok(())
    });
}

const PRINTED_IN: [&str; 10] =
    ["kJ/mol[H2O]", "J/(K mol[rxn])", "kcal_th/mol[CH4]", "Btu_IT/lb", "degC", "1", "mg[feed]", "MPa", "cm^-1", "eV"];

#[test]
fn what_is_printed_reads_back_as_the_rounded_value_and_u() {
    let relative = (1e-7..3.0, any::<bool>());
    check(2_000, &(size(12), relative, 0..PRINTED_IN.len()), |(value, (relative, tiny), unit)| {
        let unit = PRINTED_IN[unit];
        let u = value.abs() * if tiny { relative * 1e-6 } else { relative };
        let value = if unit == "degC" { value.abs() } else { value };
        let made = typed(value, u, unit);
        let printed = text::shown_plain(&made);
        let again = text::parse(&printed, None, 0).unwrap_or_else(|error| panic!("{printed}: {error}"));
        prop_assert_eq!(again.dim(), made.dim());
        let factor = unit_parse::unit(unit).unwrap().factor;
        let u_again = u_of(&again) / factor;
        // Two digits of u: half a unit of the second one bounds both roundings. A u of 0.995 to 1 in its decade is printed
        // with one place less, as 10 of the place that then decides.
        let decade = format!("{u:e}").split_once('e').map(|(_, ten)| ten.parse::<i32>().unwrap()).unwrap();
        let place = |ten: i32| format!("1e{ten}").parse::<f64>().unwrap();
        let (digit, above) = (place(decade - 1), place(decade));
        let last = if u >= 9.95 * above * (1.0 - 1e-12) { above } else { digit };
        near(&format!("u of {printed}"), u_again, u, 0.5 * last * (1.0 + 1e-9))?;
        let rounding = 8.0 * f64::EPSILON * made.si().abs();
        near(&format!("value of {printed}"), again.si(), made.si(), (0.5 * last * (1.0 + 1e-9)) * factor + rounding)?;
        // Once rounded, always the same text.
        prop_assert_eq!(text::shown_plain(&again), printed);
        Ok(())
    });
}

#[test]
fn a_figure_without_u_is_printed_with_the_digits_it_was_typed_with() {
    let strategy = (-999_999i64..999_999, 0usize..6, 0..PRINTED_IN.len());
    check(1_000, &strategy, |(digits, decimals, unit)| {
        let unit = PRINTED_IN[unit];
        let digits = if unit == "degC" { digits.abs() } else { digits };
        let number = format!("{:0>1$}", digits.abs(), decimals + 1);
        let (whole, after) = number.split_at(number.len() - decimals);
        let sign = if digits < 0 { "-" } else { "" };
        let written = format!("{sign}{whole}{}{after} {unit}", if decimals > 0 { "." } else { "" });
        let made = text::parse(&written, None, 0).unwrap();
        let wanted = if digits == 0 { written.trim_start_matches('-').to_owned() } else { written.clone() };
        // The written unit stays; only its spelling may be the canonical one, which is a unit test of its own.
        let (printed_number, wanted_number) =
            (text::shown_plain(&made), wanted.split(' ').next().unwrap_or_default().to_owned());
        prop_assert_eq!(printed_number.split(' ').next().unwrap_or_default(), wanted_number);
        Ok(())
    });
}
