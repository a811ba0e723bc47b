//! A place in a file of one's own records: what stands there, and how to say what is wrong with it.

use crate::fault::Explain;
use crate::quantity::{Quantity, text};
use crate::units::{Dimension, Entity, What, parse as unit_parse};

use super::dataset::Datum;
use super::own_fault::{OwnFault, Problem};
use super::tree::{Tree, shortened};

/// What a figure of a record is.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Measure {
    FormationEnthalpy,
    Enthalpy,
    Entropy,
    HeatCapacity,
}

impl Measure {
    /// What it is, and in which unit, in words.
    fn words(self) -> (&'static str, &'static str) {
        match self {
            Measure::FormationEnthalpy => ("a formation enthalpy", "kJ/mol"),
            Measure::Enthalpy => ("an enthalpy of transition", "kJ/mol"),
            Measure::Entropy => ("an entropy", "J/(mol K)"),
            Measure::HeatCapacity => ("a heat capacity", "J/(mol K)"),
        }
    }

    fn dimension(self) -> Dimension {
        let per_mole = Dimension::amount(Entity::OPEN);
        match self {
            Measure::FormationEnthalpy | Measure::Enthalpy => Dimension::whole([2, 1, -2, 0, 0, 0]).over(&per_mole),
            Measure::Entropy | Measure::HeatCapacity => Dimension::whole([2, 1, -2, 0, -1, 0]).over(&per_mole),
        }
    }
}

/// A value of the file with its place.
pub(super) struct Spot<'a> {
    file: &'a str,
    record: String,
    path: String,
    pub tree: &'a Tree,
}

const SHARE: &str = "write a share in % and what it means: `2 %, k=1` for a standard uncertainty, `2 %, k=2` or `2 %, 95 %` \
                     for an expanded one, `2 %, limits` for bounds";

impl<'a> Spot<'a> {
    pub fn whole(file: &'a str, tree: &'a Tree) -> Spot<'a> {
        Spot { file, record: String::new(), path: String::new(), tree }
    }

    pub fn fault(&self, problem: Problem) -> OwnFault {
        OwnFault {
            file: self.file.to_owned(),
            record: self.record.clone(),
            field: self.path.clone(),
            problem: problem.into(),
        }
    }

    fn sort(&self, wanted: &'static str) -> OwnFault {
        self.fault(Problem::Sort { found: self.tree.words(), wanted })
    }

    pub fn member(&self, name: &str) -> Option<Spot<'a>> {
        let tree = self.tree.get(name)?;
        let path = if self.path.is_empty() { name.to_owned() } else { format!("{}.{name}", self.path) };
        Some(Spot { file: self.file, record: self.record.clone(), path, tree })
    }

    /// A member that must be there; `what` says what it holds.
    pub fn need(&self, name: &'static str, what: &'static str) -> Result<Spot<'a>, OwnFault> {
        self.member(name).ok_or_else(|| self.fault(Problem::Missing { name, what }))
    }

    pub fn object(&self) -> Result<(), OwnFault> {
        if matches!(self.tree, Tree::Object(_)) { Ok(()) } else { Err(self.sort("an object in braces")) }
    }

    /// Refuses members of other names.
    pub fn only(&self, known: &[&str]) -> Result<(), OwnFault> {
        let Tree::Object(members) = self.tree else { return Ok(()) };
        match members.iter().find(|(name, _)| !known.contains(&name.as_str())) {
            None => Ok(()),
            Some((name, _)) => {
                let known = known.iter().map(|name| format!("`{name}`")).collect::<Vec<_>>().join(", ");
                Err(self.fault(Problem::Unknown { name: shortened(name), known }))
            }
        }
    }

    /// The items of a list. Those of a list of the file itself are records, and are called by their ids from there on.
    pub fn items(&self) -> Result<Vec<Spot<'a>>, OwnFault> {
        let Tree::List(list) = self.tree else { return Err(self.sort("a list in square brackets")) };
        let item = |(nth, tree): (usize, &'a Tree)| {
            if !self.record.is_empty() {
                let path = format!("{}[{nth}]", self.path);
                return Spot { file: self.file, record: self.record.clone(), path, tree };
            }
            let name = |field| match tree.get(field) {
                Some(Tree::Text(id)) => Some(shortened(id)),
                _ => None,
            };
            let ends = || Some(format!("{} -> {}", name("from")?, name("to")?));
            let record = name("id").or_else(ends).unwrap_or_else(|| format!("{nth} of `{}`", self.path));
            Spot { file: self.file, record, path: String::new(), tree }
        };
        Ok((1..).zip(list).map(item).collect())
    }

    pub fn text(&self) -> Result<&'a str, OwnFault> {
        match self.tree {
            Tree::Text(text) if !text.trim().is_empty() => Ok(text),
            _ => Err(self.sort("a text in quotation marks")),
        }
    }

    pub fn text_or_nothing(&self, name: &str) -> Result<Option<&'a str>, OwnFault> {
        self.member(name).map(|member| member.text()).transpose()
    }

    pub fn number(&self) -> Result<f64, OwnFault> {
        match self.tree {
            Tree::Number(number) if number.is_finite() => Ok(*number),
            _ => Err(self.sort("a number without quotation marks")),
        }
    }

    fn quantity(&self, written: &str) -> Result<Quantity, OwnFault> {
        text::parse(written, None, 0).map_err(|error| {
            self.fault(Problem::Figure { text: shortened(written), why: error.to_string(), hint: error.hint() })
        })
    }

    /// A figure as typed in a notebook, where the member is there.
    pub fn figure(&self, name: &'static str, measure: Measure) -> Result<Option<Datum>, OwnFault> {
        let Some(spot) = self.member(name) else { return Ok(None) };
        let (what, wanted) = measure.words();
        let Tree::Text(written) = spot.tree else {
            return Err(spot.sort("a figure with its unit, in quotation marks, such as \"-285.830(20) kJ/mol\""));
        };
        let quantity = spot.quantity(written)?;
        if *quantity.dim() != measure.dimension() {
            let (text, found) = (shortened(written), quantity.unit().text.to_string());
            return Err(spot.fault(Problem::Unit { text, found, what, wanted }));
        }
        let mut datum = Datum::of_written(written, &quantity)
            .ok_or_else(|| spot.sort("a figure with its unit, such as \"-285.830(20) kJ/mol\""))?;
        // An element in its reference state: zero by convention, and so exact.
        if measure == Measure::FormationEnthalpy && datum.value == 0.0 && datum.u.is_none() {
            datum.u = Some(0.0);
        }
        Ok(Some(datum))
    }

    /// The SI size of a unit that is named alone.
    pub fn unit(&self, measure: Measure) -> Result<f64, OwnFault> {
        let written = self.text()?;
        let unit = unit_parse::unit(written).map_err(|error| {
            self.fault(Problem::Figure { text: shortened(written), why: error.to_string(), hint: error.hint() })
        })?;
        if unit.dim != measure.dimension() {
            let (what, wanted) = measure.words();
            let found = unit.text.to_string();
            return Err(self.fault(Problem::Unit { text: shortened(written), found, what, wanted }));
        }
        Ok(unit.factor)
    }

    /// A temperature, in kelvin.
    pub fn temperature(&self) -> Result<f64, OwnFault> {
        let Tree::Text(written) = self.tree else {
            return Err(self.sort("a temperature with its unit, such as \"273 K\""));
        };
        let quantity = self.quantity(written)?;
        let what = quantity.kind().what;
        if !what.is_temperature() || what == What::TemperatureDifference {
            let (text, found) = (shortened(written), quantity.unit().text.to_string());
            return Err(self.fault(Problem::Unit { text, found, what: "a temperature", wanted: "K or degC" }));
        }
        if quantity.si() <= 0.0 {
            return Err(self.fault(Problem::Range { why: format!("{} K is no temperature of a table", quantity.si()) }));
        }
        Ok(quantity.si())
    }

    /// A relative standard uncertainty, written `"2 %, k=2"`.
    pub fn relative_u(&self, name: &'static str) -> Result<Option<f64>, OwnFault> {
        let Some(spot) = self.member(name) else { return Ok(None) };
        let Tree::Text(written) = spot.tree else {
            return Err(spot.sort("a share with its meaning, such as \"2 %, k=2\""));
        };
        // Read as the half-width of a value of one unit, so that the meaning is said as everywhere; what was not written is
        // not to be quoted.
        let quantity = text::parse(&format!("1 J ± {written}"), None, 0).map_err(|_| {
            let text = shortened(written);
            let why = format!("`{text}` is no share in % that says what it means");
            spot.fault(Problem::Figure { text, why, hint: SHARE.to_owned() })
        })?;
        let u = quantity.node().input().and_then(|input| input.u);
        match u.filter(|_| written.contains('%')) {
            Some(u) => Ok(Some(u)),
            None => Err(spot.sort("a share with its meaning, such as \"2 %, k=2\"")),
        }
    }
}
