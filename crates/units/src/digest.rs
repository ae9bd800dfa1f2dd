//! A small running digest for "were these the same inputs?". It tells accidents apart; it is not a
//! defence against a person, which the journal's hash chain is.

/// FNV-1a, 64 bits. Source: G. Fowler, L. C. Noll, K.-P. Vo (1991), as in RFC 9923.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub struct Digest(u64);

impl Default for Digest {
    fn default() -> Self {
        Self::new()
    }
}

impl Digest {
    pub const fn new() -> Self {
        Self(0xcbf2_9ce4_8422_2325)
    }
    pub fn bytes(&mut self, bytes: &[u8]) -> &mut Self {
        for b in bytes {
            self.0 = (self.0 ^ u64::from(*b)).wrapping_mul(0x0000_0100_0000_01b3);
        }
        self
    }
    pub fn u64(&mut self, v: u64) -> &mut Self {
        self.bytes(&v.to_le_bytes())
    }
    pub fn i64(&mut self, v: i64) -> &mut Self {
        self.bytes(&v.to_le_bytes())
    }
    pub fn f64(&mut self, v: f64) -> &mut Self {
        self.bytes(&v.to_bits().to_le_bytes())
    }
    pub const fn get(self) -> u64 {
        self.0
    }
}

#[cfg(test)]
mod tests {
    use super::Digest;

    /// Source: RFC 9923, The FNV Non-Cryptographic Hash Algorithm (from memory).
    /// Where in it: test vectors of FNV-1a, 64 bits, for "", "a" and "foobar".
    /// Quantity and unit: a 64-bit number.
    /// Tolerance and why: none, it is exact.
    #[test]
    fn val_rfc9923_fnv1a() {
        let of = |s: &str| Digest::new().bytes(s.as_bytes()).get();
        assert_eq!(of(""), 0xcbf2_9ce4_8422_2325);
        assert_eq!(of("a"), 0xaf63_dc4c_8601_ec8c);
        assert_eq!(of("foobar"), 0x8594_4171_f739_67e8);
    }
}
