//! Other names of substances: trivial names, condensed structural formulas, and ids that two datasets spell differently.
//!
//! [`Names`] is one small table, `stdlib/data/names.json`. The surprise: a formula is a name only where it is listed, or
//! where a record is called so; a formula that isomers share never picks one of them.

use std::collections::BTreeMap;
use std::sync::Arc;

use serde::Deserialize;

use crate::source::Embedded;

use super::dataset::{self, TableFault};

#[derive(Debug, Default)]
pub(super) struct Names {
    /// A dataset's id of a substance to the id used here.
    pub same: BTreeMap<Arc<str>, Arc<str>>,
    /// An entity, its preferred name where the records have none, and its other names.
    pub entities: Vec<EntityNames>,
    /// A name that means one crystal form: `graphite`.
    pub forms: BTreeMap<Arc<str>, Arc<str>>,
}

#[derive(Debug)]
pub(super) struct EntityNames {
    pub entity: Arc<str>,
    pub name: Option<Arc<str>>,
    pub names: Vec<Arc<str>>,
}

impl Names {
    /// Entities to their preferred names, where the table has one.
    pub fn preferred(&self) -> BTreeMap<&str, &Arc<str>> {
        self.entities.iter().filter_map(|record| Some((&*record.entity, record.name.as_ref()?))).collect()
    }
}

pub(super) const SCHEMA: &str = "hessbook-names/1";

#[derive(Deserialize)]
struct Page<'a> {
    #[serde(borrow)]
    same: Vec<Same<'a>>,
    #[serde(borrow)]
    entities: Vec<Record<'a>>,
    #[serde(borrow)]
    forms: Vec<Form<'a>>,
}

#[derive(Deserialize)]
struct Same<'a> {
    id: &'a str,
    is: &'a str,
}

#[derive(Deserialize)]
struct Record<'a> {
    entity: &'a str,
    name: Option<&'a str>,
    #[serde(borrow)]
    names: Vec<&'a str>,
}

#[derive(Deserialize)]
struct Form<'a> {
    name: &'a str,
    is: &'a str,
}

/// Adds a file of names.
pub(super) fn read(file: &Embedded<'_>, names: &mut Names) -> Result<(), TableFault> {
    let page: Page<'_> = dataset::parse(file)?;
    names.same.extend(page.same.iter().map(|same| (same.id.into(), same.is.into())));
    names.entities.extend(page.entities.into_iter().map(|record| EntityNames {
        entity: record.entity.into(),
        name: record.name.map(Arc::from),
        names: record.names.into_iter().map(Arc::from).collect(),
    }));
    names.forms.extend(page.forms.iter().map(|form| (form.name.into(), form.is.into())));
    Ok(())
}
