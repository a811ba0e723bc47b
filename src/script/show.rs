//! Values as text: what a cell shows, what `print` writes, and what stands inside arrays and maps.
//!
//! [`bundle_of`] makes a cell's output of its last value. Numbers are written with the fewest digits that read back
//! to the same bits. The one surprise: a text alone is shown in quotes, so that `"5"` and `5` differ on the page.

use std::any::TypeId;
use std::ops::{Range, RangeInclusive};
use std::rc::Rc;

use rhai::{Array, Blob, Dynamic, Engine, FnPtr, ImmutableString, Map};

use crate::fault::Fault;
use crate::model::answer::Answer;
use crate::model::curve::Curve;
use crate::model::grid::Grid;
use crate::model::molecule::Molecule;
use crate::model::plant::stream::Stream;
use crate::model::reaction::Reaction;
use crate::model::solid::Crystal;
use crate::model::substance::PureSubstance;
use crate::model::table::Table;
use crate::quantity::Quantity;
use crate::render::{self, Bundle};
use crate::script::verbs::Display;
use crate::script::words;

/// Columns up to which an array or map stays on one line.
const WIDTH: usize = 100;
/// Entries of one array or map that a cell shows; `print` writes all.
const ENTRIES: usize = 100;

/// A value of ours, as people see it; `None` for the engine's own kinds. Types of the library are added here.
fn own(value: &Dynamic) -> Option<Bundle> {
    if let Some(quantity) = value.read_lock::<Quantity>() {
        return Some(render::quantity(&quantity));
    }
    if let Some(answer) = value.read_lock::<Answer>() {
        return Some(render::answer(&answer));
    }
    if let Some(curve) = value.read_lock::<Rc<Curve>>() {
        return Some(render::curve::bundle(&curve));
    }
    if let Some(table) = value.read_lock::<Rc<Table>>() {
        return Some(render::table::bundle(&table));
    }
    if let Some(grid) = value.read_lock::<Rc<Grid>>() {
        return Some(Bundle::text(grid.words()));
    }
    if let Some(display) = value.read_lock::<Display>() {
        return Some((*display.0).clone());
    }
    if let Some(reaction) = value.read_lock::<Rc<Reaction>>() {
        return Some(render::reaction(&reaction));
    }
    if let Some(substance) = value.read_lock::<Rc<PureSubstance>>() {
        return Some(render::substance(&substance));
    }
    if let Some(stream) = value.read_lock::<Rc<Stream>>() {
        return Some(render::balance::stream(&stream));
    }
    if let Some(molecule) = value.read_lock::<Rc<Molecule>>() {
        return Some(render::molecule::bundle(&molecule));
    }
    if let Some(crystal) = value.read_lock::<Rc<Crystal>>() {
        return Some(render::molecule::crystal(&crystal));
    }
    value.read_lock::<Fault>().map(|fault| Bundle::text(fault.to_string()))
}

/// What a cell shows of its last value.
pub fn bundle_of(value: &Dynamic) -> Bundle {
    own(value).unwrap_or_else(|| Bundle::text(laid_out(value, 0)))
}

/// A value in one line, as it stands inside an array: texts in quotes.
pub fn inline(value: &Dynamic) -> String {
    if let Some(quantity) = value.read_lock::<Quantity>() {
        return render::text::value(&quantity);
    }
    if let Some(own) = own(value) {
        return own.plain().to_owned();
    }
    let entries = |open: &str, parts: Vec<String>, close: &str| format!("{open}{}{close}", parts.join(", "));
    if let Some(array) = value.read_lock::<Array>() {
        return entries("[", array.iter().map(inline).collect(), "]");
    }
    if let Some(map) = value.read_lock::<Map>() {
        return entries(
            "#{",
            map.iter().map(|(key, value)| format!("{}: {}", key_text(key), inline(value))).collect(),
            "}",
        );
    }
    scalar(value)
}

/// A value as `print` and `${…}` write it: texts as they are.
pub fn plain(value: &Dynamic) -> String {
    value.read_lock::<ImmutableString>().map_or_else(|| inline(value), |text| text.to_string())
}

/// The fewest digits that read back to the same number.
pub fn number(value: f64) -> String {
    format!("{value:?}")
}

fn scalar(value: &Dynamic) -> String {
    if value.is_unit() {
        return "()".to_owned();
    }
    if let Ok(flag) = value.as_bool() {
        return flag.to_string();
    }
    if let Ok(whole) = value.as_int() {
        return whole.to_string();
    }
    if let Ok(value) = value.as_float() {
        return number(value);
    }
    if let Ok(character) = value.as_char() {
        return format!("'{character}'");
    }
    if let Some(text) = value.read_lock::<ImmutableString>() {
        return quoted(&text);
    }
    if let Some(function) = value.read_lock::<FnPtr>() {
        return function_text(&function);
    }
    if let Some(bytes) = value.read_lock::<Blob>() {
        return format!("{} bytes", bytes.len());
    }
    if let Some(range) = value.read_lock::<Range<i64>>() {
        return format!("{}..{}", range.start, range.end);
    }
    if let Some(range) = value.read_lock::<RangeInclusive<i64>>() {
        return format!("{}..={}", range.start(), range.end());
    }
    words::kind_of(value)
}

fn function_text(function: &FnPtr) -> String {
    if words::is_closure(function.fn_name()) {
        "closure".to_owned()
    } else {
        format!("function {}", function.fn_name())
    }
}

/// In quotes, so that it reads back as the same text in a cell.
fn quoted(text: &str) -> String {
    let mut out = String::with_capacity(text.len() + 2);
    out.push('"');
    for c in text.chars() {
        match c {
            '"' => out.push_str("\\\""),
            '\\' => out.push_str("\\\\"),
            '\n' => out.push_str("\\n"),
            '\r' => out.push_str("\\r"),
            '\t' => out.push_str("\\t"),
            _ => out.push(c),
        }
    }
    out.push('"');
    out
}

fn key_text(key: &str) -> String {
    let name = key.starts_with(|c: char| c.is_alphabetic() || c == '_')
        && key.chars().all(|c| c.is_alphanumeric() || c == '_');
    if name { key.to_owned() } else { quoted(key) }
}

/// Long arrays and maps over several lines, very long ones cut short.
fn laid_out(value: &Dynamic, indent: usize) -> String {
    let (open, close, parts, total) = if let Some(array) = value.read_lock::<Array>() {
        let parts = array.iter().take(ENTRIES).map(|item| (String::new(), item.clone())).collect::<Vec<_>>();
        ("[", "]", parts, array.len())
    } else if let Some(map) = value.read_lock::<Map>() {
        let parts = map.iter().take(ENTRIES).map(|(key, item)| (format!("{}: ", key_text(key)), item.clone()));
        ("#{", "}", parts.collect::<Vec<_>>(), map.len())
    } else {
        return inline(value);
    };
    if total <= ENTRIES {
        let line = inline(value);
        if indent + line.chars().count() <= WIDTH && !line.contains('\n') {
            return line;
        }
    }
    let margin = " ".repeat(indent + 2);
    let small = parts.iter().all(|(key, item)| key.is_empty() && !item.is_array() && !item.is_map());
    let mut lines: Vec<String> = Vec::new();
    for (key, item) in &parts {
        let entry = format!("{key}{},", laid_out(item, indent + 2));
        match lines.last_mut() {
            Some(line) if small && line.chars().count() + 1 + entry.chars().count() <= WIDTH => {
                line.push(' ');
                line.push_str(&entry);
            }
            _ => lines.push(format!("{margin}{entry}")),
        }
    }
    if total > ENTRIES {
        lines.push(format!("{margin}… {} more", total - ENTRIES));
    }
    format!("{open}\n{}\n{}{close}", lines.join("\n"), " ".repeat(indent))
}

/// Has the engine write values as this file does, wherever it writes them itself.
pub fn register(engine: &mut Engine) {
    let kinds = [
        TypeId::of::<f64>(),
        TypeId::of::<Array>(),
        TypeId::of::<Map>(),
        TypeId::of::<FnPtr>(),
        TypeId::of::<Blob>(),
        TypeId::of::<Range<i64>>(),
        TypeId::of::<RangeInclusive<i64>>(),
        TypeId::of::<Answer>(),
    ];
    for name in ["print", "debug", "to_string", "to_debug"] {
        for kind in kinds {
            engine.register_raw_fn(name, [kind], |_, arguments| Ok(inline(arguments[0])));
        }
    }
    for name in ["debug", "to_debug"] {
        engine.register_raw_fn(name, [TypeId::of::<ImmutableString>()], |_, arguments| Ok(inline(arguments[0])));
    }
    engine.register_fn("name", |function: &mut FnPtr| function_text(function));
    engine.register_get("name", |function: &mut FnPtr| function_text(function));
}

#[cfg(test)]
mod tests {
    use super::*;

    fn value(code: &str) -> Dynamic {
        crate::script::engine::fix_hashing();
        let mut engine = Engine::new();
        engine.set_max_expr_depths(512, 512);
        engine.eval(code).unwrap()
    }

    #[test]
    fn numbers_read_back_to_the_same_bits() {
        for x in [0.1, 1.0 / 3.0, 1e-300, 6.02214076e23, 5e-324, -0.0, 100.0, 123456789.125] {
            assert_eq!(number(x).parse::<f64>().unwrap().to_bits(), x.to_bits());
        }
        assert_eq!(number(100.0), "100.0");
        assert_eq!(number(6.02214076e23), "6.02214076e23");
    }

    #[test]
    fn values_are_readable() {
        assert_eq!(
            bundle_of(&value("[1, 2.5, \"a\\\"b\", 'c', true, (), 1..3, |x| x]")).plain(),
            "[1, 2.5, \"a\\\"b\", 'c', true, (), 1..3, closure]"
        );
        assert_eq!(bundle_of(&value("#{b: 1, a: [2], \"x y\": 3}")).plain(), "#{a: [2], b: 1, \"x y\": 3}");
        assert_eq!(plain(&value("\"as it is\"")), "as it is");
    }

    #[test]
    fn long_arrays_take_several_lines_and_very_long_ones_are_cut() {
        let long = bundle_of(&value(
            "[\"a long text, a long text, a long text, a long text\", [\"and one that certainly will not fit beside it\"]]",
        ));
        assert_eq!(
            long.plain(),
            "[\n  \"a long text, a long text, a long text, a long text\",\n  [\"and one that certainly will not fit beside it\"],\n]"
        );
        let many = bundle_of(&value("let a = []; for i in 0..250 { a.push(i); } a"));
        assert!(many.plain().ends_with(" 98,\n  99,\n  … 150 more\n]"), "{}", many.plain());
        assert!(many.plain().lines().all(|line| line.chars().count() <= WIDTH), "{}", many.plain());
    }
}
