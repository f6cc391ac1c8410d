//! Literals: one specification that must, or must not, hold.

use std::cmp::Ordering;

use super::number::{nice_number, nice_steps};
use crate::embedding::Embedding;
use crate::scoring::is_usable;
use crate::template::{Direction, Formula, SlotKind};
use crate::traces::Grid;

/// One specification of a template and the verdict it must have.
#[derive(Debug, Clone, PartialEq)]
pub struct Literal {
    /// The grid point.
    pub column: usize,
    /// The height of the specification.
    pub height: f64,
    /// Whether the specification must be satisfied (else violated).
    pub satisfied: bool,
    /// The nearest heights of traces on both sides; infinite where there are
    /// only `never` or `always` beyond.
    pub gap: (f64, f64),
}

impl Literal {
    /// Whether a trace, given by number, passes.
    pub fn holds(&self, embedding: &Embedding, trace: usize) -> bool {
        let height = embedding.columns[self.column][trace];
        embedding.satisfied(height, self.height) == self.satisfied
    }

    /// The specification.
    pub fn specification(&self, embedding: &Embedding, grid: &Grid) -> Formula {
        embedding.specification(self.column, self.height, grid)
    }
}

/// A cut of a column between two neighbouring heights.
#[derive(Debug, Clone, Copy)]
pub(super) struct Cut {
    pub(super) column: usize,
    /// The heights on both sides.
    gap: (f64, f64),
    /// Whether the traces wanted are those at or below the lower height.
    pub(super) below: bool,
    /// F1 of the traces wanted.
    pub(super) quality: f64,
    /// Quality smoothed over neighbouring columns, with a small reward for
    /// distance: what cuts are compared by.
    pub(super) value: f64,
}

/// Searches an embedding for literals. Columns are sorted once.
#[derive(Debug)]
pub struct LiteralSearch<'a> {
    pub(super) embedding: &'a Embedding,
    grid: &'a Grid,
    orders: Vec<Vec<usize>>,
}

impl<'a> LiteralSearch<'a> {
    /// Sorts the columns of an embedding.
    pub fn new(embedding: &'a Embedding, grid: &'a Grid) -> Self {
        let orders = embedding
            .columns
            .iter()
            .map(|column| {
                let mut order: Vec<usize> = (0..column.len()).collect();
                order.sort_by(|a, b| column[*a].total_cmp(&column[*b]));
                order
            })
            .collect();
        LiteralSearch {
            embedding,
            grid,
            orders,
        }
    }

    /// For each column its best cut for telling `wanted` from the other traces
    /// among `considered`, best first. `missed` traces are wanted but no longer
    /// considered: they count as not found.
    pub(super) fn cuts(&self, wanted: &[bool], considered: &[bool]) -> Vec<Cut> {
        let total = wanted.iter().filter(|wanted| **wanted).count();
        let best: Vec<Option<Cut>> = (0..self.orders.len())
            .map(|column| {
                let usable = is_usable(self.embedding, column);
                usable
                    .then(|| self.best_cut(column, wanted, considered, total))
                    .flatten()
            })
            .collect();
        let quality = |column: usize| best.get(column).copied().flatten().map(|cut| cut.quality);
        let mut cuts: Vec<Cut> = Vec::new();
        for cut in best.iter().flatten() {
            let own = cut.quality;
            let before = cut.column.checked_sub(1).and_then(quality).unwrap_or(own);
            let after = quality(cut.column + 1).unwrap_or(own);
            let smooth = own / 2.0 + before / 4.0 + after / 4.0;
            let distance = self.distance(cut.column, wanted, considered);
            cuts.push(Cut {
                value: own / 2.0 + smooth / 2.0 + 0.02 * distance.min(6.0),
                ..*cut
            });
        }
        cuts.sort_by(|a, b| b.value.total_cmp(&a.value).then(a.column.cmp(&b.column)));
        cuts
    }

    fn best_cut(
        &self,
        column: usize,
        wanted: &[bool],
        considered: &[bool],
        total: usize,
    ) -> Option<Cut> {
        let heights = &self.embedding.columns[column];
        let order: Vec<usize> = self.orders[column]
            .iter()
            .copied()
            .filter(|trace| considered[*trace])
            .collect();
        let all_wanted = order.iter().filter(|trace| wanted[**trace]).count();
        let f1 = |hits: usize, taken: usize| 2.0 * hits as f64 / (taken + total).max(1) as f64;
        let mut best: Option<Cut> = None;
        let mut hits = 0;
        for (position, pair) in order.windows(2).enumerate() {
            hits += usize::from(wanted[pair[0]]);
            let gap = (heights[pair[0]], heights[pair[1]]);
            if gap.0.partial_cmp(&gap.1) != Some(Ordering::Less) {
                continue;
            }
            let taken = position + 1;
            let sides = [
                (true, f1(hits, taken)),
                (false, f1(all_wanted - hits, order.len() - taken)),
            ];
            for (below, quality) in sides {
                let better = match &best {
                    None => true,
                    Some(best) => {
                        quality > best.quality + 1e-12
                            || (quality > best.quality - 1e-12
                                && wideness(gap) > wideness(best.gap))
                    }
                };
                if better {
                    best = Some(Cut {
                        column,
                        gap,
                        below,
                        quality,
                        value: quality,
                    });
                }
            }
        }
        best
    }

    /// How far apart the wanted and the other traces are on a column:
    /// |m1 - m0| / (pooled spread + 2 % of the range), over finite heights.
    fn distance(&self, column: usize, wanted: &[bool], considered: &[bool]) -> f64 {
        let heights = &self.embedding.columns[column];
        let (mut low, mut high) = (f64::INFINITY, f64::NEG_INFINITY);
        let mut sums = [[0.0f64; 3]; 2];
        for (trace, height) in heights.iter().enumerate() {
            if considered[trace] && height.is_finite() {
                let side = &mut sums[usize::from(wanted[trace])];
                side[0] += 1.0;
                side[1] += height;
                side[2] += height * height;
                low = low.min(*height);
                high = high.max(*height);
            }
        }
        if sums[0][0] < 1.0 || sums[1][0] < 1.0 || low >= high {
            return 0.0;
        }
        let mean = |side: &[f64; 3]| side[1] / side[0];
        let squares = |side: &[f64; 3]| (side[2] - side[1] * side[1] / side[0]).max(0.0);
        let spread = ((squares(&sums[0]) + squares(&sums[1])) / (sums[0][0] + sums[1][0])).sqrt();
        (mean(&sums[1]) - mean(&sums[0])).abs() / (spread + 0.02 * (high - low))
    }

    /// The literal of a cut, with its number placed in the gap.
    pub(super) fn literal(&self, cut: &Cut) -> Literal {
        let easier = self.embedding.direction() == Direction::LargerIsEasier;
        Literal {
            column: cut.column,
            height: self.place(cut.gap, cut.column),
            // At or below the lower height is satisfied exactly when larger
            // values make the template easier.
            satisfied: cut.below == easier,
            gap: cut.gap,
        }
    }

    fn place(&self, gap: (f64, f64), column: usize) -> f64 {
        let is_time = self.embedding.formula.slot(self.embedding.height).kind == SlotKind::Time;
        let (low, high) = self.finite_gap(gap, column, is_time);
        if !is_time {
            return nice_number(low, high);
        }
        // Whole steps that leave both heights on their sides.
        match self.embedding.direction() {
            Direction::LargerIsEasier => nice_steps(low.max(0.0), (high - 1.0).max(0.0), self.grid),
            Direction::LargerIsHarder => nice_steps((low + 1.0).max(0.0), high, self.grid),
        }
    }

    /// A gap with a side at `never` or `always` is closed at a fifth of the
    /// column's finite range beyond the other side.
    fn finite_gap(&self, gap: (f64, f64), column: usize, is_time: bool) -> (f64, f64) {
        let finite = self.embedding.columns[column]
            .iter()
            .copied()
            .filter(|h| h.is_finite());
        let low = finite.clone().fold(f64::INFINITY, f64::min);
        let high = finite.fold(f64::NEG_INFINITY, f64::max);
        let range = if high > low {
            high - low
        } else {
            high.abs().max(1.0)
        };
        let reach = if is_time {
            (range / 5.0).round().max(2.0)
        } else {
            range / 5.0
        };
        match (gap.0.is_finite(), gap.1.is_finite()) {
            (true, true) => gap,
            (true, false) => (gap.0, gap.0 + reach),
            (false, true) => (gap.1 - reach, gap.1),
            (false, false) => (0.0, reach),
        }
    }
}

fn wideness((low, high): (f64, f64)) -> f64 {
    high - low
}
