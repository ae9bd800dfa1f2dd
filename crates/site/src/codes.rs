//! The stable codes of faults and notes, and the longer word on each. A code is never used again
//! for something else. S is the form of either file and the content of the site file; L is the
//! content of the licence file; N is a note that refuses nothing.

use serde::Serialize;

/// A stable code.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub(crate) struct Code(pub &'static str);

pub(crate) const READ: Code = Code("S001");
pub(crate) const SYNTAX: Code = Code("S002");
pub(crate) const FORMAT: Code = Code("S003");
pub(crate) const FORMAT_NEWER: Code = Code("S004");
pub(crate) const UNKNOWN_KEY: Code = Code("S005");
pub(crate) const MISSING: Code = Code("S006");
pub(crate) const WRONG_KIND: Code = Code("S007");
pub(crate) const NAME: Code = Code("S008");
pub(crate) const DUPLICATE_NAME: Code = Code("S009");
pub(crate) const UNKNOWN_NAME: Code = Code("S010");
pub(crate) const NOT_A_CHOICE: Code = Code("S011");
pub(crate) const NO_DATUM: Code = Code("S012");
pub(crate) const UNKNOWN_DATUM: Code = Code("S013");
pub(crate) const UNIT: Code = Code("S014");
pub(crate) const OUT_OF_RANGE: Code = Code("S015");
pub(crate) const OFFSET: Code = Code("S016");
pub(crate) const INSTANT: Code = Code("S017");
pub(crate) const NO_ZONE: Code = Code("S018");
pub(crate) const UNKNOWN_ZONE: Code = Code("S019");
pub(crate) const WINDOW_ORDER: Code = Code("S020");
pub(crate) const CURVE: Code = Code("S021");
pub(crate) const LEVEL_ORDER: Code = Code("S022");
pub(crate) const REST_MISSING: Code = Code("S023");
pub(crate) const REST_UNFIT: Code = Code("S024");
pub(crate) const LEASE_HOLDER: Code = Code("S025");
pub(crate) const LEASE_LENGTH: Code = Code("S026");
pub(crate) const LEASE_FIT: Code = Code("S027");
pub(crate) const CONSTITUENT: Code = Code("S028");
pub(crate) const CONSTITUENT_TWICE: Code = Code("S029");
pub(crate) const PHASE: Code = Code("S030");
pub(crate) const NO_M2: Code = Code("S031");
pub(crate) const SIGNAL_USE: Code = Code("S032");
pub(crate) const OUTLET_PARTS: Code = Code("S033");
pub(crate) const SIMULATION: Code = Code("S034");
pub(crate) const POINT_TWICE: Code = Code("S035");
pub(crate) const NEAP_SPRING: Code = Code("S036");
pub(crate) const SITE_DATUM: Code = Code("S037");
pub(crate) const EMPTY: Code = Code("S038");
pub(crate) const SCHEDULE: Code = Code("S039");

pub(crate) const CLAUSE_TWICE: Code = Code("L001");
pub(crate) const GOVERNS: Code = Code("L002");
pub(crate) const ON_STALE: Code = Code("L003");
pub(crate) const WINDOW: Code = Code("L004");
pub(crate) const BANDS: Code = Code("L005");
pub(crate) const WORDS: Code = Code("L006");
pub(crate) const ROUNDING: Code = Code("L007");
pub(crate) const CONDITION: Code = Code("L008");
pub(crate) const NO_CURRENT: Code = Code("L009");
pub(crate) const CLAUSE_NUMBER: Code = Code("L010");
pub(crate) const CLAUSE_COUNT: Code = Code("L011");

pub(crate) const NEVER_TOGETHER: Code = Code("N001");
pub(crate) const UNGOVERNED: Code = Code("N002");
pub(crate) const LEASE_IN_ADAPTER: Code = Code("N003");
pub(crate) const ALL_NIL: Code = Code("N004");
pub(crate) const NO_HEARTBEAT: Code = Code("N005");

/// What a code means, at more length than a fault has room for.
#[derive(Clone, Copy, PartialEq, Eq, Debug, Serialize)]
pub struct Explanation {
    pub code: &'static str,
    pub title: &'static str,
    pub text: &'static str,
}

/// The longer word on a code, whatever its case; `None` for one that does not exist here.
pub fn explain(code: &str) -> Option<Explanation> {
    explanations().find(|e| e.code.eq_ignore_ascii_case(code.trim()))
}

/// Every code with its longer word, in order.
pub fn explanations() -> impl Iterator<Item = Explanation> {
    crate::explanations::TABLE.iter().map(|(code, title, text)| Explanation {
        code: code.0,
        title,
        text,
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_code_is_explained_once_and_in_words() {
        let all: Vec<_> = explanations().collect();
        for (i, e) in all.iter().enumerate() {
            assert_eq!(all.iter().position(|o| o.code == e.code), Some(i), "{} twice", e.code);
            assert!(e.text.len() > 80, "{} is too short to help", e.code);
        }
        let count = |letter: char| all.iter().filter(|e| e.code.starts_with(letter)).count();
        assert_eq!((count('S'), count('L'), count('N')), (39, 11, 5));
        assert_eq!(explain(" s012 ").map(|e| e.code), Some("S012"));
        assert_eq!(explain("S999"), None);
    }
}
