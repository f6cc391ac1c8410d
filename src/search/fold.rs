//! Templates that are the same on this data: constant ones, and those whose
//! embeddings agree with an earlier one up to the order of grid points and the
//! scaling of the height. They say the same about these traces, so the first
//! (the simplest) stands for them; they are different templates all the same,
//! and are never merged in the e-graph.

use std::cmp::Ordering;
use std::collections::BTreeMap;

use crate::embedding::Embedding;

/// What an embedding is, compared with those before it.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Novelty {
    /// No earlier template sorts the traces like this.
    New,
    /// All traces have the same heights.
    Constant,
    /// The same on this data as the template of this number.
    SameAs(usize),
}

/// The embeddings seen so far, by what they say about the traces.
#[derive(Debug, Clone, Default)]
pub struct Folder {
    seen: BTreeMap<Vec<u64>, usize>,
}

impl Folder {
    /// Compares an embedding with those before it; `number` stands for it from
    /// now on when it is new.
    pub fn insert(&mut self, embedding: &Embedding, number: usize) -> Novelty {
        let key = key(embedding);
        if key.is_empty() {
            return Novelty::Constant;
        }
        match self.seen.entry(key) {
            std::collections::btree_map::Entry::Occupied(entry) => Novelty::SameAs(*entry.get()),
            std::collections::btree_map::Entry::Vacant(entry) => {
                entry.insert(number);
                Novelty::New
            }
        }
    }
}

/// The set of scaled columns that are not constant, as sorted digests.
fn key(embedding: &Embedding) -> Vec<u64> {
    let mut digests: Vec<u64> = embedding
        .columns
        .iter()
        .filter_map(|column| column_digest(column))
        .collect();
    digests.sort_unstable();
    digests.dedup();
    digests
}

/// A digest of a column after scaling its finite heights to 0..1; `None` when
/// all traces have the same height. FNV-1a over quantised values: two columns
/// that differ by rounding noise alone agree.
fn column_digest(column: &[f64]) -> Option<u64> {
    let same = |pair: &[f64]| pair[0].partial_cmp(&pair[1]) == Some(Ordering::Equal);
    if column.windows(2).all(same) {
        return None;
    }
    let finite = column.iter().copied().filter(|height| height.is_finite());
    let low = finite.clone().fold(f64::INFINITY, f64::min);
    let high = finite.fold(f64::NEG_INFINITY, f64::max);
    let scale = if high > low { 1.0 / (high - low) } else { 0.0 };
    let mut digest = 0xcbf2_9ce4_8422_2325_u64;
    for height in column {
        let value = if height.is_finite() {
            ((height - low) * scale * 1e9).round() as i64
        } else if *height > 0.0 {
            i64::MAX
        } else {
            i64::MIN
        };
        for byte in value.to_le_bytes() {
            digest = (digest ^ u64::from(byte)).wrapping_mul(0x0100_0000_01b3);
        }
    }
    Some(digest)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::support::SlotId;
    use crate::template::parse;

    fn embedding(columns: Vec<Vec<f64>>) -> Embedding {
        Embedding {
            formula: parse("throughout [0, end] (x <= ?)").unwrap(),
            height: SlotId(0),
            axes: Vec::new(),
            columns,
        }
    }

    #[test]
    fn order_of_columns_and_scale_do_not_matter() {
        let mut folder = Folder::default();
        let first = embedding(vec![vec![1.0, 2.0, 4.0], vec![5.0, 5.0, 6.0]]);
        let same = embedding(vec![vec![0.0, 0.0, 10.0], vec![0.1, 0.2, 0.4]]);
        let other = embedding(vec![vec![0.0, 0.0, 10.0], vec![0.1, 0.25, 0.4]]);
        let constant = embedding(vec![vec![3.0; 3], vec![f64::INFINITY; 3]]);
        assert_eq!(folder.insert(&first, 0), Novelty::New);
        assert_eq!(folder.insert(&same, 1), Novelty::SameAs(0));
        assert_eq!(folder.insert(&other, 2), Novelty::New);
        assert_eq!(folder.insert(&constant, 3), Novelty::Constant);
    }

    #[test]
    fn never_is_not_a_large_number() {
        let mut folder = Folder::default();
        let never = embedding(vec![vec![0.0, 1.0, f64::INFINITY]]);
        let number = embedding(vec![vec![0.0, 0.5, 1.0]]);
        assert_eq!(folder.insert(&never, 0), Novelty::New);
        assert_eq!(folder.insert(&number, 1), Novelty::New);
    }
}
