//! What a stated uncertainty means: the words that follow the comma in `9.7 ± 0.5 nm, k=2`.
//!
//! A half-width becomes a standard uncertainty by exactly one of: a coverage factor (`k=2`), a level of confidence
//! (`95 %`, with `dof=18` by Student's t), or bounds (`limits`, rectangular unless `triangular` is said). Nothing is guessed
//! where two of them are said, or none.

use thiserror::Error;

use crate::fault::Explain;
use crate::num::student::{normal_factor, student_factor};
use crate::record::evaluation::Shape;

/// What the words after the comma say.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Meaning {
    covers: Option<Covers>,
    shape: Option<Shape>,
    dof: Option<f64>,
    /// The half-width is a share of the value.
    pub relative: bool,
}

/// What a half-width covers.
#[derive(Clone, Copy, Debug, PartialEq)]
enum Covers {
    /// So many standard uncertainties.
    Factor(f64),
    /// The share of values, in per cent.
    Level(f64),
    /// All values.
    Limits,
}

impl Covers {
    fn words(self) -> String {
        match self {
            Covers::Factor(k) => format!("k={k}"),
            Covers::Level(percent) => format!("{percent} %"),
            Covers::Limits => "limits".to_owned(),
        }
    }
}

/// Why the words after the comma say nothing, or too much.
#[derive(Clone, Debug, PartialEq, Error)]
pub enum MeaningError {
    #[error("`{word}` is not a meaning of ±")]
    Unknown { word: String },
    #[error("`{first}` and `{second}` say in two ways what ± covers")]
    Two { first: String, second: String },
    #[error("a coverage factor of {k} is not above 0")]
    Factor { k: f64 },
    #[error("a level of {percent} % is not between 0 and 100 %")]
    Level { percent: f64 },
    #[error("{dof} degrees of freedom are fewer than 1")]
    Freedom { dof: f64 },
    #[error("`{shape}` is the distribution between limits, and `{covers}` is said of ±")]
    ShapeWithoutLimits { shape: &'static str, covers: String },
    #[error(
        "`{word}` is said of ±, and the uncertainty in `{text}` stands in brackets, where it is a standard one already"
    )]
    Brackets { word: String, text: String },
    #[error("`{word}` is said of the uncertainty, and `{text}` states none")]
    NoUncertainty { word: String, text: String },
}

impl Explain for MeaningError {
    fn code(&self) -> &'static str {
        match self {
            MeaningError::Unknown { .. } => "plus-minus-unknown",
            MeaningError::Two { .. } => "plus-minus-twice",
            MeaningError::Factor { .. } => "coverage-factor-not-positive",
            MeaningError::Level { .. } => "coverage-level-out-of-range",
            MeaningError::Freedom { .. } => "degrees-of-freedom-too-few",
            MeaningError::ShapeWithoutLimits { .. } => "shape-without-limits",
            MeaningError::Brackets { .. } => "brackets-with-meaning",
            MeaningError::NoUncertainty { .. } => "meaning-without-uncertainty",
        }
    }

    fn hint(&self) -> String {
        match self {
            MeaningError::Unknown { .. } => {
                "after the comma stands one of `k=2`, `95 %`, `limits` and `limits, triangular`, \
                 and besides `dof=18` for degrees of freedom and `relative` for a share of the value"
                    .to_owned()
            }
            MeaningError::Two { .. } => {
                "keep the one by which the stated figure was made; a certificate's U was made with its k".to_owned()
            }
            MeaningError::Factor { .. } => "U = k u with k of 1 to 3 as a rule: `k=2`".to_owned(),
            MeaningError::Level { .. } => "write the level in per cent, as in `95 %` or `99.7 %`".to_owned(),
            MeaningError::Freedom { .. } => {
                "n readings have n - 1 of them; leave `dof` out where none are stated".to_owned()
            }
            MeaningError::ShapeWithoutLimits { shape, .. } => {
                format!("write `limits, {shape}` where ± are bounds, or leave `{shape}` out")
            }
            MeaningError::Brackets { .. } => {
                "keep the brackets alone, or write the half-width after ±; only `dof=18` goes with both".to_owned()
            }
            MeaningError::NoUncertainty { text, .. } => {
                let number = text.split([',', ' ']).next().unwrap_or("");
                format!("state it in brackets, `{number}(u)`, or after ±")
            }
        }
    }
}

impl Meaning {
    /// Reads the words after the comma.
    ///
    /// # Errors
    /// A word is unknown or out of range, or two of them contradict each other.
    pub fn read(text: &str) -> Result<Meaning, MeaningError> {
        let mut meaning = Meaning::default();
        for word in text.split(',') {
            meaning.add(word.trim())?;
        }
        match (meaning.shape, meaning.covers) {
            (Some(shape), Some(covers)) if covers != Covers::Limits => {
                Err(MeaningError::ShapeWithoutLimits { shape: shape.word(), covers: covers.words() })
            }
            (Some(_), None) => {
                meaning.covers = Some(Covers::Limits); // Both shapes are bounded.
                Ok(meaning)
            }
            _ => Ok(meaning),
        }
    }

    fn add(&mut self, word: &str) -> Result<(), MeaningError> {
        let compact: String = word.chars().filter(|c| !c.is_whitespace()).collect();
        let unknown = || MeaningError::Unknown { word: word.to_owned() };
        let number = |text: &str| text.parse::<f64>().ok().filter(|x| x.is_finite()).ok_or_else(unknown);
        let covers = match compact.as_str() {
            "limits" => Covers::Limits,
            "rectangular" | "triangular" => {
                let shape = if compact == "triangular" { Shape::Triangular } else { Shape::Rectangular };
                if let Some(first) = self.shape {
                    return Err(MeaningError::Two { first: first.word().to_owned(), second: compact });
                }
                self.shape = Some(shape);
                return Ok(());
            }
            "relative" => {
                self.relative = true;
                return Ok(());
            }
            other => match (other.strip_prefix("k="), other.strip_prefix("dof="), other.strip_suffix('%')) {
                (Some(k), ..) => match number(k)? {
                    k if k > 0.0 => Covers::Factor(k),
                    k => return Err(MeaningError::Factor { k }),
                },
                (_, Some(dof), _) => {
                    let dof = number(dof)?;
                    if dof < 1.0 {
                        return Err(MeaningError::Freedom { dof });
                    }
                    self.dof = Some(dof);
                    return Ok(());
                }
                (.., Some(percent)) => match number(percent)? {
                    percent if percent > 0.0 && percent < 100.0 => Covers::Level(percent),
                    percent => return Err(MeaningError::Level { percent }),
                },
                _ => return Err(unknown()),
            },
        };
        match self.covers {
            Some(first) => Err(MeaningError::Two { first: first.words(), second: covers.words() }),
            None => {
                self.covers = Some(covers);
                Ok(())
            }
        }
    }

    /// What a half-width is divided by to give a standard uncertainty; `None` where the words do not say what it covers.
    pub fn divisor(&self) -> Option<f64> {
        Some(match (self.covers?, self.dof) {
            (Covers::Factor(k), _) => k,
            (Covers::Level(percent), None) => normal_factor(percent / 100.0),
            (Covers::Level(percent), Some(dof)) => student_factor(percent / 100.0, dof),
            (Covers::Limits, _) if self.shape == Some(Shape::Triangular) => 6f64.sqrt(),
            (Covers::Limits, _) => 3f64.sqrt(),
        })
    }

    pub fn shape(&self) -> Shape {
        match self.covers {
            Some(Covers::Limits) => self.shape.unwrap_or(Shape::Rectangular),
            _ => Shape::Normal,
        }
    }

    pub fn dof(&self) -> Option<f64> {
        self.dof
    }

    /// That only what goes with brackets is said: degrees of freedom.
    ///
    /// # Errors
    /// More is said.
    pub fn fits_brackets(&self, text: &str) -> Result<(), MeaningError> {
        match self.word_about_plus_minus() {
            Some(word) => Err(MeaningError::Brackets { word, text: text.to_owned() }),
            None => Ok(()),
        }
    }

    /// The first thing said, for a text that states no uncertainty.
    pub fn without_uncertainty(&self, text: &str) -> MeaningError {
        let word = self.word_about_plus_minus().or_else(|| self.dof.map(|dof| format!("dof={dof}")));
        MeaningError::NoUncertainty { word: word.unwrap_or_default(), text: text.to_owned() }
    }

    fn word_about_plus_minus(&self) -> Option<String> {
        self.covers.map(Covers::words).or_else(|| self.relative.then(|| "relative".to_owned()))
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn divisor(text: &str) -> f64 {
        Meaning::read(text).unwrap().divisor().unwrap()
    }

    fn code(text: &str) -> &'static str {
        Meaning::read(text).unwrap_err().code()
    }

    #[test]
    fn each_form_has_its_divisor() {
        assert_eq!(divisor("k=2"), 2.0);
        assert_eq!(divisor("k = 2.5, dof=9"), 2.5);
        assert_eq!(divisor("limits"), 3f64.sqrt());
        assert_eq!(divisor("limits, rectangular"), 3f64.sqrt());
        assert_eq!(divisor("limits, triangular"), 6f64.sqrt());
        // JCGM 100:2008, table G.2 (from memory), to the two decimals printed.
        for (text, printed) in [("95 %", 1.96), ("99%", 2.576), ("95 %, dof=18", 2.10), ("dof=16, 99 %", 2.92)] {
            assert!((divisor(text) - printed).abs() < 0.005, "{text}: {}", divisor(text));
        }
    }

    #[test]
    fn contradictions_and_unknown_words_are_refused() {
        let cases = [
            ("maybe", "plus-minus-unknown"),
            ("k=two", "plus-minus-unknown"),
            ("k=2, 95 %", "plus-minus-twice"),
            ("95 %, limits", "plus-minus-twice"),
            ("limits, rectangular, triangular", "plus-minus-twice"),
            ("k=0", "coverage-factor-not-positive"),
            ("100 %", "coverage-level-out-of-range"),
            ("k=2, dof=0", "degrees-of-freedom-too-few"),
            ("k=2, triangular", "shape-without-limits"),
        ];
        for (text, want) in cases {
            assert_eq!(code(text), want, "{text}");
        }
    }
}
