//! Values that closures share with the session: found, saved before a cell, written back when it fails.
//!
//! A captured variable is one value behind several handles, so a copy of the variables copies handles and a failed
//! cell would leave its changes behind. [`SharedValues`] holds each handle with what was in it. The surprise: cutting
//! the link instead (giving the copy a value of its own) would be wrong, since the closure must go on seeing later
//! changes of the variable.

use std::collections::BTreeSet;

use rhai::{Array, Dynamic, FnPtr, Map};

use crate::script::words;

/// Every shared value that can be reached from some values, each with its content.
#[derive(Default)]
pub struct SharedValues {
    saved: Vec<(Dynamic, Dynamic)>,
    /// Addresses of contents already saved: closures can hold themselves.
    seen: BTreeSet<usize>,
    /// Names of the closures met on the way.
    closures: BTreeSet<String>,
}

impl SharedValues {
    /// Walks arrays, maps and captured values, from each of `values` down.
    pub fn of<'a>(values: impl IntoIterator<Item = &'a Dynamic>) -> Self {
        let mut found = SharedValues::default();
        for value in values {
            found.walk(value);
        }
        found
    }

    fn walk(&mut self, value: &Dynamic) {
        if !value.is_shared() {
            self.walk_content(value);
            return;
        }
        let Some(content) = value.read_lock::<Dynamic>() else { return };
        if self.seen.insert(std::ptr::from_ref::<Dynamic>(&content) as usize) {
            self.saved.push((value.clone(), content.clone()));
            self.walk_content(&content);
        }
    }

    fn walk_content(&mut self, value: &Dynamic) {
        if let Some(array) = value.read_lock::<Array>() {
            array.iter().for_each(|item| self.walk(item));
        } else if let Some(map) = value.read_lock::<Map>() {
            map.values().for_each(|item| self.walk(item));
        } else if let Some(function) = value.read_lock::<FnPtr>() {
            if words::is_closure(function.fn_name()) {
                self.closures.insert(function.fn_name().to_owned());
            }
            function.iter_curry().for_each(|captured| self.walk(captured));
        }
    }

    /// Names of the closures that the values hold, wherever they lie.
    pub fn closures(&self) -> &BTreeSet<String> {
        &self.closures
    }

    /// Writes every content back through its handle.
    pub fn restore(self) {
        for (mut handle, content) in self.saved {
            if let Some(mut place) = handle.write_lock::<Dynamic>() {
                *place = content;
            }
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn shared_values_are_found_in_arrays_maps_and_captures_and_written_back() {
        let shared = Dynamic::from(1_i64).into_shared();
        let mut closure = FnPtr::new("f").unwrap();
        closure.add_curry(shared.clone());
        let nested = Dynamic::from_array(vec![Dynamic::from(closure)]);
        let mut map = Map::new();
        map.insert("a".into(), nested);
        let root = Dynamic::from_map(map);

        let saved = SharedValues::of([&root]);
        let mut handle = shared.clone();
        *handle.write_lock::<i64>().unwrap() = 77;
        assert_eq!(shared.as_int(), Ok(77));
        saved.restore();
        assert_eq!(shared.as_int(), Ok(1));
    }

    #[test]
    fn a_closure_that_holds_itself_is_walked_once() {
        let mut shared = Dynamic::from(0_i64).into_shared();
        let mut closure = FnPtr::new("f").unwrap();
        closure.add_curry(shared.clone());
        *shared.write_lock::<Dynamic>().unwrap() = Dynamic::from(closure);
        let saved = SharedValues::of([&shared]);
        assert_eq!(saved.saved.len(), 1);
        // The ring is opened, or it would never be freed.
        *shared.write_lock::<Dynamic>().unwrap() = Dynamic::UNIT;
    }
}
