//! Lists the files of `stdlib/` with their SHA-256 digests, for `src/source.rs` to build into the program.
//!
//! The digest is taken here so that a start of the program hashes nothing. Files are listed by path, so that two
//! builds of one source tree give the same list. The surprise: any file put into `stdlib/` is shipped.

use std::fmt::Write as _;
use std::path::{Path, PathBuf};
use std::{env, fs, io};

use sha2::{Digest, Sha256};

fn main() -> io::Result<()> {
    println!("cargo::rerun-if-changed=build.rs");
    println!("cargo::rerun-if-changed=stdlib");
    let root = PathBuf::from(env::var("CARGO_MANIFEST_DIR").map_err(io::Error::other)?);
    let mut paths = Vec::new();
    collect(&root, "stdlib", &mut paths)?;
    paths.sort();
    let mut list = String::from("pub const STDLIB: &[Embedded<'static>] = &[\n");
    for path in paths {
        println!("cargo::rerun-if-changed={path}");
        let digest = Sha256::digest(fs::read(root.join(&path))?);
        let hex = digest.iter().fold(String::new(), |mut hex, byte| {
            let _ = write!(hex, "{byte:02x}"); // writing to a String cannot fail
            hex
        });
        let _ = writeln!(
            list,
            "    Embedded {{ path: {path:?}, bytes: include_bytes!(concat!(env!(\"CARGO_MANIFEST_DIR\"), {:?})), sha256: {hex:?} }},",
            format!("/{path}")
        );
    }
    list.push_str("];\n");
    let out = PathBuf::from(env::var("OUT_DIR").map_err(io::Error::other)?);
    fs::write(out.join("stdlib.rs"), list)
}

/// All files below a folder, as paths from the root with forward slashes.
fn collect(root: &Path, folder: &str, paths: &mut Vec<String>) -> io::Result<()> {
    for entry in fs::read_dir(root.join(folder))? {
        let entry = entry?;
        let name = entry.file_name();
        let path = format!("{folder}/{}", name.to_string_lossy());
        if entry.file_type()?.is_dir() {
            collect(root, &path, paths)?;
        } else if !name.to_string_lossy().starts_with('.') {
            paths.push(path);
        }
    }
    Ok(())
}
