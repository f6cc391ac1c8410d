//! Templates that are the same on this data: constant ones, and those whose
//! embeddings agree with an earlier one up to the order of grid points and the
//! scaling of the height. They say the same about these traces, so the first
//! (the simplest) stands for them; they are different templates all the same,
//! and are never merged in the e-graph.

use std::collections::BTreeMap;

use crate::embedding::{Embedding, column_digests};

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
        let key = column_digests(embedding);
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
