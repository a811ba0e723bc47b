//! What pressure does to a pure phase: all of it derived from one G(T, p), so that every path closes.
//!
//! gas        G(T, p) = G°(T) + R T ln(p/p°) + B p                     V = R T/p + B
//! condensed  G(T, p) = G°(T) + ∫V dp from p°,     V = V₀ [1 + α (T − T₀) − κ (p − p₀)]
//! S = −(∂G/∂T)p,   H = G + T S,   V = (∂G/∂p)T,   U = H − p V,   A = G − p V,   Cp = (∂H/∂T)p
//!
//! | symbol | unit   | meaning                                                   |
//! |--------|--------|-----------------------------------------------------------|
//! | B      | m³/mol | second virial coefficient, a function of T; 0: ideal gas  |
//! | V₀     | m³/mol | molar volume at T₀ and p₀                                 |
//! | α      | 1/K    | (1/V)(∂V/∂T)p, taken constant                             |
//! | κ      | 1/Pa   | −(1/V)(∂V/∂p)T, taken constant                            |
//! | p°     | Pa     | standard pressure, 1 bar                                  |
//!
//! G° is that of the standard state: for a gas the *ideal* gas at p°, so that a real gas at p° is not in it.
//! The surprise: a phase whose constants are not on record is left as it is at p°, and the register says which are missing.
//! Source: definitions; IUPAC Green Book, 3rd ed., section 2.11 (from memory).

use std::rc::Rc;
use std::sync::Arc;

use smallvec::SmallVec;

use crate::chem::species::State as Aggregate;
use crate::data::pressure::Volume;
use crate::data::substance::Substance;
use crate::fault::Fault;
use crate::model::given::Given;
use crate::model::property::Property;
use crate::model::virial;
use crate::num::math;
use crate::quantity::Quantity;
use crate::record::node::{Input, LeafKey, Node};
use crate::source::Citation;
use crate::units::constants::STANDARD_PRESSURE;
use crate::units::{Base, Dimension, Entity, Kind};

/// How a phase takes pressure.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Matter {
    IdealGas,
    /// B and its first three derivatives with respect to T.
    Virial(virial::Derivatives),
    Condensed(Condensed),
    /// Its volume is not known, or neglected: it stays as it is at p°.
    Untouched,
}

/// The constants of a condensed phase.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Condensed {
    pub v0: f64,
    pub alpha: f64,
    pub kappa: f64,
    pub t0_k: f64,
    pub p0_pa: f64,
}

impl Condensed {
    pub fn of(record: &Volume) -> Condensed {
        let Volume { v0, alpha, kappa, t0_k, p0_pa, .. } = *record;
        Condensed { v0, alpha, kappa, t0_k, p0_pa }
    }
}

/// X(T, p) − X°(T) per mole, with its partial derivatives. For U and A it includes −pV of the gas at p°, since the standard
/// values they are added to are H° and G°.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Departure {
    pub si: f64,
    pub by_t: f64,
    pub by_p: f64,
    pub by_r: f64,
    /// By B, dB/dT, d²B/dT²; or by V₀, α, κ.
    pub by_constants: [f64; 3],
}

/// Molar volume, m³/mol; 0 where it is not known.
pub fn volume(matter: &Matter, t_k: f64, p_pa: f64, r: f64) -> f64 {
    match matter {
        Matter::IdealGas => r * t_k / p_pa,
        Matter::Virial(b) => r * t_k / p_pa + b[0],
        Matter::Condensed(c) => c.v0 * (1.0 + c.alpha * (t_k - c.t0_k) - c.kappa * (p_pa - c.p0_pa)),
        Matter::Untouched => 0.0,
    }
}

/// The departure of a property from its standard value. For U it is that of H less pV, for A that of G less pV.
pub fn departure(property: Property, matter: &Matter, t_k: f64, p_pa: f64, r: f64) -> Departure {
    match matter {
        Matter::IdealGas => of_gas(property, [0.0; 4], t_k, p_pa, r),
        Matter::Virial(b) => of_gas(property, *b, t_k, p_pa, r),
        Matter::Condensed(c) => of_condensed(property, c, t_k, p_pa),
        Matter::Untouched => Departure::default(),
    }
}

fn of_gas(property: Property, [b, b1, b2, b3]: virial::Derivatives, t: f64, p: f64, r: f64) -> Departure {
    let ln_p = math::ln(p / STANDARD_PRESSURE.value);
    match property {
        Property::G | Property::K => Departure {
            si: r * t * ln_p + b * p,
            by_t: r * ln_p + b1 * p,
            by_p: r * t / p + b,
            by_r: t * ln_p,
            by_constants: [p, 0.0, 0.0],
        },
        Property::S => Departure {
            si: -r * ln_p - b1 * p,
            by_t: -b2 * p,
            by_p: -r / p - b1,
            by_r: -ln_p,
            by_constants: [0.0, -p, 0.0],
        },
        Property::H => Departure {
            si: (b - t * b1) * p,
            by_t: -t * b2 * p,
            by_p: b - t * b1,
            by_r: 0.0,
            by_constants: [p, -t * p, 0.0],
        },
        Property::Cp => Departure {
            si: -t * b2 * p,
            by_t: -(b2 + t * b3) * p,
            by_p: -t * b2,
            by_r: 0.0,
            by_constants: [0.0, 0.0, -t * p],
        },
        Property::U => Departure {
            si: -r * t - t * b1 * p,
            by_t: -r - (b1 + t * b2) * p,
            by_p: -t * b1,
            by_r: -t,
            by_constants: [0.0, -t * p, 0.0],
        },
        // B p cancels between G and pV.
        Property::A => Departure {
            si: r * t * (ln_p - 1.0),
            by_t: r * (ln_p - 1.0),
            by_p: r * t / p,
            by_r: t * (ln_p - 1.0),
            by_constants: [0.0; 3],
        },
    }
}

fn of_condensed(property: Property, c: &Condensed, t: f64, p: f64) -> Departure {
    let standard = STANDARD_PRESSURE.value;
    let (step, span) = (p - standard, t - c.t0_k);
    // ∫(p − p₀) dp from p°
    let squeezed = 0.5 * ((p - c.p0_pa) * (p - c.p0_pa) - (standard - c.p0_pa) * (standard - c.p0_pa));
    let v = volume(&Matter::Condensed(*c), t, p, 0.0);
    let gibbs = Departure {
        si: c.v0 * ((1.0 + c.alpha * span) * step - c.kappa * squeezed),
        by_t: c.v0 * c.alpha * step,
        by_p: v,
        by_r: 0.0,
        by_constants: [(1.0 + c.alpha * span) * step - c.kappa * squeezed, c.v0 * span * step, -c.v0 * squeezed],
    };
    let enthalpy = Departure {
        si: c.v0 * ((1.0 - c.alpha * c.t0_k) * step - c.kappa * squeezed),
        by_t: 0.0,
        by_p: v - t * c.v0 * c.alpha,
        by_r: 0.0,
        by_constants: [(1.0 - c.alpha * c.t0_k) * step - c.kappa * squeezed, -c.v0 * c.t0_k * step, -c.v0 * squeezed],
    };
    let less_pv = |x: Departure| Departure {
        si: x.si - p * v,
        by_t: x.by_t - p * c.v0 * c.alpha,
        by_p: x.by_p - v + p * c.v0 * c.kappa,
        by_r: 0.0,
        by_constants: [
            x.by_constants[0] - p * v / c.v0,
            x.by_constants[1] - p * c.v0 * span,
            x.by_constants[2] + p * c.v0 * (p - c.p0_pa),
        ],
    };
    match property {
        Property::G | Property::K => gibbs,
        Property::H => enthalpy,
        Property::U => less_pv(enthalpy),
        Property::A => less_pv(gibbs),
        Property::S => Departure {
            si: -c.v0 * c.alpha * step,
            by_t: 0.0,
            by_p: -c.v0 * c.alpha,
            by_r: 0.0,
            by_constants: [-c.alpha * step, -c.v0 * step, 0.0],
        },
        Property::Cp => Departure::default(),
    }
}

/// One species at its pressure: its matter, and the nodes that the constants and the pressure are.
#[derive(Clone)]
pub struct AtPressure {
    pub matter: Matter,
    pub p_pa: f64,
    /// The pressure as it was given; `None` for the standard pressure.
    pub p_node: Option<Rc<Node>>,
    /// As in [`Departure::by_constants`].
    pub constants: [Option<Rc<Node>>; 3],
    /// Where the constants were printed.
    pub citation: Option<Citation>,
    /// What is missing for it, in words.
    pub lacks: Option<String>,
    /// B was estimated by corresponding states.
    pub estimated: bool,
}

impl AtPressure {
    /// The nodes that a property's departure rests on, each with its weight; R is left to the caller.
    pub fn parts(&self, departure: &Departure) -> SmallVec<[(Rc<Node>, f64); 4]> {
        let mut parts = SmallVec::new();
        for (node, weight) in self.constants.iter().zip(departure.by_constants) {
            if let Some(node) = node.as_ref().filter(|_| weight != 0.0) {
                parts.push((Rc::clone(node), weight));
            }
        }
        if let Some(node) = &self.p_node {
            parts.push((Rc::clone(node), departure.by_p));
        }
        parts
    }

    /// |B| p/(R T): how far the gas is from ideal, where B is known.
    pub fn share(&self, t_k: f64, r: f64) -> Option<f64> {
        match &self.matter {
            Matter::Virial(b) => Some((b[0] * self.p_pa / (r * t_k)).abs()),
            _ => None,
        }
    }
}

/// The table that constants are inputs of.
const TABLE: &str = "pressure-constants";
const VIRIAL: &str = "second virial coefficient";

/// How a species takes pressure under the conditions given.
///
/// # Errors
/// A constant that was given is of another dimension than it should be.
pub fn resolve(substance: &Arc<Substance>, t_k: f64, given: &Given, r: f64) -> Result<AtPressure, Fault> {
    let id = substance.species.id.clone();
    let (p_pa, p_node) = given.pressure_of(&substance.species);
    let bare = |matter, lacks| AtPressure {
        matter,
        p_pa,
        p_node: p_node.clone(),
        constants: [None, None, None],
        citation: None,
        lacks,
        estimated: false,
    };
    match substance.species.phase.state {
        Aggregate::Gas => {
            if !given.virial {
                return Ok(bare(Matter::IdealGas, None));
            }
            if let Some(own) = given.own_virial(&id)? {
                let constants = [Some(own.b), own.b1, None];
                let at = |node: &Option<Rc<Node>>| node.as_ref().map_or(0.0, |node| node.si());
                let matter = Matter::Virial([at(&constants[0]), at(&constants[1]), 0.0, 0.0]);
                let lacks = constants[1].is_none().then(|| "dB/dT was not given and counts as 0".to_owned());
                return Ok(AtPressure { constants, ..bare(matter, lacks) });
            }
            let second = match virial::second(&substance.pressure, t_k, r) {
                Ok(second) => second,
                Err(why) => {
                    let fit = substance.pressure.virial.as_ref();
                    let beyond = fit.map(|fit| format!("its fit holds from {} K to {} K, and ", fit.t_min, fit.t_max));
                    let lacks = format!("{}{why}", beyond.unwrap_or_default());
                    return Ok(bare(Matter::IdealGas, Some(lacks)));
                }
            };
            let leaf = |order: usize, way| {
                let si = second.at_t[order];
                // Printed figures are good to 1 cm3/mol at best; of the derivatives no digit is known.
                let digit = (order == 0).then_some(1e-6);
                let dim = (0..order).fold(molar_volume(), |dim, _| dim.over(&Dimension::base(Base::Kelvin)));
                input(&id, VIRIAL, way, t_k, si, dim, digit, &second.citation)
            };
            let constants =
                [Some(leaf(0, "")?), Some(leaf(1, "first derivative")?), Some(leaf(2, "second derivative")?)];
            let citation = Some(second.citation.clone());
            let estimated = second.estimated;
            Ok(AtPressure { constants, citation, estimated, ..bare(Matter::Virial(second.at_t), None) })
        }
        Aggregate::Aqueous => Ok(bare(Matter::Untouched, Some("its partial molar volume is not on record".to_owned()))),
        _ if !given.volumes => Ok(bare(Matter::Untouched, None)),
        _ => condensed(substance, t_k, given, &bare),
    }
}

fn condensed(
    substance: &Substance,
    t_k: f64,
    given: &Given,
    bare: &dyn Fn(Matter, Option<String>) -> AtPressure,
) -> Result<AtPressure, Fault> {
    let id = &substance.species.id;
    if let Some(own) = given.own_volume(id)? {
        let at = |node: &Option<Rc<Node>>| node.as_ref().map_or(0.0, |node| node.si());
        let matter = Matter::Condensed(Condensed {
            v0: own.v.si(),
            alpha: at(&own.alpha),
            kappa: at(&own.kappa),
            t0_k: t_k,
            p0_pa: STANDARD_PRESSURE.value,
        });
        let missing: Vec<&str> = [(own.alpha.is_none(), "expansivity"), (own.kappa.is_none(), "compressibility")]
            .into_iter()
            .filter_map(|(missing, name)| missing.then_some(name))
            .collect();
        let lacks =
            (!missing.is_empty()).then(|| format!("its {} was not given and counts as 0", missing.join(" and ")));
        return Ok(AtPressure { constants: [Some(own.v), own.alpha, own.kappa], ..bare(matter, lacks) });
    }
    let Some(record) = &substance.pressure.volume else {
        return Ok(bare(Matter::Untouched, Some("its molar volume is not on record".to_owned())));
    };
    let per_kelvin = Dimension::none().over(&Dimension::base(Base::Kelvin));
    let leaf = |way, si, dim, digit| input(id, "molar volume", way, 0.0, si, dim, digit, &record.citation);
    let constants = [
        Some(leaf("", record.v0, molar_volume(), Some(record.digit))?),
        Some(leaf("expansivity", record.alpha, per_kelvin, None)?),
        Some(leaf("compressibility", record.kappa, Dimension::none().over(&pressure_dim()), None)?),
    ];
    let matter = Matter::Condensed(Condensed::of(record));
    Ok(AtPressure { constants, citation: Some(record.citation.clone()), ..bare(matter, None) })
}

/// A constant as an input, told apart by substance, field and, for a function of T, the temperature.
#[expect(clippy::too_many_arguments, reason = "one private constructor of inputs")]
fn input(
    id: &Arc<str>,
    field: &'static str,
    way: &'static str,
    t_k: f64,
    si: f64,
    dim: Dimension,
    digit: Option<f64>,
    citation: &Citation,
) -> Result<Rc<Node>, Fault> {
    let t_bits = if t_k == 0.0 { 0 } else { t_k.to_bits() };
    let key = LeafKey::Datum { dataset: TABLE.into(), record: id.clone(), field, t_bits, way };
    let input = Input { digit, citation: Some(citation.clone()), ..Input::of(key) };
    Ok(Rc::clone(Quantity::input(si, dim, Kind::PLAIN, input, None)?.node()))
}

/// m³/mol
pub fn molar_volume() -> Dimension {
    Dimension::whole([3, 0, 0, 0, 0, 0]).over(&Dimension::amount(Entity::OPEN))
}

/// Pa
pub fn pressure_dim() -> Dimension {
    Dimension::whole([-1, 1, -2, 0, 0, 0])
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::data::catalog::Catalog;

    const R: f64 = 8.314_462_618_153_24;
    const ALL: [Property; 6] = [Property::G, Property::H, Property::S, Property::U, Property::A, Property::Cp];

    type AtT = Box<dyn Fn(f64) -> Matter>;

    fn matters() -> Vec<(&'static str, AtT)> {
        let data = Catalog::shipped();
        let virial = |id: &str| {
            let constants = data.find(id).unwrap().pressure.clone();
            Box::new(move |t: f64| Matter::Virial(virial::second(&constants, t, R).unwrap().at_t))
        };
        let liquid = data.find("H2O(l)").unwrap().pressure.volume.clone().unwrap();
        let condensed = Matter::Condensed(Condensed::of(&liquid));
        vec![
            ("ideal", Box::new(|_| Matter::IdealGas)),
            ("CO2(g)", virial("CO2(g)")),
            ("H2O(g)", virial("H2O(g)")),
            ("H2O(l)", Box::new(move |_| condensed)),
        ]
    }

    #[test]
    fn every_partial_derivative_is_that_of_differences() {
        let (t, p) = (400.0, 7e5);
        for (name, matter) in matters() {
            for property in ALL {
                let at = |t: f64, p: f64, r: f64| departure(property, &matter(t), t, p, r).si;
                let whole = departure(property, &matter(t), t, p, R);
                let (ht, hp, hr) = (0.02, 50.0, 1e-4);
                for (by, got, difference) in [
                    ("T", whole.by_t, (at(t + ht, p, R) - at(t - ht, p, R)) / (2.0 * ht)),
                    ("p", whole.by_p, (at(t, p + hp, R) - at(t, p - hp, R)) / (2.0 * hp)),
                    ("R", whole.by_r, (at(t, p, R + hr) - at(t, p, R - hr)) / (2.0 * hr)),
                ] {
                    // B itself is fixed where R moves. Bound: step² over the scale², and rounding over the step.
                    let h = match by {
                        "T" => ht,
                        "p" => hp,
                        _ => hr,
                    };
                    let allowed = 1e-6 * difference.abs() + 1e-14 * (whole.si.abs() + 1.0) / h;
                    assert!((got - difference).abs() <= allowed, "{name} {property:?} by {by}: {got} {difference}");
                }
            }
        }
    }

    #[test]
    fn state_functions_hang_together_and_vanish_at_the_standard_pressure() {
        let standard = STANDARD_PRESSURE.value;
        for (name, matter) in matters() {
            let (t, p) = (350.0, 3e5);
            let m = matter(t);
            let of = |property| departure(property, &m, t, p, R).si;
            let pv = p * volume(&m, t, p, R);
            // Bound: rounding of terms near 1e4 J/mol.
            let close = |what: &str, x: f64, y: f64| assert!((x - y).abs() < 1e-9, "{name} {what}: {x} {y}");
            close("G = H - TS", of(Property::G), of(Property::H) - t * of(Property::S));
            close("U = H - pV", of(Property::U), of(Property::H) - pv);
            close("A = G - pV", of(Property::A), of(Property::G) - pv);
            if matches!(m, Matter::IdealGas | Matter::Condensed(_)) {
                close("G at p°", departure(Property::G, &m, t, standard, R).si, 0.0);
                close("H at p°", departure(Property::H, &m, t, standard, R).si, 0.0);
            }
        }
    }

    #[test]
    fn the_weight_of_each_constant_is_its_derivative() {
        let (t, p) = (340.0, 5e6);
        let base = Condensed { v0: 18e-6, alpha: 2.6e-4, kappa: 4.5e-10, t0_k: 298.15, p0_pa: 101_325.0 };
        for property in ALL {
            let whole = departure(property, &Matter::Condensed(base), t, p, R);
            let bumped = [
                Condensed { v0: base.v0 * 1.001, ..base },
                Condensed { alpha: base.alpha * 1.001, ..base },
                Condensed { kappa: base.kappa * 1.001, ..base },
            ];
            let sizes = [base.v0, base.alpha, base.kappa];
            for ((bump, size), weight) in bumped.iter().zip(sizes).zip(whole.by_constants) {
                // Every constant enters linearly, so the difference is exact but for rounding.
                let difference =
                    (departure(property, &Matter::Condensed(*bump), t, p, R).si - whole.si) / (1e-3 * size);
                let allowed = 1e-9 * difference.abs() + 1e-9 * whole.si.abs() / size * 1e-3;
                assert!((difference - weight).abs() <= allowed.max(1e-9), "{property:?}: {weight} {difference}");
            }
        }
    }
}
