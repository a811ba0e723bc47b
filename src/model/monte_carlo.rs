//! Propagation of distributions by Monte Carlo, and what it says of propagation by first derivatives (JCGM 101:2008).
//!
//! Each input is drawn from its distribution (6.4): normal, Student's t where degrees of freedom are stated, rectangular,
//! triangular, correlated inputs together as normal; the value is computed again for each draw. Blocks of 10^4 draws are
//! added until mean, u and both ends of the interval are stable to two digits of u (7.9.4): twice the standard deviation of
//! their averages over the blocks is below δ, half a unit of the second digit. The ends are the quantiles that leave equal
//! shares outside (7.7). An equilibrium constant is taken in ln K°.
//!
//! The comparison with first derivatives asks whether the ends of both intervals agree within one digit of u (clause 8).
//! [`Propagation::u_linear`] puts the same draws through the first derivatives, so that nothing but curvature tells the
//! two u apart: Student's t alone makes u larger by √(ν/(ν − 2)).
//!
//! The surprise: the numbers are not random. The generator starts from a seed that stands in the answer.

use std::rc::Rc;
use std::sync::Arc;

use thiserror::Error;

use crate::fault::{Explain, Fault};
use crate::model::answer::{self, Answer, LEVEL};
use crate::model::card::{Arg, Call, Card, Cx, Default, On, Takes, Value};
use crate::model::expanded::{Expanded, ExpandedError};
use crate::model::review;
use crate::num::math;
use crate::num::random::Generator;
use crate::quantity::{Quantity, round};
use crate::record::evaluation::Shape;
use crate::record::tape::Tape;
use crate::units::Unit;

pub static MONTE_CARLO: Card = Card {
    id: "uncertainty.monte-carlo",
    name: "monte_carlo",
    on: On::Quantity,
    args: &[Arg { name: "options", takes: Takes::Options(OPTIONS), default: Default::NoOptions, doc: "how to draw" }],
    gives: "mean, standard uncertainty and interval of the value by drawn inputs, beside those by first derivatives",
    doc: "Draws the inputs from their distributions and computes the value for each draw, until two digits of its standard \
          uncertainty are stable. The same seed gives the same answer. Parts: `mean`, `u`, `low`, `high`, `u_linear`, \
          `draws`, `seed`, `stable`; for an equilibrium constant `u` and `u_linear` are those of ln K°.",
    source: "JCGM 101:2008, clauses 5 to 8",
    example: "q(\"2.0(3) bar\").monte_carlo(#{ seed: 1 })",
    claims: &[],
    alternatives: &[],
    run: |cx, call| {
        let Some(Value::Options(options)) = call.args.last() else {
            unreachable!("the options of a call are its last argument")
        };
        let number = |name: &str| match options.get(name) {
            Some(Value::Number(number)) => Some(*number),
            _ => None,
        };
        let settings = Settings::read(number)?;
        let propagation = Propagation::of(cx, call, call.quantity(0), settings)?;
        Ok(Value::Answer(Answer::Propagation(Rc::new(propagation))))
    },
    check_line: None,
    caution: None,
};

/// The options of every formula that draws.
pub(super) const OPTIONS: &[Arg] = &[
    Arg {
        name: "seed",
        takes: Takes::Number,
        default: Default::Number(1.0),
        doc: "a whole number that the draws start from; 1 unless stated",
    },
    Arg {
        name: "draws",
        takes: Takes::Number,
        default: Default::Absent,
        doc: "the most draws to make; 4000000 unless stated",
    },
    LEVEL,
];

/// Draws of one block (JCGM 101:2008, 7.9.4 b).
const BLOCK: usize = 10_000;
/// Draws to stop at, stable or not: 32 MB of values.
const MOST_DRAWS: usize = 4_000_000;
/// Steps to stop at, draws times steps of one draw, so that a long graph does not run for hours.
const MOST_STEPS: usize = 4_000_000_000;
/// Steps between two questions whether to go on: about a millisecond.
const STEPS_UNASKED: usize = 50_000;
/// The largest seed that a number of the script holds exactly.
const LARGEST_SEED: f64 = 9_007_199_254_740_992.0;

/// Why nothing can be drawn, or nothing said of the draws.
#[derive(Clone, Debug, PartialEq, Error)]
pub enum MonteCarloError {
    #[error("nothing is to be drawn: {why}", why = if silent.is_empty() { "all inputs are exact".to_owned() } else { format!("the inputs state no uncertainty ({silent})") })]
    NothingToDraw { silent: String },
    #[error("`{input}` has {dof} degrees of freedom, and Student's t has a standard deviation from more than 2 on")]
    NoDeviation { input: String, dof: f64 },
    #[error("{count} of {draws} draws give no value: some input reaches where the formula has none")]
    NoValue { count: usize, draws: usize },
    #[error("a seed of {seed} is no whole number from 0 to 2^53")]
    Seed { seed: f64 },
    #[error("{draws} draws are not enough, since stability is judged by blocks of 10000")]
    TooFewDraws { draws: f64 },
}

impl Explain for MonteCarloError {
    fn code(&self) -> &'static str {
        match self {
            MonteCarloError::NothingToDraw { .. } => "nothing-to-draw",
            MonteCarloError::NoDeviation { .. } => "draws-without-deviation",
            MonteCarloError::NoValue { .. } => "draws-without-value",
            MonteCarloError::Seed { .. } => "seed-not-whole",
            MonteCarloError::TooFewDraws { .. } => "draws-too-few",
        }
    }

    fn hint(&self) -> String {
        match self {
            MonteCarloError::NothingToDraw { .. } => {
                "state the uncertainty of one input at least, as in `q(\"25.0(3) nm\")`".to_owned()
            }
            MonteCarloError::NoDeviation { .. } => {
                "take four readings at least, or state the limits of what was judged from \
                 so little; `x.expanded(0.95)` works with few degrees of freedom"
                    .to_owned()
            }
            MonteCarloError::NoValue { .. } => "state the limits of an input that cannot be negative or zero, as in \
                 `q(\"2 ± 1 bar, limits\")`"
                .to_owned(),
            MonteCarloError::Seed { .. } => "give a whole number: `#{ seed: 1 }`".to_owned(),
            MonteCarloError::TooFewDraws { .. } => "allow 20000 at least, or leave `draws` out".to_owned(),
        }
    }
}

/// How to draw.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Settings {
    pub seed: u64,
    pub most: usize,
    pub level: f64,
}

impl Settings {
    /// From the options of a call.
    ///
    /// # Errors
    /// An option is out of range.
    pub fn read(option: impl Fn(&str) -> Option<f64>) -> Result<Settings, Fault> {
        let seed = option("seed").unwrap_or(1.0);
        if seed.fract() != 0.0 || !(0.0..=LARGEST_SEED).contains(&seed) {
            return Err(MonteCarloError::Seed { seed }.into());
        }
        let most = option("draws").unwrap_or(MOST_DRAWS as f64);
        if most.is_nan() || most < (2 * BLOCK) as f64 {
            return Err(MonteCarloError::TooFewDraws { draws: most }.into());
        }
        let level = option("level").unwrap_or(0.95);
        if !(level > 0.0 && level < 1.0) {
            return Err(ExpandedError::Level { level }.into());
        }
        Ok(Settings { seed: seed as u64, most: most.min(MOST_DRAWS as f64) as usize, level })
    }
}

/// Mean, standard deviation and interval of some draws, in the output's unit.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Summary {
    pub mean: f64,
    pub u: f64,
    pub low: f64,
    pub high: f64,
}

/// How the interval by first derivatives compares.
pub enum Comparison {
    /// The interval, and how far its ends are from those of the draws; `tolerance` is half a unit of the first digit of u.
    Interval { low: f64, high: f64, off_low: f64, off_high: f64, tolerance: f64 },
    /// There is none, for this reason.
    None { why: String },
}

/// What a Monte Carlo run gave. Numbers are in `unit`, or of ln K° where `logarithmic`.
pub struct Propagation {
    pub value: Quantity,
    pub logarithmic: bool,
    pub unit: Arc<Unit>,
    pub settings: Settings,
    pub draws: usize,
    /// Whether two digits of u were stable before the largest number of draws.
    pub stable: bool,
    /// Half a unit of the second digit of u.
    pub tolerance: f64,
    pub drawn: Summary,
    /// Standard uncertainty by the law of propagation.
    pub u_law: f64,
    /// Standard deviation of the same draws put through the first derivatives.
    pub u_linear: f64,
    pub comparison: Comparison,
    /// Formulas that could not be computed again and were taken by their derivatives.
    pub by_derivatives: Vec<String>,
    /// Correlated inputs with degrees of freedom were drawn as normal.
    pub normal_groups: bool,
    /// Inputs that state no uncertainty and were held, in words.
    pub silent: String,
    figures: [Quantity; 4],
}

impl Propagation {
    /// Draws, until two digits of u are stable.
    ///
    /// # Errors
    /// See [`MonteCarloError`]; or the work was told to end.
    pub fn of(cx: &Cx, call: &Rc<Call>, value: &Quantity, settings: Settings) -> Result<Propagation, Fault> {
        let silent = review::silent_words(&review::silent_inputs(value));
        let Some(tape) = Tape::of(value.node()) else {
            return Err(MonteCarloError::NothingToDraw { silent }.into());
        };
        refuse_without_deviation(&tape)?;
        let logarithmic = answer::is_logarithmic(value);
        let unit = value.unit();
        // Widths are counted in the steps of the value's own unit, on a temperature scale too.
        let (y, size) = (value.si(), unit.factor);
        let output = |si: f64| if logarithmic { math::ln(si) } else { unit.from_si(si) };
        // First derivatives of ln K are those of K over K.
        let linear = |si: f64| if logarithmic { math::ln(y) + (si - y) / y } else { unit.from_si(si) };
        let mut run = Run::new(cx, &tape, settings);
        let stable = run.until_stable(output, linear)?;
        let drawn = run.whole();
        let u_law = value.spread().u().unwrap_or(0.0) / if logarithmic { y } else { size };
        let comparison = match Expanded::of(call, value, settings.level) {
            Ok(expanded) => {
                let (low, high) = (output(expanded.low.si()), output(expanded.high.si()));
                let tolerance = 0.5 * round::power_of_ten(1 - round::decimals_for(u_law));
                let (off_low, off_high) = ((low - drawn.low).abs(), (high - drawn.high).abs());
                Comparison::Interval { low, high, off_low, off_high, tolerance }
            }
            Err(fault) => Comparison::None { why: fault.message().to_owned() },
        };
        let back = |y: f64| if logarithmic { math::exp(y) } else { unit.to_si(y) };
        let width = if logarithmic { drawn.u } else { drawn.u * size };
        let figures = [
            answer::figure(call, value, back(drawn.mean))?,
            answer::width(call, value, width)?,
            answer::figure(call, value, back(drawn.low))?,
            answer::figure(call, value, back(drawn.high))?,
        ];
        let evaluations = || tape.leaves().iter().map(|leaf| leaf.input.evaluation());
        Ok(Propagation {
            value: value.clone(),
            logarithmic,
            unit,
            settings,
            draws: run.values.len(),
            stable,
            tolerance: half_digit(drawn.u),
            drawn,
            u_law,
            u_linear: deviation(&run.linear),
            comparison,
            by_derivatives: tape.by_derivatives().to_vec(),
            normal_groups: evaluations().any(|one| one.correlation.is_some() && one.dof.is_some()),
            silent,
            figures,
        })
    }

    /// Whether the interval by first derivatives agrees within one digit of u; `None` where there is none.
    pub fn linear_suffices(&self) -> Option<bool> {
        match self.comparison {
            Comparison::Interval { off_low, off_high, tolerance, .. } => {
                Some(off_low <= tolerance && off_high <= tolerance)
            }
            Comparison::None { .. } => None,
        }
    }

    pub(super) fn parts(&self) -> Vec<(&'static str, Value)> {
        let [mean, u, low, high] = &self.figures;
        let quantity = |value: &Quantity| Value::Quantity(value.clone());
        vec![
            ("mean", quantity(mean)),
            ("u", quantity(u)),
            ("low", quantity(low)),
            ("high", quantity(high)),
            ("u_linear", Value::Number(self.u_linear)),
            ("draws", Value::Number(self.draws as f64)),
            ("seed", Value::Number(self.settings.seed as f64)),
            ("stable", Value::Flag(self.stable)),
        ]
    }
}

/// Half a unit of the second digit of u: the numerical tolerance δ of 7.9.2.
fn half_digit(u: f64) -> f64 {
    0.5 * round::power_of_ten(-round::decimals_for(u))
}

fn refuse_without_deviation(tape: &Tape) -> Result<(), MonteCarloError> {
    for leaf in tape.leaves() {
        let evaluation = leaf.input.evaluation();
        let as_t = evaluation.shape == Shape::Normal && evaluation.correlation.is_none();
        if let Some(dof) = evaluation.dof.filter(|dof| as_t && *dof <= 2.0) {
            return Err(MonteCarloError::NoDeviation { input: leaf.input.name(), dof });
        }
    }
    Ok(())
}

/// The draws so far.
struct Run<'a> {
    cx: &'a Cx<'a>,
    tape: &'a Tape,
    settings: Settings,
    generator: Generator,
    values: Vec<f64>,
    linear: Vec<f64>,
    blocks: Vec<Summary>,
    /// Sum and sum of squares of the values, counted from the first one.
    sums: (f64, f64),
}

impl<'a> Run<'a> {
    fn new(cx: &'a Cx<'a>, tape: &'a Tape, settings: Settings) -> Self {
        let generator = Generator::new(settings.seed);
        Run {
            cx,
            tape,
            settings,
            generator,
            values: Vec::new(),
            linear: Vec::new(),
            blocks: Vec::new(),
            sums: (0.0, 0.0),
        }
    }

    /// Adds blocks until two digits are stable, and says whether they are.
    fn until_stable(&mut self, output: impl Fn(f64) -> f64, linear: impl Fn(f64) -> f64) -> Result<bool, Fault> {
        let affordable = MOST_STEPS / (self.tape.len() + self.tape.leaves().len()).max(1);
        let most = self.settings.most.min(affordable).max(2 * BLOCK);
        while self.values.len() + BLOCK <= most {
            self.block(&output, &linear)?;
            if self.is_stable() {
                return Ok(true);
            }
        }
        Ok(false)
    }

    fn block(&mut self, output: impl Fn(f64) -> f64, linear: impl Fn(f64) -> f64) -> Result<(), Fault> {
        let start = self.values.len();
        let (mut offsets, mut results, mut unasked) = (Vec::new(), Vec::new(), 0);
        for _ in 0..BLOCK {
            self.tape.draw(&mut self.generator, &mut offsets);
            self.values.push(output(self.tape.run(&offsets, &mut results)));
            self.linear.push(linear(self.tape.linear(&offsets)));
            unasked += self.tape.len() + offsets.len();
            if unasked > STEPS_UNASKED {
                unasked = 0;
                if let Some(fault) = (self.cx.halted)() {
                    return Err(fault);
                }
            }
        }
        let lost = self.values[start..].iter().filter(|value| !value.is_finite()).count();
        if lost > 0 {
            return Err(MonteCarloError::NoValue { count: lost, draws: BLOCK }.into());
        }
        let origin = self.values[0];
        for value in &self.values[start..] {
            let from_origin = value - origin;
            self.sums = (self.sums.0 + from_origin, self.sums.1 + from_origin * from_origin);
        }
        self.blocks.push(summary(&mut self.values[start..].to_vec(), self.settings.level));
        Ok(())
    }

    /// Whether twice the standard deviation of each average over the blocks is below δ.
    fn is_stable(&self) -> bool {
        let h = self.blocks.len();
        if h < 2 {
            return false;
        }
        let (n, (sum, squares)) = (self.values.len() as f64, self.sums);
        let delta = half_digit(((squares - sum * sum / n).max(0.0) / (n - 1.0)).sqrt());
        let parts: [fn(&Summary) -> f64; 4] = [|s| s.mean, |s| s.u, |s| s.low, |s| s.high];
        parts.into_iter().all(|part| {
            let of_blocks: Vec<f64> = self.blocks.iter().map(part).collect();
            2.0 * deviation(&of_blocks) / (h as f64).sqrt() <= delta
        })
    }

    fn whole(&self) -> Summary {
        summary(&mut self.values.clone(), self.settings.level)
    }
}

fn mean(values: &[f64]) -> f64 {
    // Around the first value, so that a small spread about a large value keeps its digits.
    let origin = values.first().copied().unwrap_or(0.0);
    origin + values.iter().map(|value| value - origin).sum::<f64>() / values.len() as f64
}

/// Sample standard deviation.
fn deviation(values: &[f64]) -> f64 {
    let mean = mean(values);
    let squares: f64 = values.iter().map(|value| (value - mean) * (value - mean)).sum();
    (squares / (values.len() as f64 - 1.0)).sqrt()
}

/// Sorts the values. The interval leaves equal shares outside: from the r-th value to the (r + q)-th, q = pM and
/// r = (M − q)/2 (JCGM 101:2008, 7.7.2).
fn summary(values: &mut [f64], level: f64) -> Summary {
    let (mean, u) = (mean(values), deviation(values));
    values.sort_unstable_by(f64::total_cmp);
    let m = values.len();
    let q = ((level * m as f64 + 0.5) as usize).clamp(1, m - 1);
    let r = (m - q).div_ceil(2).max(1);
    Summary { mean, u, low: values[r - 1], high: values[(r + q - 1).min(m - 1)] }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn an_interval_leaves_equal_shares_outside() {
        // Of 1..=1000: q = 950, r = 25, so from the 25th value to the 975th.
        let mut values: Vec<f64> = (1..=1000).rev().map(f64::from).collect();
        let summary = summary(&mut values, 0.95);
        assert_eq!((summary.low, summary.high), (25.0, 975.0));
        assert_eq!(summary.mean, 500.5);
        // Variance of the whole numbers from 1 to n: n(n + 1)/12.
        assert!((summary.u - (1000.0 * 1001.0 / 12.0_f64).sqrt()).abs() < 1e-9);
    }

    #[test]
    fn half_a_unit_of_the_second_digit() {
        // JCGM 101:2008, 7.9.2, example 1 (from memory): u = 0.000 35 g with two digits gives δ = 0.000 005 g.
        assert_eq!(half_digit(0.000_35), 0.000_005);
        assert_eq!(half_digit(99.0), 0.5);
    }
}
