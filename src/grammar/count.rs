//! How many templates there are of each size, by recurrence.
//!
//! The generating function of a piece is the product of those of its parts,
//! shifted by what its head adds; that of a choice is the sum. Two equal
//! operands of `and` or `or` are counted unordered: half of (ordered pairs plus
//! pairs of a thing with itself). Slots and flags are counted along, and what
//! is over a limit is dropped at once, since nothing ever takes slots away.

use std::collections::BTreeMap;

use super::file::{Grammar, Limits};
use super::palette::Palette;
use super::piece::{Head, PieceId};
use super::production::{ProductionError, Productions, productions};

/// Numbers of templates by size; `of[n]` counts those of size n.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Counts {
    /// The numbers, from size 0.
    pub of: Vec<u128>,
}

impl Counts {
    /// All templates up to the largest size counted.
    pub fn total(&self) -> u128 {
        self.of
            .iter()
            .fold(0, |sum, count| sum.saturating_add(*count))
    }
}

/// Counts the templates of a grammar on a palette up to its size limit, or up
/// to `size` when that is smaller. Numbers stop at 2^128 - 1.
///
/// # Errors
/// When rules do not fit together.
pub fn count(
    grammar: &Grammar,
    palette: &Palette,
    size: Option<u32>,
) -> Result<Counts, ProductionError> {
    let productions = productions(grammar, palette)?;
    Ok(count_piece(
        &productions,
        grammar.limits,
        size,
        productions.goal,
    ))
}

/// Counts what one piece stands for.
pub(super) fn count_piece(
    productions: &Productions,
    limits: Limits,
    size: Option<u32>,
    piece: PieceId,
) -> Counts {
    let largest = size.unwrap_or(limits.size).min(limits.size);
    let mut counter = Counter {
        productions,
        limits,
        known: BTreeMap::new(),
    };
    let of = (0..=largest)
        .map(|size| {
            let table = counter.table(piece, size);
            table.values().fold(0u128, |sum, n| sum.saturating_add(*n))
        })
        .collect();
    Counts { of }
}

/// Numbers by slots and flags.
type Table = BTreeMap<(u32, u32), u128>;

struct Counter<'a> {
    productions: &'a Productions,
    limits: Limits,
    known: BTreeMap<(PieceId, u32), Table>,
}

impl Counter<'_> {
    fn table(&mut self, piece: PieceId, size: u32) -> Table {
        if let Some(table) = self.known.get(&(piece, size)) {
            return table.clone();
        }
        // A rule that only renames itself would come back here; it adds
        // nothing to what its other alternatives give.
        self.known.insert((piece, size), Table::new());
        let here = self.productions.pieces[piece].clone();
        let table = match &here.head {
            Head::Choice(choices) => {
                let mut sum = Table::new();
                for choice in choices {
                    add(&mut sum, &self.table(*choice, size));
                }
                sum
            }
            Head::And | Head::Or if is_same_twice(&here.parts) => {
                self.unordered(here.parts[0], size, here.size())
            }
            _ => match size.checked_sub(here.size()) {
                None => Table::new(),
                Some(rest) => {
                    let start = Table::from([((here.slots(), here.flags()), 1)]);
                    self.product(start, &here.parts, rest)
                }
            },
        };
        let table: Table = table
            .into_iter()
            .filter(|((slots, flags), _)| {
                *slots <= self.limits.slots && *flags <= self.limits.flags
            })
            .collect();
        self.known.insert((piece, size), table.clone());
        table
    }

    /// Parts of a total size together.
    fn product(&mut self, so_far: Table, parts: &[PieceId], size: u32) -> Table {
        let Some((first, rest)) = parts.split_first() else {
            return if size == 0 { so_far } else { Table::new() };
        };
        let mut sum = Table::new();
        for own in 0..=size {
            let table = self.table(*first, own);
            if table.is_empty() {
                continue;
            }
            let joined = times(&so_far, &table);
            add(&mut sum, &self.product(joined, rest, size - own));
        }
        sum
    }

    /// Unordered pairs of one piece.
    fn unordered(&mut self, part: PieceId, size: u32, own: u32) -> Table {
        let Some(rest) = size.checked_sub(own) else {
            return Table::new();
        };
        let mut pairs = Table::new();
        for left in 0..=rest {
            let right = rest - left;
            let (a, b) = (self.table(part, left), self.table(part, right));
            add(&mut pairs, &times(&a, &b));
        }
        if rest.is_multiple_of(2) {
            for ((slots, flags), count) in self.table(part, rest / 2) {
                add(&mut pairs, &Table::from([((2 * slots, 2 * flags), count)]));
            }
        }
        pairs.values_mut().for_each(|count| *count /= 2);
        pairs
    }
}

/// Whether a connective has the same rule on both sides.
pub(super) fn is_same_twice(parts: &[PieceId]) -> bool {
    matches!(parts, [left, right] if left == right)
}

fn add(sum: &mut Table, more: &Table) {
    for (key, count) in more {
        let entry = sum.entry(*key).or_insert(0);
        *entry = entry.saturating_add(*count);
    }
}

fn times(a: &Table, b: &Table) -> Table {
    let mut product = Table::new();
    for ((slots, flags), count) in a {
        for ((more_slots, more_flags), other) in b {
            let entry = product
                .entry((slots + more_slots, flags + more_flags))
                .or_insert(0u128);
            *entry = entry.saturating_add(count.saturating_mul(*other));
        }
    }
    product
}
