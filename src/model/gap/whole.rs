//! Mistakes made with a finished figure, whatever it stands for: calories, powers of ten, signs, degrees.

use crate::model::gap::candidate::{Candidate, Mistake, Scale};
use crate::quantity::Quantity;
use crate::source::Citation;
use crate::units::{Base, What, parse, table};

/// Steps of ten that happen: a prefix, or two.
const POWERS: [i32; 3] = [1, 2, 3];

/// What a mistake would make of `value`.
pub fn candidates(value: &Quantity, scale: Scale) -> Vec<Candidate> {
    let Some(y) = scale.of(value.si()) else { return Vec::new() };
    if value.kind().what.is_temperature() {
        return temperature(value);
    }
    let mut out = Vec::new();
    let mut push = |mistake, words: String, predicted: f64, sources: &[Citation]| {
        out.push(Candidate { mistake, words, predicted, sources: sources.to_vec() });
    };
    for power in POWERS {
        let shift = std::f64::consts::LN_10 * f64::from(power);
        let factor = crate::quantity::round::power_of_ten(power);
        let (up, down) = match scale {
            Scale::Linear => (y * (factor - 1.0), y * (1.0 / factor - 1.0)),
            Scale::Logarithm => (shift, -shift),
        };
        push(Mistake::PowerOfTen, format!("the figure is {factor} times too large"), up, &[]);
        push(Mistake::PowerOfTen, format!("the figure is {factor} times too small"), down, &[]);
    }
    // On the scale of logarithms that is the equilibrium constant of the reverse reaction.
    let sign = match scale {
        Scale::Linear => "the sign is turned",
        Scale::Logarithm => "the reaction is taken the other way round",
    };
    push(Mistake::Sign, sign.to_owned(), -2.0 * y, &[]);
    if scale == Scale::Linear && is_energy(value) {
        let [thermochemical, international] = ["cal_th", "cal_IT"].map(calorie);
        for (name, (size, source)) in [("cal_th", &thermochemical), ("cal_IT", &international)] {
            let sources = std::slice::from_ref(source);
            push(Mistake::Calorie, format!("a figure in {name} is read in joules"), y * (1.0 / size - 1.0), sources);
            push(Mistake::Calorie, format!("a figure in joules is read in {name}"), y * (size - 1.0), sources);
        }
        let ratio = international.0 / thermochemical.0;
        let sources = [thermochemical.1, international.1];
        push(Mistake::CalorieKind, "a figure in cal_th is converted as cal_IT".to_owned(), y * (ratio - 1.0), &sources);
        push(
            Mistake::CalorieKind,
            "a figure in cal_IT is converted as cal_th".to_owned(),
            y * (1.0 / ratio - 1.0),
            &sources,
        );
    }
    out
}

/// Size of a calorie in joules, with the source of the unit table.
fn calorie(symbol: &str) -> (f64, Citation) {
    let spelled = table::lookup(symbol).expect("the unit table has the calories");
    let size = spelled.row.size;
    let factor = crate::quantity::round::power_of_ten(size.ten);
    (size.numerator as f64 / size.denominator as f64 * factor, spelled.row.citation())
}

/// Energies, also per mole, per kilogram or per kelvin.
fn is_energy(value: &Quantity) -> bool {
    let dim = value.dim();
    dim.halves(Base::Metre) == 4 && dim.halves(Base::Second) == -4 && matches!(dim.halves(Base::Kilogram), 0 | 2)
}

/// 0 °C in kelvin, with the source of the unit table.
pub fn celsius_zero() -> (f64, Citation) {
    let row = table::lookup("degC").expect("the unit table has the degree Celsius").row;
    let unit = parse::unit("degC").expect("the unit table has the degree Celsius");
    (unit.to_si(0.0), row.citation())
}

fn temperature(value: &Quantity) -> Vec<Candidate> {
    if value.kind().what == What::TemperatureDifference {
        return Vec::new();
    }
    let (offset, source) = celsius_zero();
    let candidate = |words: &str, predicted: f64| Candidate {
        mistake: Mistake::Celsius,
        words: words.to_owned(),
        predicted,
        sources: vec![source.clone()],
    };
    vec![
        candidate("a figure in kelvin is read in degrees Celsius", offset),
        candidate("a figure in degrees Celsius is read in kelvin", -offset),
    ]
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::quantity::text::parse;

    #[test]
    fn calories_are_those_of_the_unit_table() {
        // NIST SP 811 (2008), Appendix B.8, from memory: cal_th = 4.184 J, cal_IT = 4.1868 J.
        assert_eq!((calorie("cal_th").0, calorie("cal_IT").0), (4.184, 4.1868));
        let of = |text: &str| candidates(&parse(text, None, 0).unwrap(), Scale::Linear);
        let kinds = |text: &str| of(text).iter().any(|candidate| candidate.mistake == Mistake::Calorie);
        assert!(kinds("1 kJ/mol") && kinds("1 J/(K mol)") && kinds("1 kJ/kg[feed]"));
        assert!(!kinds("1 bar") && !kinds("1") && !kinds("300 K"));
        assert_eq!(of("300 K").len(), 2);
        // SI Brochure, 9th ed., section 2.3.1, from memory: t/°C = T/K - 273.15.
        assert_eq!(celsius_zero().0, 273.15);
    }
}
