//! Signatures under seals: Ed25519 (RFC 8032) over the seal's digest, with keys that people keep in files.
//!
//! A signature says that who held the private key signed this digest, and nothing more: whose key it is, the auditor must
//! know from elsewhere. The surprise: what is signed begins with the shape of the seal, so that a signature made for another
//! purpose is none here.

use std::fmt::Write as _;
use std::path::{Path, PathBuf};

use ed25519_dalek::{Signature as Ed25519, Signer, SigningKey, VerifyingKey};
use serde::{Deserialize, Serialize};
use thiserror::Error;

use crate::fault::Explain;
use crate::notebook::file::write_whole;
use crate::notebook::seal::{FORMAT, Seal, Signature};
use crate::notebook::verdict::Signed;

const ALGORITHM: &str = "ed25519";
const PRIVATE: &str = "hessbook private key 1";
const PUBLIC: &str = "hessbook public key 1";

/// Why a key cannot be made or used.
#[derive(Debug, Error)]
pub enum KeyError {
    #[error("{path} is there already, and a key in use must not be lost", path = path.display())]
    Exists { path: PathBuf },
    #[error("cannot write the key {path}: {why}", path = path.display())]
    Write { path: PathBuf, why: String },
    #[error("cannot read the key {path}: {why}", path = path.display())]
    Read { path: PathBuf, why: String },
    #[error("{path} holds no {wanted}", path = path.display())]
    NotAKey { path: PathBuf, wanted: &'static str },
    #[error("the system gives no random numbers: {why}")]
    NoRandomness { why: String },
}

impl Explain for KeyError {
    fn code(&self) -> &'static str {
        match self {
            KeyError::Exists { .. } => "key-exists",
            KeyError::Write { .. } => "key-unwritable",
            KeyError::Read { .. } => "key-unreadable",
            KeyError::NotAKey { .. } => "not-a-key",
            KeyError::NoRandomness { .. } => "no-randomness",
        }
    }

    fn hint(&self) -> String {
        match self {
            KeyError::Exists { .. } => "choose another name for the new key".to_owned(),
            KeyError::Write { .. } => "check the folder's rights".to_owned(),
            KeyError::Read { .. } => "check the path and the rights to the file".to_owned(),
            KeyError::NotAKey { .. } => {
                "sign with the private key that `hessbook keys new FILE` made, and trust the public one beside it, FILE.pub"
                    .to_owned()
            }
            KeyError::NoRandomness { .. } => "make the key on another machine".to_owned(),
        }
    }
}

fn hex(bytes: &[u8]) -> String {
    bytes.iter().fold(String::new(), |mut hex, byte| {
        let _ = write!(hex, "{byte:02x}"); // Writing to a text cannot fail.
        hex
    })
}

fn bytes<const N: usize>(hex: &str) -> Option<[u8; N]> {
    let hex = hex.trim();
    if hex.len() != 2 * N || !hex.is_ascii() {
        return None;
    }
    let mut bytes = [0; N];
    for (at, byte) in bytes.iter_mut().enumerate() {
        *byte = u8::from_str_radix(&hex[2 * at..2 * at + 2], 16).ok()?;
    }
    Some(bytes)
}

/// Makes a pair of keys: the private one in `path`, readable by its owner alone, the public one beside it in `path.pub`.
///
/// # Errors
/// One of them is there already, or cannot be written.
pub fn new_keys(path: &Path) -> Result<PathBuf, KeyError> {
    let public = PathBuf::from(format!("{}.pub", path.display()));
    for path in [path, &public] {
        if path.exists() {
            return Err(KeyError::Exists { path: path.to_owned() });
        }
    }
    let mut secret = [0; 32];
    getrandom::fill(&mut secret).map_err(|error| KeyError::NoRandomness { why: error.to_string() })?;
    let key = SigningKey::from_bytes(&secret);
    let failed = |path: &Path, why: std::io::Error| KeyError::Write { path: path.to_owned(), why: why.to_string() };
    write_private(path, &format!("{PRIVATE}\n{}\n", hex(&secret))).map_err(|why| failed(path, why))?;
    let text = format!("{PUBLIC}\n{}\n", hex(key.verifying_key().as_bytes()));
    write_whole(&public, text.as_bytes()).map_err(|why| failed(&public, why))?;
    Ok(public)
}

/// Writes a new file that its owner alone can read, from its first byte on.
fn write_private(path: &Path, text: &str) -> std::io::Result<()> {
    let mut options = std::fs::OpenOptions::new();
    options.write(true).create_new(true);
    #[cfg(unix)]
    std::os::unix::fs::OpenOptionsExt::mode(&mut options, 0o600);
    std::io::Write::write_all(&mut options.open(path)?, text.as_bytes())
}

fn read_key(path: &Path, heading: &str, wanted: &'static str) -> Result<[u8; 32], KeyError> {
    let text =
        std::fs::read_to_string(path).map_err(|why| KeyError::Read { path: path.to_owned(), why: why.to_string() })?;
    let key = text.trim().strip_prefix(heading).and_then(bytes);
    key.ok_or_else(|| KeyError::NotAKey { path: path.to_owned(), wanted })
}

/// A private key.
pub struct PrivateKey(SigningKey);

impl PrivateKey {
    /// # Errors
    /// The file cannot be read, or holds no private key.
    pub fn read(path: &Path) -> Result<PrivateKey, KeyError> {
        Ok(PrivateKey(SigningKey::from_bytes(&read_key(path, PRIVATE, "private key of this program")?)))
    }

    /// Signs the digest of a seal.
    pub fn sign(&self, seal: &Seal) -> Signature {
        Signature {
            algorithm: ALGORITHM.to_owned(),
            public_key: hex(self.0.verifying_key().as_bytes()),
            signature: hex(&self.0.sign(message(&seal.digest).as_bytes()).to_bytes()),
        }
    }
}

/// A public key that an auditor trusts, by the name of its file.
#[derive(Clone, Debug, PartialEq, Eq, Serialize, Deserialize)]
pub struct TrustedKey {
    pub name: String,
    key: [u8; 32],
}

impl TrustedKey {
    /// # Errors
    /// The file cannot be read, or holds no public key.
    pub fn read(path: &Path) -> Result<TrustedKey, KeyError> {
        let name = path.file_stem().map_or_else(String::new, |name| name.to_string_lossy().into_owned());
        Ok(TrustedKey { name, key: read_key(path, PUBLIC, "public key of this program")? })
    }
}

fn message(digest: &str) -> String {
    format!("{FORMAT} {digest}")
}

/// What is known of the signature of a seal.
pub fn checked(seal: &Seal, trusted: &[TrustedKey]) -> Signed {
    let Some(signature) = &seal.signature else { return Signed::Not };
    let key = signature.public_key.clone();
    let invalid = |why: &str| Signed::Invalid { key: key.clone(), why: why.to_owned() };
    if signature.algorithm != ALGORITHM {
        return invalid("its algorithm is not known here");
    }
    let Some(public) = bytes::<32>(&signature.public_key) else { return invalid("its key is no key") };
    let (Ok(verifier), Some(given)) = (VerifyingKey::from_bytes(&public), bytes::<64>(&signature.signature)) else {
        return invalid("it is no signature");
    };
    // Over the content as it is, not over the digest that it claims.
    if verifier.verify_strict(message(&seal.digest_now()).as_bytes(), &Ed25519::from_bytes(&given)).is_err() {
        return invalid("it is of another content");
    }
    Signed::Valid { trusted: trusted.iter().find(|one| one.key == public).map(|one| one.name.clone()), key }
}
