//! Pressure: state functions along four routes, and the relations of Maxwell, for gases with B(T), liquids and crystals.
//!
//! A leg is a quadrature of Cp and of V and its slope; the ends are closed forms. The two share B(T), V₀, α and κ, and nothing
//! of how they are put together.

use proptest::prelude::*;

use crate::functions::{ROUNDING, scales};
use crate::{check, integral, near};
use hessbook::data::catalog::Catalog;
use hessbook::data::function::Function;
use hessbook::data::pressure::Constants;
use hessbook::model::function::evaluate;
use hessbook::model::pressure::{Condensed, Matter, departure, volume};
use hessbook::model::property::Property;
use hessbook::model::virial;
use hessbook::num::math::{exp, ln};
use hessbook::units::constants::STANDARD_PRESSURE;

const R: f64 = 8.314_462_618_153_24;

/// A phase, with the range of T in which it is tried and the highest pressure.
struct Phase {
    id: &'static str,
    function: std::sync::Arc<Function>,
    constants: Constants,
    t: (f64, f64),
    p_max: f64,
}

fn phases() -> Vec<Phase> {
    // Ranges within one interval of the function and within the fit of B; gases as dense as the virial route allows.
    let tried = [
        ("CO2(g)", (300.0, 900.0), 1.5e6),
        ("H2(g)", (220.0, 390.0), 1e7),
        ("CH4(g)", (220.0, 590.0), 3e6),
        ("H2O(g)", (400.0, 990.0), 4e5),
        ("SF6(g)", (320.0, 900.0), 1e6),
        ("H2O(l)", (275.0, 372.0), 1e8),
        ("methanol(l)", (200.0, 380.0), 1e8),
        ("Cu(cr)", (210.0, 900.0), 1e9),
        ("CaCO3(cr,calcite)", (300.0, 495.0), 1e9),
    ];
    let catalog = Catalog::shipped();
    let phase = |(id, t, p_max): (&'static str, (f64, f64), f64)| {
        let substance = catalog.find(id).unwrap();
        let function = substance.function.clone().unwrap();
        Phase { id, function, constants: substance.pressure.clone(), t, p_max }
    };
    tried.map(phase).into()
}

impl Phase {
    fn matter(&self, t: f64) -> Matter {
        match &self.constants.volume {
            Some(record) => Matter::Condensed(Condensed::of(record)),
            None => Matter::Virial(virial::second(&self.constants, t, R).unwrap().at_t),
        }
    }

    /// H, S and G from the closed forms.
    fn state(&self, t: f64, p: f64) -> [f64; 3] {
        let (standard, matter) = (evaluate(&self.function, t), self.matter(t));
        let of = |property| departure(property, &matter, t, p, R).si;
        [standard.h + of(Property::H), standard.s + of(Property::S), standard.g(t) + of(Property::G)]
    }

    /// What rounding of the function's terms leaves unsure of H, S and G.
    fn rounding(&self, t: f64) -> [f64; 3] {
        let interval = self.function.intervals.iter().find(|i| i.t_min <= t && t <= i.t_max).unwrap();
        let (_, h, s) = scales(&self.function, interval, t);
        [ROUNDING * h, ROUNDING * s, ROUNDING * (h + t * s)]
    }

    fn cp(&self, t: f64, p: f64) -> f64 {
        evaluate(&self.function, t).cp + departure(Property::Cp, &self.matter(t), t, p, R).si
    }

    fn v(&self, t: f64, p: f64) -> f64 {
        volume(&self.matter(t), t, p, R)
    }

    /// (∂V/∂T)p
    fn v_t(&self, t: f64, p: f64) -> f64 {
        match self.matter(t) {
            Matter::Virial(b) => R / p + b[1],
            Matter::Condensed(c) => c.v0 * c.alpha,
            other => panic!("{}: {other:?}", self.id),
        }
    }

    /// Change of H, S and G along the straight line in T and ln p from one state to another.
    fn leg(&self, (t1, p1): (f64, f64), (t2, p2): (f64, f64)) -> [f64; 3] {
        let at = |x: f64| (t1 + x * (t2 - t1), exp(ln(p1) + x * ln(p2 / p1)));
        let (dt, dlnp) = (t2 - t1, ln(p2 / p1));
        let h = |x: f64| {
            let (t, p) = at(x);
            self.cp(t, p) * dt + (self.v(t, p) - t * self.v_t(t, p)) * p * dlnp
        };
        let s = |x: f64| {
            let (t, p) = at(x);
            self.cp(t, p) / t * dt - self.v_t(t, p) * p * dlnp
        };
        let s_1 = self.state(t1, p1)[1];
        let (dh, ds) = (integral(h, 0.0, 1.0).value, integral(s, 0.0, 1.0).value);
        [dh, ds, dh - t2 * ds - (t2 - t1) * s_1]
    }
}

/// Shares of the ranges: two temperatures, two pressures.
fn states() -> impl Strategy<Value = (f64, f64, f64, f64)> {
    (0.0..0.3, 0.7..1.0, 0.0..1.0, 0.0..1.0)
}

#[test]
fn four_routes_between_two_states_agree() {
    let phases = phases();
    check(12, &states(), |(a, b, c, d): (f64, f64, f64, f64)| {
        for phase in &phases {
            let t = |x: f64| phase.t.0 + x * (phase.t.1 - phase.t.0);
            let p = |x: f64| exp(ln(1e4) + x * ln(phase.p_max / 1e4));
            let (start, end) = ((t(a), p(c)), (t(b), p(d)));
            let (before, after) = (phase.state(start.0, start.1), phase.state(end.0, end.1));
            let standard = STANDARD_PRESSURE.value;
            let routes: [Vec<(f64, f64)>; 4] = [
                vec![start, (end.0, start.1), end],
                vec![start, (start.0, end.1), end],
                vec![start, (start.0, standard), (end.0, standard), end],
                vec![start, end],
            ];
            for (nth, route) in routes.iter().enumerate() {
                let legs: Vec<[f64; 3]> = route.windows(2).map(|pair| phase.leg(pair[0], pair[1])).collect();
                for (what, name) in ["H", "S", "G"].into_iter().enumerate() {
                    let sum: f64 = legs.iter().map(|leg| leg[what]).sum();
                    let size = legs.iter().map(|leg| leg[what].abs()).fold(0.0, f64::max);
                    // Beside 1e-10 of the largest leg, the function's own terms limit what a difference can show: those of
                    // liquid water reach 1e9 J/mol and cancel, which leaves some 1e-9 of a leg; of all others far less than 1e-10.
                    let allowed = 1e-10 * size + phase.rounding(start.0)[what] + phase.rounding(end.0)[what];
                    let name = format!("{name} of {} by route {nth}, {start:?} to {end:?}", phase.id);
                    near(&name, sum, after[what] - before[what], allowed)?;
                }
            }
        }
        Ok(())
    });
}

#[test]
fn the_relations_of_maxwell_hold() {
    let phases = phases();
    check(20, &(0.05..0.95, 0.1..0.95), |(a, b): (f64, f64)| {
        for phase in &phases {
            let (t, p) = (phase.t.0 + a * (phase.t.1 - phase.t.0), exp(ln(1e4) + b * ln(phase.p_max / 1e4)));
            let (ht, hp) = (1e-4 * t, 1e-3 * p);
            // Two steps, h and h/2, give a slope to fourth order and the size of what is left.
            let slope = |f: &dyn Fn(f64) -> f64, h: f64| {
                let wide = (f(h) - f(-h)) / (2.0 * h);
                let narrow = (f(0.5 * h) - f(-0.5 * h)) / h;
                ((4.0 * narrow - wide) / 3.0, (narrow - wide).abs())
            };
            let of = |property: Property, t: f64, p: f64| departure(property, &phase.matter(t), t, p, R).si;
            let name = |what: &str| format!("{what} of {} at {t} K and {p} Pa", phase.id);
            let rounding = |size: f64, h: f64| 64.0 * f64::EPSILON * size / h;
            let (s_p, left) = slope(&|x| of(Property::S, t, p + x), hp);
            near(&name("(∂S/∂p)T"), s_p, -phase.v_t(t, p), left + rounding(of(Property::S, t, p).abs() + R, hp))?;
            let (g_p, left) = slope(&|x| of(Property::G, t, p + x), hp);
            near(&name("(∂G/∂p)T"), g_p, phase.v(t, p), left + rounding(of(Property::G, t, p).abs() + R * t, hp))?;
            let (g_t, left) = slope(&|x| of(Property::G, t + x, p), ht);
            near(
                &name("(∂G/∂T)p"),
                g_t,
                -of(Property::S, t, p),
                left + rounding(of(Property::G, t, p).abs() + R * t, ht),
            )?;
            let (h_p, left) = slope(&|x| of(Property::H, t, p + x), hp);
            let joule = phase.v(t, p) - t * phase.v_t(t, p);
            near(&name("(∂H/∂p)T"), h_p, joule, left + rounding(of(Property::H, t, p).abs() + R * t, hp))?;
            let (h_t, left) = slope(&|x| of(Property::H, t + x, p), ht);
            let allowed = left + rounding(of(Property::H, t, p).abs() + R * t, ht);
            near(&name("(∂H/∂T)p"), h_t, of(Property::Cp, t, p), allowed)?;
            let (v_t, left) = slope(&|x| phase.v(t + x, p), ht);
            near(&name("(∂V/∂T)p"), v_t, phase.v_t(t, p), left + rounding(phase.v(t, p), ht))?;
        }
        Ok(())
    });
}
