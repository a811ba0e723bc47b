//! Records as their tables have them, one by one: what a seal keeps, and what can stand in place of what is shipped.
//!
//! [`Records`] is the JSON behind a [`Catalog`], cut into the smallest pieces that can be exchanged, each with a digest of
//! its canonical text. The surprise: a record is a text here and no tree, since notebook editors rewrite JSON numbers and
//! leave texts alone.

use std::collections::{BTreeMap, BTreeSet};
use std::fmt::Write as _;
use std::sync::{Arc, LazyLock};

use serde_json::{Map, Value, json};

use crate::chem::element;
use crate::chem::species::SpeciesName;
use crate::source::{Embedded, STDLIB, sha256};

use super::catalog::Catalog;
use super::dataset::TableFault;
use super::{formation, function, names, pressure, tables, transition};

/// Members of a table's head that are for people who open the file, and decide no figure.
const PROSE: [&str; 16] = [
    "notes",
    "note",
    "check_note",
    "about",
    "digits",
    "units",
    "equations",
    "kinds",
    "confirmation_levels",
    "zero",
    "r_note",
    "dhf_note",
    "reference_element_note",
    "atomic_weights",
    "strings",
    "conventions",
];

/// What tells the records of a list apart: the first of these that they have.
const IDS: [&str; 4] = ["id", "symbol", "entity", "name"];

/// Correlation coefficients of several records: a record of their own, told apart by the records it joins.
const GROUPS: &str = "dhf_298_correlations";

static SHIPPED: LazyLock<Arc<Records>> = LazyLock::new(|| {
    Arc::new(Records::read(STDLIB).expect("the shipped tables are read by the tests of the catalogue"))
});

/// One record.
#[derive(Clone, Debug)]
pub struct Record {
    /// The list of its table that it stands in.
    pub list: Arc<str>,
    /// What tells it from others of its list: `CO2(g)`.
    pub id: Arc<str>,
    /// The record's JSON, numbers and all, on one line.
    pub content: Arc<str>,
    pub sha256: Arc<str>,
    /// What it is about, by the names in use where it was read: `CO2`.
    entity: Option<Arc<str>>,
}

/// The records of one table, and what its head says of all of them.
#[derive(Clone, Debug)]
pub struct RecordTable {
    /// The file it was read from.
    pub path: Arc<str>,
    pub schema: Arc<str>,
    /// Id of the dataset; empty for tables that belong to none.
    pub dataset: Arc<str>,
    pub head: Arc<str>,
    pub head_sha256: Arc<str>,
    /// Names of its lists, in their order; a list may have no records here.
    pub lists: Vec<Arc<str>>,
    pub records: Vec<Record>,
}

/// Which record is meant, whatever it says.
#[derive(Clone, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub struct RecordKey {
    pub schema: Arc<str>,
    pub dataset: Arc<str>,
    /// Empty for the head of the table.
    pub list: Arc<str>,
    pub id: Arc<str>,
}

/// Tables, record by record.
#[derive(Clone, Debug, Default)]
pub struct Records {
    pub tables: Vec<RecordTable>,
}

impl Records {
    /// The tables built into the program.
    pub fn shipped() -> Arc<Records> {
        SHIPPED.clone()
    }

    /// Cuts files into records. Every list of objects is a list of records, whatever the schema; files that name no schema
    /// are no tables and are passed over.
    ///
    /// # Errors
    /// A file is no JSON.
    pub fn read(files: &[Embedded<'_>]) -> Result<Records, TableFault> {
        let mut all = Records::default();
        for file in files {
            let Some(schema) = tables::schema(file.bytes) else { continue };
            let unreadable = |why: String| TableFault::Unreadable { path: file.path.to_owned(), why };
            let page: Map<String, Value> =
                serde_json::from_slice(file.bytes).map_err(|error| unreadable(error.to_string()))?;
            let dataset = page.get("dataset").and_then(|dataset| dataset.get("id")).and_then(Value::as_str);
            let (mut head, mut lists, mut records) = (Map::new(), Vec::new(), Vec::new());
            for (name, member) in &page {
                match member {
                    Value::Array(list) if list.iter().all(Value::is_object) => {
                        lists.push(Arc::from(name.as_str()));
                        records.extend(
                            (1..)
                                .zip(list)
                                .map(|(nth, record)| Record::new(name, &id_of(name, nth, record), record.to_string())),
                        );
                    }
                    _ if PROSE.contains(&name.as_str()) => {}
                    _ => drop(head.insert(name.clone(), member.clone())),
                }
            }
            let head = Value::Object(head).to_string();
            all.tables.push(RecordTable {
                path: file.path.into(),
                schema: schema.into(),
                dataset: dataset.unwrap_or("").into(),
                head_sha256: sha256(head.as_bytes()).into(),
                head: head.into(),
                lists,
                records,
            });
        }
        all.name_entities();
        Ok(all)
    }

    /// The catalogue of these records.
    ///
    /// # Errors
    /// A record is not what its schema promises.
    pub fn catalog(&self) -> Result<Catalog, TableFault> {
        let texts: Vec<(&RecordTable, String)> = self.tables.iter().map(|table| (table, table.text())).collect();
        let file = |(table, text): &(&RecordTable, String)| (table.path.clone(), text.clone(), sha256(text.as_bytes()));
        let files: Vec<(Arc<str>, String, String)> = texts.iter().map(file).collect();
        let embedded: Vec<Embedded<'_>> =
            files.iter().map(|(path, text, sha256)| Embedded { path, bytes: text.as_bytes(), sha256 }).collect();
        Catalog::from_files(&embedded)
    }

    /// Says of each record that does not know it which entity it is about.
    fn name_entities(&mut self) {
        let names = self.same_names();
        for table in &mut self.tables {
            for record in table.records.iter_mut().filter(|record| record.entity.is_none()) {
                record.entity = names.entity_of(&table.schema, record).map(Arc::from);
            }
        }
    }

    fn same_names(&self) -> SameNames {
        let mut same = BTreeMap::new();
        for table in self.tables.iter().filter(|table| *table.schema == *names::SCHEMA) {
            for record in table.records.iter().filter(|record| *record.list == *"same") {
                if let Some(is) = record.text_of("is") {
                    same.insert(record.id.to_string(), is);
                }
            }
        }
        SameNames { same }
    }

    /// The records about some entities alone: all their phases, by every dataset. Tables that have none are left out.
    #[must_use]
    pub fn about(&self, entities: &BTreeSet<Arc<str>>) -> Records {
        self.kept(|record| record.entity.as_ref().is_some_and(|entity| entities.contains(entity)))
    }

    fn kept(&self, keep: impl Fn(&Record) -> bool) -> Records {
        let tables = self.tables.iter().filter_map(|table| {
            let records: Vec<Record> = table.records.iter().filter(|record| keep(record)).cloned().collect();
            (!records.is_empty()).then(|| RecordTable { records, ..table.with_head_alone() })
        });
        Records { tables: tables.collect() }
    }

    /// These records, with everything about some entities taken from `sealed` instead: what `sealed` does not have of them
    /// is not there. The heads of its tables hold for their datasets too.
    #[must_use]
    pub fn with_sealed(&self, sealed: &Records, entities: &BTreeSet<Arc<str>>) -> Records {
        let rest = self.kept(|record| record.entity.as_ref().is_none_or(|entity| !entities.contains(entity)));
        // The first description of a dataset is the one that holds.
        Records { tables: sealed.tables.iter().cloned().chain(rest.tables).collect() }
    }

    /// These records with others laid over them: one of the same key takes the place of its namesake, others are added.
    #[must_use]
    pub fn overlaid(&self, over: &Records) -> Records {
        let mut laid = self.clone();
        for (key, record) in over.all() {
            laid.put(&key, Some(&record), over);
        }
        laid.name_entities();
        laid
    }

    /// The same key by the name that the substance goes by here.
    pub fn in_use(&self, key: RecordKey) -> RecordKey {
        match self.same_names().same.get(&*key.id) {
            Some(id) => RecordKey { id: id.as_str().into(), ..key },
            None => key,
        }
    }

    /// These records, with whole tables put in place of those of the same schema and dataset.
    #[must_use]
    pub fn with_tables(&self, others: &Records) -> Records {
        let replaced = |table: &&RecordTable| {
            !others.tables.iter().any(|other| other.schema == table.schema && other.dataset == table.dataset)
        };
        let mut made = Records { tables: self.tables.iter().filter(replaced).cloned().collect() };
        made.tables.extend(others.tables.iter().cloned());
        // What an entity is called is said by the table of names, which the new tables did not have beside them.
        made.tables.iter_mut().flat_map(|table| &mut table.records).for_each(|record| record.entity = None);
        made.name_entities();
        made
    }

    /// Every head and every record, by key. A head is a record of no list.
    pub fn all(&self) -> BTreeMap<RecordKey, Record> {
        let mut all = BTreeMap::new();
        for table in &self.tables {
            let key = |list: &Arc<str>, id: &Arc<str>| RecordKey {
                schema: table.schema.clone(),
                dataset: table.dataset.clone(),
                list: list.clone(),
                id: id.clone(),
            };
            let nowhere: Arc<str> = "".into();
            let head = Record {
                list: nowhere.clone(),
                id: nowhere.clone(),
                content: table.head.clone(),
                sha256: table.head_sha256.clone(),
                entity: None,
            };
            all.insert(key(&nowhere, &nowhere), head);
            for record in &table.records {
                all.insert(key(&record.list, &record.id), record.clone());
            }
        }
        all
    }

    /// Puts one record in, or takes it out with `None`. A table that is not there yet is made like the one of `like`.
    pub fn put(&mut self, key: &RecordKey, record: Option<&Record>, like: &Records) {
        let fits = |table: &&RecordTable| table.schema == key.schema && table.dataset == key.dataset;
        if !self.tables.iter().any(|table| fits(&table)) {
            let Some(like) = like.tables.iter().find(fits).filter(|_| record.is_some()) else { return };
            self.tables.push(like.with_head_alone());
        }
        let names =
            if record.is_some_and(|record| record.entity.is_none()) { like.same_names() } else { SameNames::default() };
        let fits = |table: &&mut RecordTable| table.schema == key.schema && table.dataset == key.dataset;
        let Some(table) = self.tables.iter_mut().find(fits) else { return };
        if key.list.is_empty() {
            if let Some(head) = record {
                (table.head, table.head_sha256) = (head.content.clone(), head.sha256.clone());
            }
            return;
        }
        let at = table.records.iter().position(|known| known.list == key.list && known.id == key.id);
        let record = record.map(|record| Record {
            entity: record.entity.clone().or_else(|| names.entity_of(&key.schema, record).map(Arc::from)),
            ..record.clone()
        });
        match (at, record) {
            (Some(at), Some(record)) => table.records[at] = record,
            (Some(at), None) => drop(table.records.remove(at)),
            (None, Some(record)) => table.records.push(record),
            (None, None) => {}
        }
    }
}

/// Ids that two datasets spell differently.
#[derive(Default)]
struct SameNames {
    same: BTreeMap<String, String>,
}

impl SameNames {
    /// The entity a record is about. A group of records is about the first of them.
    fn entity_of(&self, schema: &str, record: &Record) -> Option<String> {
        let id = match (schema, &*record.list) {
            (names::SCHEMA, "entities") => return Some(record.id.to_string()),
            (names::SCHEMA, _) => record.text_of("is")?,
            (transition::SCHEMA, _) => record.text_of("from")?,
            (element::SCHEMA, _) => return Some(element_entity(&record.id)),
            (_, GROUPS) => record.id.split(", ").next()?.to_owned(),
            _ => record.id.to_string(),
        };
        let id = self.same.get(&id).unwrap_or(&id);
        id.parse::<SpeciesName>().ok().map(|name| name.base)
    }
}

impl Record {
    fn new(list: &str, id: &str, content: String) -> Record {
        let sha256 = sha256(content.as_bytes()).into();
        Record { list: list.into(), id: id.into(), sha256, content: content.into(), entity: None }
    }

    /// A record from its text, as a seal has it; its digest is taken anew.
    pub fn from_text(list: &str, id: &str, content: &str) -> Record {
        Record::new(list, id, content.to_owned())
    }

    fn text_of(&self, member: &str) -> Option<String> {
        let tree: Value = serde_json::from_str(&self.content).ok()?;
        tree.get(member)?.as_str().map(str::to_owned)
    }
}

impl RecordTable {
    fn with_head_alone(&self) -> RecordTable {
        RecordTable {
            path: self.path.clone(),
            schema: self.schema.clone(),
            dataset: self.dataset.clone(),
            head: self.head.clone(),
            head_sha256: self.head_sha256.clone(),
            lists: self.lists.clone(),
            records: Vec::new(),
        }
    }

    /// The table as a file of its schema.
    fn text(&self) -> String {
        // The schema is looked for in the first member.
        let mut text = format!("{{\"schema\":{},", json!(*self.schema));
        if let Ok(Value::Object(head)) = serde_json::from_str::<Value>(&self.head) {
            for (name, value) in head.iter().filter(|(name, _)| *name != "schema") {
                let _ = write!(text, "{}:{value},", json!(name));
            }
        }
        let mut parts = Vec::new();
        for list in &self.lists {
            let records: Vec<&str> =
                self.records.iter().filter(|record| record.list == *list).map(|record| &*record.content).collect();
            parts.push(format!("{}:[{}]", json!(**list), records.join(",")));
        }
        text.push_str(&parts.join(","));
        text.push('}');
        text
    }
}

/// Under which name the atomic weight of an element is kept among what was asked for.
pub fn element_entity(symbol: &str) -> String {
    format!("the element {symbol}")
}

fn id_of(list: &str, nth: usize, record: &Value) -> String {
    if list == GROUPS {
        let ids = record.get("records").and_then(Value::as_array).into_iter().flatten();
        return ids.filter_map(Value::as_str).collect::<Vec<_>>().join(", ");
    }
    let id = IDS.iter().find_map(|key| record.get(*key)?.as_str());
    id.map_or_else(|| format!("record {nth}"), str::to_owned)
}

impl std::fmt::Display for RecordKey {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        let what = match (&*self.schema, &*self.list) {
            (formation::SCHEMA, GROUPS) => "correlation coefficients",
            (formation::SCHEMA, _) => "formation properties",
            (function::SCHEMA, _) => "heat capacity function",
            (transition::SCHEMA, _) => "transition",
            (names::SCHEMA, _) => "names",
            (element::SCHEMA, _) => "atomic weight",
            (pressure::SCHEMA, list) if list == pressure::LISTS[0] => "critical constants",
            (pressure::SCHEMA, list) if list == pressure::LISTS[1] => "second virial coefficient",
            (pressure::SCHEMA, list) if list == pressure::LISTS[2] => "molar volume",
            (pressure::SCHEMA, list) if list == pressure::LISTS[3] => "vapour pressure",
            (schema, "records" | "") => schema.split('/').next().unwrap_or(schema).trim_start_matches("hessbook-"),
            (_, list) => list,
        };
        match (&*self.id, &*self.dataset) {
            ("", "") => write!(f, "head of the table of {what}"),
            ("", dataset) => write!(f, "description of {dataset} ({what})"),
            (id, "") => write!(f, "{what} of {id}"),
            (id, dataset) => write!(f, "{what} of {id} in {dataset}"),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn records_make_the_catalogue_that_the_files_make() {
        let (from_files, from_records) = (Catalog::shipped(), Records::shipped().catalog().unwrap());
        let listed = |catalog: &Catalog| format!("{:?}", catalog.substances().collect::<Vec<_>>());
        assert_eq!(listed(&from_files), listed(&from_records));
        for text in ["methane(g)", "graphite(cr)", "MgO(cr)", "water(l)"] {
            assert_eq!(from_files.find(text).unwrap().id(), from_records.find(text).unwrap().id());
        }
    }

    #[test]
    fn the_records_of_an_entity_are_all_of_its_phases_and_names() {
        let water = Records::shipped().about(&BTreeSet::from(["H2O".into()]));
        let ids: BTreeSet<String> = water.all().keys().map(|key| key.to_string()).collect();
        for expected in [
            "formation properties of H2O(l) in codata-1989",
            "formation properties of H2O(g) in atct-1.112",
            "heat capacity function of H2O(cr,ice-ih) in nasa-tp-2002-211556",
            "critical constants of H2O(g)",
            "second virial coefficient of H2O(g)",
            "molar volume of H2O(l)",
            "names of H2O",
        ] {
            assert!(ids.contains(expected), "{expected} is missing of {ids:#?}");
        }
        assert!(ids.iter().any(|id| id.starts_with("transition of H2O")), "{ids:#?}");
        assert!(!ids.iter().any(|id| id.contains("H2O2")));
    }

    #[test]
    fn an_entity_of_a_seal_is_all_of_it_and_others_stay() {
        let shipped = Records::shipped();
        let entities = BTreeSet::from(["CO".into()]);
        let mut sealed = shipped.about(&entities);
        sealed.tables.retain(|table| *table.dataset != *"atct-1.112");
        let catalog = shipped.with_sealed(&sealed, &entities).catalog().unwrap();
        let datasets = |id: &str| -> Vec<String> {
            catalog.find(id).unwrap().formations.iter().map(|one| one.dataset.to_string()).collect()
        };
        assert_eq!(datasets("CO(g)"), ["codata-1989", "nasa-tp-2002-211556"]);
        assert_eq!(datasets("CO2(g)"), ["atct-1.112", "codata-1989", "nasa-tp-2002-211556"]);
    }

    #[test]
    fn a_record_laid_over_takes_the_place_of_its_namesake() {
        let shipped = Records::shipped();
        let (key, record) = (shipped.all().into_iter())
            .find(|(key, _)| key.to_string() == "formation properties of CO2(g) in atct-1.112")
            .unwrap();
        let revised = record.content.replace("-393.474", "-393.974");
        assert_ne!(*revised, *record.content);
        let mut over = shipped.about(&BTreeSet::from(["CO2".into()]));
        over.put(&key, Some(&Record::from_text(&record.list, &record.id, &revised)), &shipped);
        let laid = shipped.overlaid(&over).catalog().unwrap();
        assert_eq!(laid.find("CO2(g)").unwrap().formations[0].dhf.value, -393_974.0);
        assert_eq!(laid.substances().count(), Catalog::shipped().substances().count());
    }
}
