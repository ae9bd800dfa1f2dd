//! Small numbers in few bytes: seven bits a byte, lowest first, the top bit says that more follow.

/// Differences wrap, so that any two numbers have one and it always leads back.
pub(crate) fn put_step(out: &mut Vec<u8>, from: u64, to: u64) {
    put(out, fold(to.wrapping_sub(from).cast_signed()));
}

/// Steps either way as numbers from 0: small ones stay small.
pub(crate) const fn fold(step: i64) -> u64 {
    ((step << 1) ^ (step >> 63)).cast_unsigned()
}

pub(crate) const fn unfold(folded: u64) -> i64 {
    (folded >> 1).cast_signed() ^ -((folded & 1).cast_signed())
}

pub(crate) fn put(out: &mut Vec<u8>, mut n: u64) {
    while n >= 0x80 {
        out.push(0x80 | (n & 0x7f) as u8);
        n >>= 7;
    }
    out.push(n as u8);
}

/// Takes values from the front of bytes that may be damaged: `None` where they do not suffice.
pub(crate) struct Taker<'a>(pub(crate) &'a [u8]);

impl<'a> Taker<'a> {
    pub(crate) fn bytes(&mut self, n: usize) -> Option<&'a [u8]> {
        let (head, rest) = self.0.split_at_checked(n)?;
        self.0 = rest;
        Some(head)
    }
    pub(crate) fn array<const N: usize>(&mut self) -> Option<[u8; N]> {
        self.bytes(N)?.try_into().ok()
    }
    pub(crate) fn u64(&mut self) -> Option<u64> {
        let (mut n, mut shift) = (0_u64, 0);
        loop {
            let byte = self.array::<1>()?[0];
            let part = u64::from(byte & 0x7f);
            if shift > 63 || (part << shift) >> shift != part {
                return None;
            }
            n |= part << shift;
            if byte < 0x80 {
                return Some(n);
            }
            shift += 7;
        }
    }
    pub(crate) fn step(&mut self, from: u64) -> Option<u64> {
        Some(from.wrapping_add(unfold(self.u64()?).cast_unsigned()))
    }
    /// A length or index that must be below `most`.
    pub(crate) fn below(&mut self, most: usize) -> Option<usize> {
        usize::try_from(self.u64()?).ok().filter(|n| *n < most)
    }
    /// Bytes after their length.
    pub(crate) fn blob(&mut self) -> Option<&'a [u8]> {
        let n = usize::try_from(self.u64()?).ok()?;
        self.bytes(n)
    }
}

pub(crate) fn put_blob(out: &mut Vec<u8>, bytes: &[u8]) {
    put(out, bytes.len() as u64);
    out.extend(bytes);
}

#[cfg(test)]
mod tests {
    use proptest::prelude::*;

    use super::*;

    proptest! {
        #![proptest_config(ProptestConfig { failure_persistence: None, ..ProptestConfig::default() })]

        #[test]
        fn prop_numbers_and_steps_come_back(a: u64, b: u64, blob: Vec<u8>) {
            let mut out = Vec::new();
            put(&mut out, a);
            put_step(&mut out, a, b);
            put_blob(&mut out, &blob);
            let mut taker = Taker(&out);
            prop_assert_eq!(taker.u64(), Some(a));
            prop_assert_eq!(taker.step(a), Some(b));
            prop_assert_eq!(taker.blob(), Some(&blob[..]));
            prop_assert_eq!(taker.u64(), None);
        }

        #[test]
        fn prop_any_bytes_end_without_a_panic(bytes: Vec<u8>) {
            let mut taker = Taker(&bytes);
            while taker.u64().is_some() {}
            prop_assert!(Taker(&bytes).blob().is_none_or(|b| b.len() < bytes.len()));
        }
    }

    #[test]
    fn a_number_of_more_than_sixty_four_bits_is_refused() {
        assert_eq!(Taker(&[0xff; 11]).u64(), None);
        let mut most = vec![0xff; 9];
        most.push(1);
        assert_eq!(Taker(&most).u64(), Some(u64::MAX));
        most[9] = 2;
        assert_eq!(Taker(&most).u64(), None);
    }
}
