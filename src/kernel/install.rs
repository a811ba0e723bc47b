//! Making the kernel known to notebook clients: a folder with `kernel.json` and a logo.
//!
//! [`install`] builds the folder beside its place and then moves it there, so that no client ever reads half of it.
//! It names the running program by its absolute path: a bare name would depend on the search path of whoever starts
//! the kernel.

use std::env;
use std::fs;
use std::io;
use std::path::{Path, PathBuf};

use serde_json::json;
use thiserror::Error;

use crate::fault::Explain;
use crate::kernel::message::PROTOCOL_VERSION;

/// The kernel's name for clients, and that of its folder.
pub const KERNEL_NAME: &str = "hessbook";

/// Drawn for this project.
const LOGO: &[u8] = include_bytes!("logo.svg");

/// Where clients look for kernels.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Place {
    /// The present user's own data folder.
    User,
    /// An installation or environment, such as `/usr/local`.
    Prefix(PathBuf),
}

/// Why the kernel could not be made known.
#[derive(Debug, Error)]
pub enum InstallError {
    #[error("there is no home folder to install for the present user: HOME is not set")]
    NoHome,
    #[error("cannot tell where this program lies: {reason}")]
    UnknownProgram { reason: io::Error },
    #[error("the path of this program is no text: {}", path.display())]
    PathNotText { path: PathBuf },
    #[error("cannot write the kernel's folder {}: {reason}", folder.display())]
    NotWritten { folder: PathBuf, reason: io::Error },
}

impl Explain for InstallError {
    fn code(&self) -> &'static str {
        match self {
            InstallError::NoHome => "no-home-folder",
            InstallError::UnknownProgram { .. } => "program-path-unknown",
            InstallError::PathNotText { .. } => "program-path-not-text",
            InstallError::NotWritten { .. } => "kernel-folder-not-written",
        }
    }

    fn hint(&self) -> String {
        match self {
            InstallError::NoHome => "set HOME, or name a folder with --prefix".to_owned(),
            InstallError::UnknownProgram { .. } => "start the program by its full path".to_owned(),
            InstallError::PathNotText { .. } => "move the program to a path of ordinary characters".to_owned(),
            InstallError::NotWritten { .. } => {
                "choose a folder that you may write to, with --prefix, or ask its owner".to_owned()
            }
        }
    }
}

/// Installs the running program as a kernel and gives the folder.
pub fn install(place: &Place) -> Result<PathBuf, InstallError> {
    let program = env::current_exe().map_err(|reason| InstallError::UnknownProgram { reason })?;
    let kernels = match place {
        Place::User => user_data()?.join("kernels"),
        Place::Prefix(prefix) => prefix.join("share").join("jupyter").join("kernels"),
    };
    let folder = kernels.join(KERNEL_NAME);
    let specification = specification(&program)?;
    write(&kernels, &folder, &specification)
        .map_err(|reason| InstallError::NotWritten { folder: folder.clone(), reason })?;
    Ok(folder)
}

/// The user's data folder, as clients find it.
fn user_data() -> Result<PathBuf, InstallError> {
    let set = |name: &str| env::var_os(name).filter(|value| !value.is_empty()).map(PathBuf::from);
    if let Some(folder) = set("JUPYTER_DATA_DIR") {
        return Ok(folder);
    }
    let home = || set("HOME").ok_or(InstallError::NoHome);
    if cfg!(target_os = "macos") {
        return Ok(home()?.join("Library").join("Jupyter"));
    }
    match set("XDG_DATA_HOME") {
        Some(folder) => Ok(folder.join("jupyter")),
        None => Ok(home()?.join(".local").join("share").join("jupyter")),
    }
}

/// The text of `kernel.json`.
fn specification(program: &Path) -> Result<String, InstallError> {
    let Some(text) = program.to_str() else {
        return Err(InstallError::PathNotText { path: program.to_owned() });
    };
    let specification = json!({
        "argv": [text, "kernel", "{connection_file}"],
        "display_name": "hessbook (thermochemistry)",
        "language": "rhai",
        // A signal would reach every process of the group; a message reaches the kernel.
        "interrupt_mode": "message",
        "kernel_protocol_version": PROTOCOL_VERSION,
        "metadata": {"hessbook": {"version": env!("CARGO_PKG_VERSION")}},
    });
    Ok(format!("{specification:#}\n"))
}

fn write(kernels: &Path, folder: &Path, specification: &str) -> io::Result<()> {
    fs::create_dir_all(kernels)?;
    // The name starts with a dot and holds no kernel.json that clients would find by it: both are temporary.
    let workshop = tempfile::Builder::new().prefix(".hessbook-").tempdir_in(kernels)?;
    let made = workshop.path().join("new");
    fs::create_dir(&made)?;
    fs::write(made.join("kernel.json"), specification)?;
    fs::write(made.join("logo-svg.svg"), LOGO)?;
    let former = workshop.path().join("former");
    match fs::rename(folder, &former) {
        Ok(()) => {}
        Err(reason) if reason.kind() == io::ErrorKind::NotFound => {}
        Err(reason) => return Err(reason),
    }
    if let Err(reason) = fs::rename(&made, folder) {
        // Whoever had a kernel before keeps it; there may have been none.
        let _ = fs::rename(&former, folder);
        return Err(reason);
    }
    workshop.close()
}

#[cfg(test)]
mod tests {
    use super::*;
    use serde_json::Value;

    #[test]
    fn installing_again_replaces_the_folder_and_leaves_nothing_else() {
        let prefix = tempfile::tempdir().unwrap();
        let place = Place::Prefix(prefix.path().to_owned());
        let folder = install(&place).unwrap();
        fs::write(folder.join("of-an-earlier-version"), "").unwrap();
        assert_eq!(install(&place).unwrap(), folder);
        let names = |folder: &Path| {
            let mut names: Vec<_> = fs::read_dir(folder).unwrap().map(|entry| entry.unwrap().file_name()).collect();
            names.sort();
            names
        };
        assert_eq!(names(&folder), ["kernel.json", "logo-svg.svg"]);
        assert_eq!(names(folder.parent().unwrap()), [KERNEL_NAME]);
        let text = fs::read_to_string(folder.join("kernel.json")).unwrap();
        let specification: Value = serde_json::from_str(&text).unwrap();
        assert!(Path::new(specification["argv"][0].as_str().unwrap()).is_absolute());
        assert_eq!(specification["argv"][2], "{connection_file}");
    }

    #[test]
    fn a_place_that_cannot_be_written_is_named() {
        let prefix = tempfile::tempdir().unwrap();
        fs::write(prefix.path().join("share"), "a file").unwrap();
        let refusal = install(&Place::Prefix(prefix.path().to_owned())).unwrap_err();
        assert!(refusal.to_string().contains("share/jupyter/kernels/hessbook"), "{refusal}");
        assert_eq!(refusal.code(), "kernel-folder-not-written");
    }
}
