//! Anchors: where the chain ends, written down each hour and shown to the outside. Who keeps one
//! elsewhere sees later whether the record up to it is still the same.

use ed25519_dalek::{Signature, Signer, SigningKey, VerifyingKey};
use record::{AnchorSignature, Note};

use crate::JournalError;
use crate::task::Desk;

/// Sets these signatures apart from every other use of the key. Part of the form: never changes.
const CONTEXT: &[u8] = b"tidereeve anchor, form 1";

fn message(of_seq: u64, hash: &[u8; 32]) -> Vec<u8> {
    [CONTEXT, &of_seq.to_le_bytes(), hash].concat()
}

/// Writes the anchor; its words are what belongs into a log elsewhere.
pub(crate) fn write(desk: &mut Desk<'_>, key: Option<&[u8; 32]>) -> Result<String, JournalError> {
    let head = desk.journal.head();
    let signature = key.map(|secret| sign(secret, head.seq, &head.hash));
    let words = format!("{}:{}", head.seq, head.hex());
    desk.keep(&[Note::Anchored { of_seq: head.seq, hash: head.hash, signature }], &mut |_| Ok(()))?;
    Ok(words)
}

fn sign(secret: &[u8; 32], of_seq: u64, hash: &[u8; 32]) -> AnchorSignature {
    let key = SigningKey::from_bytes(secret);
    let bytes = key.sign(&message(of_seq, hash)).to_bytes();
    AnchorSignature { key: key.verifying_key().to_bytes(), bytes }
}

/// The public key of a secret one, to be given to whoever will check anchors.
pub fn public_key(secret: &[u8; 32]) -> [u8; 32] {
    SigningKey::from_bytes(secret).verifying_key().to_bytes()
}

/// Whether the signature is good for this end of the chain, by the key that it names; whether that
/// key is the right one is for the caller to compare. Weak keys and forms are refused (RFC 8032,
/// 5.1.7, with the strict checks of the library).
pub fn is_signed(signature: &AnchorSignature, of_seq: u64, hash: &[u8; 32]) -> bool {
    VerifyingKey::from_bytes(&signature.key).is_ok_and(|key| {
        let bytes = Signature::from_bytes(&signature.bytes);
        key.verify_strict(&message(of_seq, hash), &bytes).is_ok()
    })
}

/// An anchor that somebody kept: `1234:` and 64 hexadecimal digits.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub struct Anchor {
    pub seq: u64,
    pub hash: [u8; 32],
}

impl Anchor {
    /// `None` where the text is no anchor.
    pub fn parse(text: &str) -> Option<Self> {
        let (seq, hex) = text.trim().split_once(':')?;
        let hash = *blake3::Hash::from_hex(hex).ok()?.as_bytes();
        Some(Self { seq: seq.parse().ok()?, hash })
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn an_anchor_is_signed_for_one_end_of_the_chain_only() {
        let (secret, hash) = ([7; 32], [9; 32]);
        let signed = sign(&secret, 41, &hash);
        assert_eq!(signed.key, public_key(&secret));
        assert!(is_signed(&signed, 41, &hash));
        assert!(!is_signed(&signed, 42, &hash));
        assert!(!is_signed(&signed, 41, &[8; 32]));
        let other = AnchorSignature { key: public_key(&[8; 32]), ..signed };
        assert!(!is_signed(&other, 41, &hash));
    }

    /// Source: RFC 8032 (Josefsson and Liusvaara, 2017).
    /// Where: section 7.1, TEST 1 (empty message).
    /// Quantity: public key and signature of the secret key given there.
    /// Tolerance: none, the bytes are equal.
    #[test]
    fn val_rfc_8032_first_test_vector() {
        let bytes = |hex: &str| -> Vec<u8> {
            let digit = |i: usize| u8::from_str_radix(&hex[i..i + 2], 16).unwrap();
            (0..hex.len()).step_by(2).map(digit).collect()
        };
        let secret = "9d61b19deffd5a60ba844af492ec2cc44449c5697b326919703bac031cae7f60";
        let public = "d75a980182b10ab7d54bfed3c964073a0ee172f3daa62325af021a68f707511a";
        let signature = "e5564300c360ac729086e2cc806e828a84877f1eb8e5d974d873e065224901555\
                         fb8821590a33bacc61e39701cf9b46bd25bf5f0595bbe24655141438e7a100b";
        let secret: [u8; 32] = bytes(secret).try_into().unwrap();
        assert_eq!(public_key(&secret).to_vec(), bytes(public));
        assert_eq!(SigningKey::from_bytes(&secret).sign(b"").to_bytes().to_vec(), bytes(signature));
    }

    #[test]
    fn an_anchor_reads_back_from_its_text() {
        let text = format!("41:{}", blake3::Hash::from_bytes([9; 32]).to_hex());
        assert_eq!(Anchor::parse(&text), Some(Anchor { seq: 41, hash: [9; 32] }));
        for wrong in ["", "41", "x:00", "41:zz", "41:0909"] {
            assert_eq!(Anchor::parse(wrong), None, "{wrong:?}");
        }
    }
}
