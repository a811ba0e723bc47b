//! A JSON text as it stands, for files that people write: order is kept, and a name given twice is refused.
//!
//! The surprise: the usual reader keeps the last of two members of one name without a word, and a figure that someone
//! corrected by adding a line would be read or not by its place.

use std::fmt;

use serde::de::{Deserialize, Deserializer, Error, MapAccess, SeqAccess, Visitor};

/// A JSON value.
#[derive(Clone, Debug, PartialEq)]
pub enum Tree {
    Null,
    Flag(bool),
    Number(f64),
    Text(String),
    List(Vec<Tree>),
    Object(Vec<(String, Tree)>),
}

impl Tree {
    /// The value of a text.
    ///
    /// # Errors
    /// It is no JSON, or a name stands twice in one object; with line and column.
    pub fn read(text: &[u8]) -> Result<Tree, serde_json::Error> {
        serde_json::from_slice(text)
    }

    /// A member of an object.
    pub fn get(&self, name: &str) -> Option<&Tree> {
        match self {
            Tree::Object(members) => members.iter().find(|(known, _)| known == name).map(|(_, value)| value),
            _ => None,
        }
    }

    /// What it is, for messages: `the number 5`.
    pub fn words(&self) -> String {
        match self {
            Tree::Null => "null".to_owned(),
            Tree::Flag(flag) => flag.to_string(),
            Tree::Number(number) => format!("the number {number}"),
            Tree::Text(text) => format!("the text \"{}\"", shortened(text)),
            Tree::List(_) => "a list".to_owned(),
            Tree::Object(_) => "an object".to_owned(),
        }
    }
}

/// A text of someone else's, so far as a message shows it.
pub fn shortened(text: &str) -> String {
    const MOST: usize = 60;
    match text.char_indices().nth(MOST) {
        Some((at, _)) => format!("{}…", &text[..at]),
        None => text.to_owned(),
    }
}

impl<'de> Deserialize<'de> for Tree {
    fn deserialize<D: Deserializer<'de>>(from: D) -> Result<Tree, D::Error> {
        from.deserialize_any(Reader)
    }
}

struct Reader;

impl<'de> Visitor<'de> for Reader {
    type Value = Tree;

    fn expecting(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str("a JSON value")
    }

    fn visit_unit<E: Error>(self) -> Result<Tree, E> {
        Ok(Tree::Null)
    }

    fn visit_bool<E: Error>(self, flag: bool) -> Result<Tree, E> {
        Ok(Tree::Flag(flag))
    }

    fn visit_f64<E: Error>(self, number: f64) -> Result<Tree, E> {
        Ok(Tree::Number(number))
    }

    fn visit_i64<E: Error>(self, number: i64) -> Result<Tree, E> {
        Ok(Tree::Number(number as f64))
    }

    fn visit_u64<E: Error>(self, number: u64) -> Result<Tree, E> {
        Ok(Tree::Number(number as f64))
    }

    fn visit_str<E: Error>(self, text: &str) -> Result<Tree, E> {
        Ok(Tree::Text(text.to_owned()))
    }

    fn visit_seq<A: SeqAccess<'de>>(self, mut items: A) -> Result<Tree, A::Error> {
        let mut list = Vec::new();
        while let Some(item) = items.next_element()? {
            list.push(item);
        }
        Ok(Tree::List(list))
    }

    fn visit_map<A: MapAccess<'de>>(self, mut members: A) -> Result<Tree, A::Error> {
        let mut object: Vec<(String, Tree)> = Vec::new();
        while let Some(name) = members.next_key::<String>()? {
            if object.iter().any(|(known, _)| *known == name) {
                return Err(A::Error::custom(format!("`{}` stands twice in one object", shortened(&name))));
            }
            let value = members.next_value()?;
            object.push((name, value));
        }
        Ok(Tree::Object(object))
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn order_is_kept_and_a_name_given_twice_is_refused_where_it_stands() {
        let tree = Tree::read(br#"{"b": [1, "x", null], "a": true}"#).unwrap();
        let Tree::Object(members) = &tree else { panic!("{tree:?}") };
        assert_eq!(members.iter().map(|(name, _)| name.as_str()).collect::<Vec<_>>(), ["b", "a"]);
        let error = Tree::read(b"{\n \"a\": 1,\n \"a\": 2}").unwrap_err();
        assert_eq!(error.line(), 3);
        assert!(error.to_string().contains("`a` stands twice"), "{error}");
    }

    #[test]
    fn depth_and_size_have_an_end() {
        assert!(Tree::read("[".repeat(100_000).as_bytes()).is_err());
        assert!(Tree::read(b"1e999").is_err());
    }
}
