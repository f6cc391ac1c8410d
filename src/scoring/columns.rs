//! Columns of an embedding as numbers that distances can be taken of.
//!
//! Heights are in all units and often have long tails, and some traces have
//! none (`never`, `always`). So infinite heights are put just beyond the finite
//! ones, and columns are scaled: by ranks, or by the signed logarithm of the
//! distance from the median, which keeps order and tames tails.

use crate::embedding::Embedding;
use crate::grouping::Points;
use crate::template::SlotKind;

/// Most columns that distances are taken of; more are thinned out evenly.
const MOST_COLUMNS: usize = 16;

/// How columns are scaled.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub enum Scaling {
    /// Ranks, ties sharing their mean, divided by the number of traces.
    Rank,
    /// sign(z) log(1 + |z|) with z = (x - median) / (interquartile range /
    /// 1.35), then unit spread.
    SignedLog,
}

/// Most `never` and `always` in a column of thresholds that is used. Where a
/// level is never or always kept, the window mostly left the record or the
/// event never came, and the column measures that instead of the level.
const MOST_INFINITE_LEVELS: f64 = 0.1;
/// The same for a column of times, where `never` is often the answer.
const MOST_INFINITE_TIMES: f64 = 0.5;

/// Whether a column of an embedding is fit to judge and describe by: few
/// heights are `never` or `always`.
pub fn is_usable(embedding: &Embedding, column: usize) -> bool {
    let most = match embedding.formula.slot(embedding.height).kind {
        SlotKind::Threshold(_) => MOST_INFINITE_LEVELS,
        SlotKind::Time => MOST_INFINITE_TIMES,
    };
    let heights = &embedding.columns[column];
    let infinite = heights.iter().filter(|height| height.is_infinite()).count();
    infinite as f64 <= most * heights.len() as f64
}

/// The usable columns of an embedding that say something (more than one
/// value), with infinite heights put beyond the finite ones by a tenth of their
/// range.
pub fn capped(embedding: &Embedding) -> Vec<Vec<f64>> {
    (0..embedding.columns.len())
        .filter(|column| is_usable(embedding, *column))
        .filter_map(|column| cap(&embedding.columns[column]))
        .collect()
}

/// One column, as in [`capped`]; `None` when it has one value only.
pub(super) fn cap(column: &[f64]) -> Option<Vec<f64>> {
    let finite = column.iter().copied().filter(|height| height.is_finite());
    let low = finite.clone().fold(f64::INFINITY, f64::min);
    let high = finite.fold(f64::NEG_INFINITY, f64::max);
    let (low, high) = if low <= high { (low, high) } else { (0.0, 0.0) };
    let beyond = if high > low { 0.1 * (high - low) } else { 1.0 };
    let capped: Vec<f64> = column
        .iter()
        .map(|height| height.clamp(low - beyond, high + beyond))
        .collect();
    let varies = capped
        .windows(2)
        .any(|pair| pair[0].total_cmp(&pair[1]).is_ne());
    varies.then_some(capped)
}

/// Whether at most this share of all heights is `never` or `always`.
pub fn has_enough_finite(embedding: &Embedding, most_infinite: f64) -> bool {
    let all: usize = embedding.columns.iter().map(Vec::len).sum();
    let infinite = embedding
        .columns
        .iter()
        .flatten()
        .filter(|height| height.is_infinite())
        .count();
    infinite as f64 <= most_infinite * all as f64
}

/// Scaled columns as points, at most 16 of them, evenly thinned out. `None`
/// when there is no column.
pub fn scaled(columns: &[Vec<f64>], scaling: Scaling) -> Option<Points> {
    if columns.is_empty() {
        return None;
    }
    let count = columns.len().min(MOST_COLUMNS);
    let chosen = (0..count).map(|k| {
        let column = &columns[(2 * k + 1) * columns.len() / (2 * count)];
        match scaling {
            Scaling::Rank => ranks(column),
            Scaling::SignedLog => signed_log(column),
        }
    });
    Some(Points::new(chosen.collect()))
}

/// Ranks from 0 to 1, ties sharing their mean.
pub(super) fn ranks(column: &[f64]) -> Vec<f64> {
    let order = order(column);
    let mut ranks = vec![0.0; column.len()];
    let mut start = 0;
    while start < order.len() {
        let mut end = start + 1;
        while end < order.len() && column[order[end]].total_cmp(&column[order[start]]).is_eq() {
            end += 1;
        }
        let mean = (start + end - 1) as f64 / 2.0 / column.len() as f64;
        for trace in &order[start..end] {
            ranks[*trace] = mean;
        }
        start = end;
    }
    ranks
}

/// The positions of a column's values in ascending order.
pub(super) fn order(column: &[f64]) -> Vec<usize> {
    let mut order: Vec<usize> = (0..column.len()).collect();
    order.sort_by(|a, b| column[*a].total_cmp(&column[*b]));
    order
}

fn signed_log(column: &[f64]) -> Vec<f64> {
    let mut sorted = column.to_vec();
    sorted.sort_unstable_by(f64::total_cmp);
    let at = |share: f64| sorted[(share * (sorted.len() - 1) as f64).round() as usize];
    let median = at(0.5);
    let quartiles = (at(0.75) - at(0.25)) / 1.35;
    let spread = deviation(column);
    // A column whose middle half hardly varies would blow up its tails.
    let scale = if quartiles * 1.35 < 0.05 * spread {
        spread / 2.0
    } else {
        quartiles
    };
    let bent: Vec<f64> = column
        .iter()
        .map(|x| {
            let z = (x - median) / scale;
            z.signum() * z.abs().ln_1p()
        })
        .collect();
    let spread = deviation(&bent);
    bent.iter()
        .map(|x| x / spread.max(f64::MIN_POSITIVE))
        .collect()
}

/// The standard deviation.
fn deviation(column: &[f64]) -> f64 {
    let n = column.len() as f64;
    let mean = column.iter().sum::<f64>() / n;
    (column.iter().map(|x| (x - mean).powi(2)).sum::<f64>() / n).sqrt()
}

/// Spearman's rank correlation; 0 when a column is constant.
pub fn spearman(a: &[f64], b: &[f64]) -> f64 {
    let (a, b) = (ranks(a), ranks(b));
    let n = a.len() as f64;
    let mean = |x: &[f64]| x.iter().sum::<f64>() / n;
    let (ma, mb) = (mean(&a), mean(&b));
    let mut sums = [0.0; 3];
    for (x, y) in a.iter().zip(&b) {
        sums[0] += (x - ma) * (y - mb);
        sums[1] += (x - ma).powi(2);
        sums[2] += (y - mb).powi(2);
    }
    if sums[1] <= 0.0 || sums[2] <= 0.0 {
        return 0.0;
    }
    sums[0] / (sums[1] * sums[2]).sqrt()
}

/// The share of the commonest value of a column.
pub(super) fn commonest_share(column: &[f64]) -> f64 {
    let order = order(column);
    let (mut longest, mut run) = (0, 0);
    for (at, trace) in order.iter().enumerate() {
        let same = at > 0 && column[order[at - 1]].total_cmp(&column[*trace]).is_eq();
        run = if same { run + 1 } else { 1 };
        longest = longest.max(run);
    }
    f64::from(longest) / column.len() as f64
}

/// The number of different values of a column.
pub(super) fn distinct_values(column: &[f64]) -> usize {
    let mut sorted = column.to_vec();
    sorted.sort_unstable_by(f64::total_cmp);
    sorted.dedup_by(|a, b| a.total_cmp(b).is_eq());
    sorted.len()
}
