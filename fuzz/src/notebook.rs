//! The reader of notebook files: whatever the bytes, it refuses them or gives a notebook that survives writing.
#![no_main]

use std::path::Path;

use hessbook::fault::Explain;
use hessbook::notebook::file::NotebookFile;
use hessbook::notebook::sealing::read_seal;
use hessbook::render::report::MIME;
use libfuzzer_sys::fuzz_target;

fuzz_target!(|bytes: &[u8]| {
    let path = Path::new("fuzzed.ipynb");
    let notebook = match NotebookFile::of_bytes(path, bytes) {
        Ok(notebook) => notebook,
        Err(error) => {
            assert!(!error.to_string().is_empty() && !error.hint().is_empty());
            return;
        }
    };
    let _ = notebook.recorded(MIME).len();
    let _ = read_seal("fuzzed.ipynb", &notebook);
    let text = notebook.text().expect("what was read as JSON can be written as JSON");
    let again = NotebookFile::of_bytes(path, text.as_bytes()).expect("what was written can be read");
    assert!(again.quirks.is_empty(), "{:?}", again.quirks);
    assert!(notebook.code_cells() == again.code_cells(), "no cell is changed by writing");
    assert_eq!(again.text().expect("as before"), text, "the second writing changes nothing");
});
