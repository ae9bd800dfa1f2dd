//! Acknowledged records against those that are there.

/// A row as it was printed, or as the journal gives it back.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub struct Line<'a> {
    pub seq: u64,
    pub text: &'a str,
}

/// The numbers of rows that were acknowledged and are not there, or are there with other words.
/// `rows` in order of their number.
pub fn lost(acked: &[Line], rows: &[Line]) -> Vec<u64> {
    let kept = |a: &&Line| {
        let found = rows.binary_search_by_key(&a.seq, |r| r.seq);
        found.is_ok_and(|at| rows[at].text == a.text)
    };
    acked.iter().filter(|a| !kept(a)).map(|a| a.seq).collect()
}
