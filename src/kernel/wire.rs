//! Frames and signatures, nothing else.
//!
//! A message is `[identity...] <IDS|MSG> signature header parent metadata content [buffer...]`. [`Envelope::open`]
//! checks the frame count, then the signature over the bytes as they came, and only then lets anybody read them.
//! Binary buffers are dropped: no message type of ours takes them.

use std::fmt::Write;

use bytes::Bytes;
use hmac::{Hmac, Mac};
use sha2::Sha256;
use thiserror::Error;

/// Stands between the routing frames and the message.
pub const DELIMITER: &[u8] = b"<IDS|MSG>";

/// Why a message was put aside. Peers never see this: it goes to the kernel's log.
#[derive(Clone, Copy, Debug, Error, PartialEq, Eq)]
pub enum WireError {
    #[error("it has no delimiter frame")]
    NoDelimiter,
    #[error("it has {found} frames after the delimiter and needs 5")]
    TooFewFrames { found: usize },
    #[error("its signature does not belong to the key of the connection file")]
    BadSignature,
}

/// Signs and checks messages with the key of the connection file.
#[derive(Clone)]
pub struct Signer {
    // None where the key is empty, which switches signing off.
    keyed: Option<Hmac<Sha256>>,
}

impl Signer {
    pub fn new(key: &[u8]) -> Self {
        let keyed = (!key.is_empty())
            .then(|| Hmac::new_from_slice(key).expect("HMAC takes keys of every length, says RFC 2104"));
        Signer { keyed }
    }

    /// The signature in lower-case hexadecimal; empty where signing is off.
    pub fn sign(&self, parts: &[Bytes; 4]) -> String {
        let Some(mac) = self.over(parts) else { return String::new() };
        let digest = mac.finalize().into_bytes();
        digest.iter().fold(String::with_capacity(2 * digest.len()), |mut text, byte| {
            write!(text, "{byte:02x}").expect("a String takes all text");
            text
        })
    }

    /// Whether `signature` is that of `parts`, compared in constant time.
    pub fn verifies(&self, signature: &[u8], parts: &[Bytes; 4]) -> bool {
        let Some(mac) = self.over(parts) else { return true };
        match from_hexadecimal(signature) {
            Some(digest) => mac.verify_slice(&digest).is_ok(),
            None => false,
        }
    }

    fn over(&self, parts: &[Bytes; 4]) -> Option<Hmac<Sha256>> {
        let mut mac = self.keyed.clone()?;
        for part in parts {
            mac.update(part);
        }
        Some(mac)
    }
}

fn from_hexadecimal(text: &[u8]) -> Option<Vec<u8>> {
    if !text.len().is_multiple_of(2) {
        return None;
    }
    let digit = |byte: u8| char::from(byte).to_digit(16).and_then(|digit| u8::try_from(digit).ok());
    text.chunks_exact(2).map(|pair| Some(16 * digit(pair[0])? + digit(pair[1])?)).collect()
}

/// A message whose signature holds.
#[derive(Debug)]
pub struct Envelope {
    /// Every frame in front of the delimiter: the way back to the sender.
    pub identities: Vec<Bytes>,
    /// Header, parent header, metadata and content, as they came.
    pub parts: [Bytes; 4],
}

impl Envelope {
    /// Takes a received message apart. Its first frame is the peer's identity, which may hold any bytes.
    pub fn open(mut frames: Vec<Bytes>, signer: &Signer) -> Result<Envelope, WireError> {
        let at = frames.iter().skip(1).position(|frame| frame == DELIMITER).ok_or(WireError::NoDelimiter)? + 1;
        let rest = frames.split_off(at + 1);
        frames.truncate(at);
        let found = rest.len();
        let mut rest = rest.into_iter();
        let (Some(signature), Some(header), Some(parent), Some(metadata), Some(content)) =
            (rest.next(), rest.next(), rest.next(), rest.next(), rest.next())
        else {
            return Err(WireError::TooFewFrames { found });
        };
        let parts = [header, parent, metadata, content];
        if !signer.verifies(&signature, &parts) {
            return Err(WireError::BadSignature);
        }
        Ok(Envelope { identities: frames, parts })
    }

    /// The frames to send, signed.
    pub fn seal(self, signer: &Signer) -> Vec<Bytes> {
        let mut frames = self.identities;
        frames.reserve(6);
        frames.push(Bytes::from_static(DELIMITER));
        frames.push(Bytes::from(signer.sign(&self.parts)));
        frames.extend(self.parts);
        frames
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn parts() -> [Bytes; 4] {
        [&b"{\"a\":1}"[..], b"{}", b"{}", b"{\"code\":\"1\"}"].map(Bytes::from_static)
    }

    fn sealed(signer: &Signer) -> Vec<Bytes> {
        let identities = vec![Bytes::from_static(b"peer"), Bytes::from_static(b"hop")];
        Envelope { identities, parts: parts() }.seal(signer)
    }

    #[test]
    fn the_signature_is_that_of_the_published_example() {
        // RFC 4231, test case 2: key "Jefe", data "what do ya want for nothing?", here cut into four frames.
        let parts = [&b"what do ya"[..], b" want for", b" nothing", b"?"].map(Bytes::from_static);
        let signature = Signer::new(b"Jefe").sign(&parts);
        assert_eq!(signature, "5bdcc146bf60754e6a042426089575c75a003f089d2739839dec58b964ec3843");
    }

    #[test]
    fn what_was_sealed_opens_with_all_its_routing_frames() {
        for key in [&b"k"[..], b""] {
            let signer = Signer::new(key);
            let envelope = Envelope::open(sealed(&signer), &signer).unwrap();
            assert_eq!(envelope.identities, [&b"peer"[..], b"hop"]);
            assert_eq!(envelope.parts, parts());
        }
        assert_eq!(sealed(&Signer::new(b""))[3], Bytes::new());
    }

    #[test]
    fn every_changed_byte_and_every_other_key_is_found_out() {
        let signer = Signer::new(b"k");
        for frame in 3..8 {
            for byte in 0..sealed(&signer)[frame].len() {
                let mut frames = sealed(&signer);
                let mut changed = frames[frame].to_vec();
                changed[byte] ^= 1;
                frames[frame] = changed.into();
                assert_eq!(Envelope::open(frames, &signer).unwrap_err(), WireError::BadSignature);
            }
        }
        for signature in [&b""[..], b"0", b"zz", b"\xff\xff", b"00"] {
            let mut frames = sealed(&signer);
            frames[3] = Bytes::from_static(signature);
            assert_eq!(Envelope::open(frames, &signer).unwrap_err(), WireError::BadSignature);
        }
        assert_eq!(Envelope::open(sealed(&Signer::new(b"other")), &signer).unwrap_err(), WireError::BadSignature);
    }

    #[test]
    fn short_messages_are_told_apart_from_unsigned_ones() {
        let signer = Signer::new(b"k");
        let whole = sealed(&signer);
        for length in 0..whole.len() {
            let refusal = Envelope::open(whole[..length].to_vec(), &signer).unwrap_err();
            let expected = match length.checked_sub(3) {
                None => WireError::NoDelimiter,
                Some(found) => WireError::TooFewFrames { found },
            };
            assert_eq!(refusal, expected, "{length} frames");
        }
    }

    #[test]
    fn an_identity_may_look_like_the_delimiter() {
        let signer = Signer::new(b"k");
        let mut frames = sealed(&signer);
        frames[0] = Bytes::from_static(DELIMITER);
        assert!(Envelope::open(frames, &signer).is_ok());
    }
}
