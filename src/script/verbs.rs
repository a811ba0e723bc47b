//! What an analyst says in a notebook beside computing: report, parameter, justify, tolerate, require, assumptions.
//!
//! These change the session's own state, which a failed cell takes back. The surprise: deciding about an assumption
//! changes the result where it was shown, so that a notebook's page and its records never lag behind the decision.

use std::cell::Cell;
use std::rc::Rc;

use rhai::{Dynamic, Engine, FnPtr, FuncRegistration, ImmutableString, NativeCallContext};

use crate::fault::{Explain, Fault};
use crate::model::card::{self, Cx, Value};
use crate::model::quantities;
use crate::model::quantities::PointForDifference;
use crate::model::review::{Dealing, Decided};
use crate::quantity::{Quantity, text};
use crate::render::report::{Assumption, Report};
use crate::render::{Bundle, register as register_view};
use crate::script::bind::{Native, to_value, with_context};
use crate::script::show;
use crate::script::state::{Parameter, Reported, Shared, place_of};
use crate::units::What;

/// A verb as help shows it.
pub struct Verb {
    pub name: &'static str,
    pub signature: &'static str,
    pub doc: &'static str,
}

/// The verbs, in the order help lists them.
pub const VERBS: &[Verb] = &[
    Verb {
        name: "report",
        signature: "report(label, value)",
        doc: "Makes a value a reported result: tests its assumptions and shows it with conditions, prices and sources. \
              A label is used once in a notebook.",
    },
    Verb {
        name: "parameter",
        signature: "parameter(name, value)",
        doc: "Declares an input that `hessbook run --set name=text` may override; gives the value in force.",
    },
    Verb {
        name: "justify",
        signature: "justify(id, label, reason) or justify(id, label, reason, about)",
        doc: "Leaves a result as it is in spite of an assumption, for a reason that is kept with it.",
    },
    Verb {
        name: "tolerate",
        signature: "tolerate(id, label, limit) or tolerate(id, label, limit, about)",
        doc: "Sets how large the price of an assumption may be for one result.",
    },
    Verb {
        name: "display",
        signature: "display(value)",
        doc: "Shows a value at once, in the middle of a cell, as the cell's last value is shown.",
    },
    Verb {
        name: "read_csv",
        signature: "read_csv(file) or read_csv(file, source)",
        doc: "Reads a table of figures from a file beside the notebook: comma-separated values whose first line names each \
              column with its unit, `T / K,Cp / (J/(K mol[CH4])),u(Cp) / (J/(K mol[CH4]))`. A second text names the source.",
    },
    Verb {
        name: "write_csv",
        signature: "write_csv(curves, file)",
        doc: "Writes a curve, a list of curves, or a map from names to curves to a file beside the notebook, with units and \
              standard uncertainties; `read_csv` reads it back.",
    },
    Verb {
        name: "dataset",
        signature: "dataset(file)",
        doc: "Loads records of one's own from a JSON file beside the notebook, and shows what they stand before.",
    },
    Verb {
        name: "assumptions",
        signature: "assumptions()",
        doc: "Shows the register: every reported result with its assumptions.",
    },
    Verb {
        name: "require",
        signature: "require(condition, text)",
        doc: "Makes the notebook fail, with this text, where the condition does not hold.",
    },
];

/// Functions that are no formulas and have no card: how figures are typed, and the mathematics of cells.
pub const FUNCTIONS: &[Verb] = &[
    Verb {
        name: "q",
        signature: "q(text) or q(text, source)",
        doc: "A quantity as written in print, `q(\"-285.830(20) kJ/mol[H2O]\")`: number, standard uncertainty of the last \
              digits in brackets or ± with what it means, unit. A second text names the source of the figure.",
    },
    Verb {
        name: "exact",
        signature: "exact(text)",
        doc: "A figure without uncertainty, by definition or by counting: `exact(\"2 mol[H2]/mol[O2]\")`.",
    },
    Verb { name: "abs", signature: "abs(x)", doc: "The size of a number, a quantity or each value of a curve." },
    Verb {
        name: "exp",
        signature: "exp(x)",
        doc: "The exponential function of a number, of a quantity of dimension 1, or of a curve of such.",
    },
    Verb {
        name: "ln",
        signature: "ln(x)",
        doc: "The natural logarithm of a positive number, of a positive quantity of dimension 1, or of a curve of such.",
    },
    Verb {
        name: "sqrt",
        signature: "sqrt(x)",
        doc: "The square root of a number or a quantity, which halves its units.",
    },
    Verb { name: "sin", signature: "sin(x)", doc: "The sine of a number in radians or of an angle." },
    Verb { name: "cos", signature: "cos(x)", doc: "The cosine of a number in radians or of an angle." },
    Verb { name: "tan", signature: "tan(x)", doc: "The tangent of a number in radians or of an angle." },
];

/// Something made only to be shown, such as the register.
#[derive(Clone)]
pub struct Display(pub Rc<Bundle>);

/// Why a verb is refused.
#[derive(Clone, Debug, thiserror::Error)]
enum VerbError {
    #[error("`{label}` is reported already, by {by}")]
    LabelTaken { label: String, by: String },
    #[error("a report needs a label")]
    EmptyLabel,
    #[error("nothing is reported as `{label}`")]
    UnknownLabel { label: String, known: Vec<String> },
    #[error("`{label}` rests on no assumption `{id}`")]
    UnknownRow { label: String, id: String, known: Vec<String> },
    #[error("`{label}` has {count} assumptions `{id}`: {subjects}")]
    SeveralRows { label: String, id: String, count: usize, subjects: String },
    #[error("a justification of `{id}` needs a reason")]
    NoReason { id: String },
    #[error("{text}")]
    Requirement { text: String },
    #[error("`report` wants a quantity, not {given}")]
    NotAQuantity { given: String },
    #[error("`report` takes one value, and a curve over {extent} is many")]
    Curve { extent: String },
    #[error("the parameter `{name}` is declared twice")]
    ParameterTwice { name: String },
    #[error("the parameter `{name}` was set to a value in {given} and is declared in {declared}")]
    ParameterUnit { name: String, given: String, declared: String },
    #[error("the parameter `{name}` was set to `{given}`, which is no number")]
    ParameterNumber { name: String, given: String },
    #[error("the limit of `{id}` is not positive")]
    LimitNotPositive { id: String },
    #[error("`{id}` of `{label}` has no price that a limit could be set for")]
    NothingToTolerate { id: String, label: String },
    #[error("the limit of `{id}` is given in {given}, and `{label}` is in {unit}")]
    LimitUnit { id: String, given: String, label: String, unit: String },
}

impl Explain for VerbError {
    fn code(&self) -> &'static str {
        match self {
            VerbError::LabelTaken { .. } => "label-taken",
            VerbError::EmptyLabel => "label-empty",
            VerbError::UnknownLabel { .. } => "label-unknown",
            VerbError::UnknownRow { .. } => "assumption-unknown",
            VerbError::SeveralRows { .. } => "assumption-not-one",
            VerbError::NoReason { .. } => "reason-missing",
            VerbError::Requirement { .. } => "requirement-failed",
            VerbError::NotAQuantity { .. } => "report-not-a-quantity",
            VerbError::Curve { .. } => "report-of-a-curve",
            VerbError::ParameterTwice { .. } => "parameter-twice",
            VerbError::ParameterUnit { .. } => "parameter-unit",
            VerbError::ParameterNumber { .. } => "parameter-not-a-number",
            VerbError::LimitUnit { .. } => "limit-unit",
            VerbError::LimitNotPositive { .. } => "limit-not-positive",
            VerbError::NothingToTolerate { .. } => "nothing-to-tolerate",
        }
    }

    fn hint(&self) -> String {
        let listed = |known: &[String]| known.iter().map(|one| format!("`{one}`")).collect::<Vec<_>>().join(", ");
        match self {
            VerbError::LabelTaken { .. } => {
                "give this result a label of its own; labels pair results in an audit".to_owned()
            }
            VerbError::EmptyLabel => {
                "name what the value is, as in `report(\"shift enthalpy at outlet\", dH)`".to_owned()
            }
            VerbError::UnknownLabel { known, .. } if known.is_empty() => {
                "report the value first, then decide about it".to_owned()
            }
            VerbError::UnknownLabel { known, .. } => format!("reported so far: {}", listed(known)),
            VerbError::UnknownRow { known, .. } if known.is_empty() => {
                "it rests on none; nothing needs to be said".to_owned()
            }
            VerbError::UnknownRow { known, .. } => format!("it rests on {}", listed(known)),
            VerbError::SeveralRows { .. } => "name the one that is meant as a fourth argument".to_owned(),
            VerbError::NoReason { .. } => "say in words why the value may stay as it is".to_owned(),
            VerbError::Requirement { .. } => "the notebook asks for this on purpose; see the text".to_owned(),
            VerbError::NotAQuantity { .. } => "give the number a unit, as in `q(\"1.5 kJ/mol\")`".to_owned(),
            VerbError::Curve { .. } => {
                "report the value that is used, as in `report(label, curve.at(\"450 degC\"))`: its assumptions are tested \
                 at its temperature; `display(curve)` shows the whole"
                    .to_owned()
            }
            VerbError::ParameterTwice { .. } => "declare it in one place and use the variable elsewhere".to_owned(),
            VerbError::ParameterUnit { declared, .. } => {
                format!("set it in a unit of the same dimension, such as {declared}")
            }
            VerbError::ParameterNumber { .. } => "set it to a plain number".to_owned(),
            VerbError::LimitNotPositive { .. } => "give the largest size a price may have, without a sign".to_owned(),
            VerbError::NothingToTolerate { .. } => {
                "say why the value may stay, with `justify(id, label, reason)`".to_owned()
            }
            VerbError::LimitUnit { unit, .. } => format!("give the limit in {unit}"),
        }
    }
}

/// Registers the verbs.
pub fn register(engine: &mut Engine, shared: &Shared) {
    engine.register_type_with_name::<Display>("display");
    let add = |name: &'static str| {
        let doc = VERBS.iter().find(|verb| verb.name == name).map_or("", |verb| verb.doc);
        FuncRegistration::new(name).with_comments([format!("/// {doc}")])
    };
    let verb = Verbs { shared: shared.clone() };

    let v = verb.clone();
    add("report").register_into_engine(
        engine,
        move |c: NativeCallContext<'_>, label: ImmutableString, value: Dynamic| {
            v.within(&c, |cx| v.report(cx, &label, &value))
        },
    );
    let v = verb.clone();
    // The price computed by a closure that gives the better value; a price that is a quantity or a text is the card's.
    engine.register_fn(
        "assume",
        move |c: NativeCallContext<'_>,
              value: Quantity,
              id: ImmutableString,
              claim: ImmutableString,
              better: FnPtr|
              -> Native<Quantity> {
            let better = better.call_within_context::<Dynamic>(&c, ())?;
            v.within(&c, |cx| {
                let price = value.minus(&quantity_of(cx, &better)?, cx.place.clone())?;
                let [id, claim] = [id, claim].map(|text| Value::Text(text.as_str().into()));
                let args = vec![Value::Quantity(value), id, claim, Value::Quantity(price)];
                match card::call(cx, &quantities::ASSUME, args)? {
                    Value::Quantity(value) => Ok(value),
                    other => unreachable!("assume gives a quantity, not {}", other.sort()),
                }
            })
        },
    );
    let v = verb.clone();
    add("parameter").register_into_engine(
        engine,
        move |c: NativeCallContext<'_>, name: ImmutableString, value: Dynamic| {
            v.within(&c, |cx| v.parameter(cx, &name, &value))
        },
    );
    let v = verb.clone();
    add("justify").register_into_engine(
        engine,
        move |c: NativeCallContext<'_>, id: ImmutableString, label: ImmutableString, reason: ImmutableString| {
            v.within(&c, |cx| v.justify(cx, &id, &label, &reason, None))
        },
    );
    let v = verb.clone();
    add("justify").register_into_engine(
        engine,
        move |c: NativeCallContext<'_>,
              id: ImmutableString,
              label: ImmutableString,
              reason: ImmutableString,
              about: ImmutableString| { v.within(&c, |cx| v.justify(cx, &id, &label, &reason, Some(&about))) },
    );
    let v = verb.clone();
    add("tolerate").register_into_engine(
        engine,
        move |c: NativeCallContext<'_>, id: ImmutableString, label: ImmutableString, limit: Dynamic| {
            v.within(&c, |cx| v.tolerate(cx, &id, &label, &limit, None))
        },
    );
    let v = verb.clone();
    add("tolerate").register_into_engine(
        engine,
        move |c: NativeCallContext<'_>,
              id: ImmutableString,
              label: ImmutableString,
              limit: Dynamic,
              about: ImmutableString| { v.within(&c, |cx| v.tolerate(cx, &id, &label, &limit, Some(&about))) },
    );
    let shown = shared.clone();
    add("display").register_into_engine(engine, move |value: Dynamic| shown.show(&show::bundle_of(&value), None));
    let v = verb.clone();
    add("assumptions").register_into_engine(engine, move |c: NativeCallContext<'_>| {
        v.within(&c, |_| Ok(Display(Rc::new(register_view::bundle(&reports(&v.shared))))))
    });
    let v = verb;
    add("require").register_into_engine(
        engine,
        move |c: NativeCallContext<'_>, condition: bool, text: ImmutableString| {
            v.within(&c, |_| {
                if condition { Ok(()) } else { Err(Fault::from(VerbError::Requirement { text: text.to_string() })) }
            })
        },
    );
}

/// Every report of the session so far, with the decisions in force.
pub fn reports(shared: &Shared) -> Vec<Report> {
    let (state, ordinal) = (shared.state(), Cell::new(0));
    // Reviewing reads nothing as typed, so no numbers are given out.
    let halted = || shared.halted().map(Fault::from);
    let references = shared.references();
    let cx = &Cx { references: &references, place: None, ordinal: &ordinal, halted: &halted };
    state.reports.iter().map(|one| Report::of(cx, &one.label, &one.value, &state.dealings)).collect()
}

#[derive(Clone)]
struct Verbs {
    shared: Shared,
}

impl Verbs {
    fn within<T>(&self, context: &NativeCallContext<'_>, work: impl FnOnce(&Cx) -> Result<T, Fault>) -> Native<T> {
        with_context(&self.shared, place_of(context), work)
    }

    fn report(&self, cx: &Cx, label: &str, value: &Dynamic) -> Result<(), Fault> {
        let value = match to_value(value) {
            Value::Quantity(value) => value,
            Value::Curve(curve) => return Err(VerbError::Curve { extent: curve.grid().words() }.into()),
            other => return Err(VerbError::NotAQuantity { given: other.sort().to_owned() }.into()),
        };
        if label.trim().is_empty() {
            return Err(VerbError::EmptyLabel.into());
        }
        let cell = self.shared.state().cell.clone();
        // What this cell reported before it was run again is gone when it begins, so a label found here is taken.
        let taken = self.shared.state().reports.iter().find(|one| one.label == label).map(|one| Rc::clone(&one.cell));
        if let Some(by) = taken {
            return Err(VerbError::LabelTaken { label: label.to_owned(), by: by.to_string() }.into());
        }
        let one = Reported { label: label.to_owned(), value, cell };
        self.shared.state_mut().reports.push(one);
        self.shared.show(&self.reviewed(cx, label)?.bundle(), Some(&display_id(label)));
        Ok(())
    }

    fn reviewed(&self, cx: &Cx, label: &str) -> Result<Report, Fault> {
        let state = self.shared.state();
        let Some(one) = state.reports.iter().find(|one| one.label == label) else {
            let known = state.reports.iter().map(|one| one.label.clone()).collect();
            return Err(VerbError::UnknownLabel { label: label.to_owned(), known }.into());
        };
        Ok(Report::of(cx, label, &one.value, &state.dealings))
    }

    /// The one row that an id, and a subject where one is given, mean.
    fn row(&self, cx: &Cx, id: &str, label: &str, about: Option<&str>) -> Result<Assumption, Fault> {
        let report = self.reviewed(cx, label)?;
        let rows: Vec<&Assumption> = report.record.assumptions.iter().filter(|row| row.id == id).collect();
        let meant: Vec<&Assumption> =
            rows.iter().copied().filter(|row| about.is_none_or(|about| row.subject.contains(about))).collect();
        // One species may stand alone in one row and among others in another.
        let exact: Vec<&Assumption> = meant.iter().copied().filter(|row| about == Some(&*row.subject)).collect();
        let meant = if exact.is_empty() { meant } else { exact };
        match meant.as_slice() {
            [row] => Ok((*row).clone()),
            [] => {
                let mut known: Vec<String> = report.record.assumptions.iter().map(|row| row.id.clone()).collect();
                known.dedup();
                Err(VerbError::UnknownRow { label: label.to_owned(), id: id.to_owned(), known }.into())
            }
            several => {
                let subjects = several.iter().map(|row| row.subject.clone()).collect::<Vec<_>>().join("; ");
                Err(VerbError::SeveralRows {
                    label: label.to_owned(),
                    id: id.to_owned(),
                    count: several.len(),
                    subjects,
                }
                .into())
            }
        }
    }

    fn decide(&self, cx: &Cx, id: &str, label: &str, about: Option<&str>, decided: Decided) -> Result<(), Fault> {
        let row = self.row(cx, id, label, about)?;
        let cell = self.shared.state().cell.to_string();
        let dealing = Dealing { id: row.id, label: label.to_owned(), subject: row.subject, cell, decided };
        self.shared.state_mut().dealings.push(dealing);
        self.shared.update(&self.reviewed(cx, label)?.bundle(), &display_id(label));
        Ok(())
    }

    fn justify(&self, cx: &Cx, id: &str, label: &str, reason: &str, about: Option<&str>) -> Result<(), Fault> {
        if reason.trim().is_empty() {
            return Err(VerbError::NoReason { id: id.to_owned() }.into());
        }
        self.decide(cx, id, label, about, Decided::Justified { reason: reason.to_owned() })
    }

    fn tolerate(&self, cx: &Cx, id: &str, label: &str, limit: &Dynamic, about: Option<&str>) -> Result<(), Fault> {
        let limit = quantity_of(cx, limit)?;
        if limit.kind().what == What::TemperaturePoint {
            return Err(PointForDifference { function: "tolerate", t_k: limit.si() }.into());
        }
        if limit.si() <= 0.0 {
            return Err(VerbError::LimitNotPositive { id: id.to_owned() }.into());
        }
        if self.row(cx, id, label, about)?.price.is_none() {
            return Err(VerbError::NothingToTolerate { id: id.to_owned(), label: label.to_owned() }.into());
        }
        let (unit, dim) = {
            let state = self.shared.state();
            let value = state.reports.iter().find(|one| one.label == label).map(|one| one.value.clone());
            drop(state);
            match value {
                Some(value) => (value.unit().text.to_string(), value.dim().clone()),
                None => return self.reviewed(cx, label).map(|_| ()),
            }
        };
        if limit.dim() != &dim && limit.dim().bindings_to(&dim).len() != 1 {
            let given = limit.unit().text.to_string();
            return Err(VerbError::LimitUnit { id: id.to_owned(), given, label: label.to_owned(), unit }.into());
        }
        let decided = Decided::Tolerated { limit_si: limit.si().abs(), written: text::shown_plain(&limit) };
        self.decide(cx, id, label, about, decided)
    }

    fn parameter(&self, cx: &Cx, name: &str, declared: &Dynamic) -> Result<Dynamic, Fault> {
        let cell = self.shared.state().cell.clone();
        let twice = self.shared.state().parameters.iter().any(|known| known.name == name);
        if twice {
            return Err(VerbError::ParameterTwice { name: name.to_owned() }.into());
        }
        let set = self.shared.setting(name);
        let (value, written) = match to_value(declared) {
            Value::Number(default) => {
                let number = match &set {
                    None => default,
                    Some(set) => {
                        set.trim().parse().ok().filter(|number: &f64| number.is_finite()).ok_or_else(|| {
                            Fault::from(VerbError::ParameterNumber { name: name.to_owned(), given: set.clone() })
                        })?
                    }
                };
                (Dynamic::from_float(number), number.to_string())
            }
            _ => {
                let default = quantity_of(cx, declared)?;
                let value = match &set {
                    None => default.clone(),
                    Some(set) => text::parse(set, cx.place.clone(), cx.next_ordinal())?,
                };
                if value.dim() != default.dim() {
                    let (given, declared) = (value.unit().text.to_string(), default.unit().text.to_string());
                    return Err(VerbError::ParameterUnit { name: name.to_owned(), given, declared }.into());
                }
                let written = text::shown_plain(&value);
                (Dynamic::from(value), written)
            }
        };
        let parameter = Parameter { name: name.to_owned(), written, set: set.is_some(), cell };
        self.shared.state_mut().parameters.push(parameter);
        Ok(value)
    }
}

/// Under which id a report is shown, so that a later decision changes it where it stands.
fn display_id(label: &str) -> String {
    format!("report: {label}")
}

fn quantity_of(cx: &Cx, value: &Dynamic) -> Result<Quantity, Fault> {
    match to_value(value) {
        Value::Quantity(value) => Ok(value),
        Value::Text(written) => Ok(text::parse(&written, cx.place.clone(), cx.next_ordinal())?),
        other => Err(VerbError::NotAQuantity { given: other.sort().to_owned() }.into()),
    }
}
