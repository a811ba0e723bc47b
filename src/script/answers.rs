//! Parts of answers that are there to be read, for scripts that want to go on with them.
//!
//! `compare(a, b).difference` is a value with its history, `.k` and `.verdict` say how far apart the two are, and
//! `explain_gap(a, b).fits` is a list of maps, best first. The surprise: what an answer lacks is refused by name, not given
//! as nothing.

use rhai::{Array, Dynamic, Engine, Map, NativeCallContext};

use crate::fault::{Explain, Fault};
use crate::model::account::Account;
use crate::model::compare::Comparison;
use crate::model::gap::{Fit, Gap};
use crate::script::bind::Native;
use crate::script::fault::raise;
use crate::script::state::place_of;
use crate::units::Unit;

/// A part that an answer does not have.
#[derive(Clone, Debug, thiserror::Error)]
#[error("{sort} has no `{part}`")]
struct NoSuchPart {
    sort: &'static str,
    part: &'static str,
    has: &'static str,
}

impl Explain for NoSuchPart {
    fn code(&self) -> &'static str {
        "answer-part-missing"
    }

    fn hint(&self) -> String {
        match self.has {
            "" => "it is there to be read: let it be the last value of a cell, or `print` it".to_owned(),
            has => format!("it has {has}"),
        }
    }
}

/// The names of an answer's parts, for hints.
fn parts(account: &Account) -> &'static str {
    match account {
        Account::Derivation(_) => "",
        Account::Comparison(_) => "`.difference`, `.k` and `.verdict`",
        Account::Gap(_) => "`.fits`",
    }
}

/// Registers the parts.
pub fn register(engine: &mut Engine) {
    type Part = fn(&Comparison) -> Dynamic;
    let of_comparison: [(&'static str, Part); 3] = [
        ("difference", |comparison| Dynamic::from(comparison.difference.clone())),
        ("k", |comparison| comparison.k.map_or(Dynamic::UNIT, Dynamic::from_float)),
        ("verdict", |comparison| comparison.sentence().into()),
    ];
    for (part, of) in of_comparison {
        engine.register_get(part, move |context: NativeCallContext<'_>, account: &mut Account| match account {
            Account::Comparison(comparison) => Ok(of(comparison)),
            other => refused(&context, other, part),
        });
    }
    engine.register_get("fits", |context: NativeCallContext<'_>, account: &mut Account| match account {
        Account::Gap(gap) => Ok(Dynamic::from_array(gap.fits.iter().map(|fit| fit_map(gap, fit)).collect::<Array>())),
        other => refused(&context, other, "fits"),
    });
}

fn refused(context: &NativeCallContext<'_>, account: &Account, part: &'static str) -> Native<Dynamic> {
    let missing = NoSuchPart { sort: account.sort(), part, has: parts(account) };
    Err(raise(Fault::from(missing).at(place_of(context))))
}

/// Numbers are bare, in the unit of the first value, so that they can be sorted and tested.
fn fit_map(gap: &Gap, fit: &Fit) -> Dynamic {
    let unit = gap.a.unit();
    let factor = if Unit::is_point(&unit) { 1.0 } else { unit.factor };
    let mut map = Map::new();
    map.insert("id".into(), fit.told.mistake.id().into());
    map.insert("words".into(), fit.told.words.clone().into());
    map.insert("value".into(), if fit.told.in_first { "a" } else { "b" }.into());
    map.insert("predicted".into(), Dynamic::from_float(fit.predicted / factor));
    map.insert("residual".into(), Dynamic::from_float(fit.residual / factor));
    map.insert("chance".into(), Dynamic::from_float(fit.chance));
    let sources: Array = fit.sources.iter().map(|source| source.to_string().into()).collect();
    map.insert("sources".into(), sources.into());
    Dynamic::from_map(map)
}
