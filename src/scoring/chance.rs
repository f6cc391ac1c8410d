//! How well luck would do after so many tries.
//!
//! **With labels**: labels are shuffled, and each time the *largest* label
//! silhouette over all templates looked at is kept (the single-step maximum of
//! Westfall and Young 1993). A template's p-value is (b + 1) / (m + 1) with b
//! the number of m shuffles whose largest is at least its own (Phipson and
//! Smyth 2010). Where only a sample of the templates is looked at, the p-value
//! is raised to that of as many independent samples as make up the search,
//! 1 - (1 - p)^(searched / looked at), which errs on the safe side because
//! templates are not independent.
//!
//! **Without labels** there is nothing to shuffle, and even a cloud without
//! groups falls into "groups" of good silhouette. So the data is compared with
//! surrogates of itself: the scaled columns of a sample of templates side by
//! side, their principal components shuffled over the traces one by one (which
//! keeps all correlations and destroys groups), and the whole grouping done
//! again. The statistic is the largest, over the number of groups k, of the
//! best score at k divided by the median over the draws of the best at k.

use nalgebra::{DMatrix, SymmetricEigen};
use rayon::prelude::*;

use super::columns::{Scaling, capped, scaled};
use super::labelled::label_silhouette;
use super::unlabelled::best_by_groups;
use crate::embedding::Embedding;
use crate::grouping::Distances;
use crate::support::Stream;
use crate::traces::Labels;

/// Most memory for distance matrices, in numbers.
const MOST_DISTANCES: usize = 25_000_000;
/// Most templates looked at with labels.
const MOST_TEMPLATES: usize = 300;
/// Most templates and traces that surrogates are made of.
const SURROGATE_TEMPLATES: usize = 40;
const SURROGATE_TRACES: usize = 200;

/// How far a result can be believed.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Verdict {
    /// Chance does not explain it.
    Reliable,
    /// Chance would do as well.
    Chance,
    /// Too few traces to tell.
    TooFew,
}

impl Verdict {
    /// The word in results.
    pub fn name(self) -> &'static str {
        match self {
            Verdict::Reliable => "reliable",
            Verdict::Chance => "chance",
            Verdict::TooFew => "too-few",
        }
    }
}

/// The p-value of a permutation test of which `at_least` of `draws` random
/// draws were at least as large: (b + 1) / (m + 1).
pub fn permutation_p_value(at_least: usize, draws: usize) -> f64 {
    (at_least + 1) as f64 / (draws + 1) as f64
}

/// For each observed statistic the number of draws whose maximum is at least
/// as large, up to rounding.
pub fn adjusted_by_maximum(observed: &[f64], maxima: &[f64]) -> Vec<usize> {
    observed
        .iter()
        .map(|value| maxima.iter().filter(|max| **max >= value - 1e-12).count())
        .collect()
}

/// What a permutation test with labels found.
#[derive(Debug, Clone, PartialEq)]
pub struct LabelChance {
    /// The p-value of each template asked about.
    pub p_values: Vec<f64>,
    /// Templates looked at.
    pub looked_at: usize,
    /// Shuffles.
    pub draws: usize,
}

/// Tests templates against shuffled labels. The first `asked` embeddings get
/// p-values; the others only stand for the rest of the search, of which
/// `searched` templates were scored.
pub fn label_chance(
    embeddings: &[&Embedding],
    asked: usize,
    searched: usize,
    labels: &Labels,
    draws: usize,
    seed: u64,
) -> LabelChance {
    let traces = labels.of_trace.len();
    let most = (MOST_DISTANCES / (traces * traces).max(1)).clamp(1, MOST_TEMPLATES);
    let tables: Vec<Option<Distances>> = embeddings
        .par_iter()
        .take(most.max(asked))
        .map(|embedding| {
            scaled(&capped(embedding), Scaling::SignedLog).map(|p| Distances::euclidean(&p))
        })
        .collect();
    let statistic = |labels: &Labels, table: &Option<Distances>| {
        table
            .as_ref()
            .map_or(-1.0, |table| label_silhouette(table, labels))
    };
    let observed: Vec<f64> = tables
        .iter()
        .take(asked)
        .map(|table| statistic(labels, table))
        .collect();
    let maxima: Vec<f64> = (0..draws)
        .into_par_iter()
        .map(|draw| {
            let mut shuffled = labels.clone();
            Stream::new(seed, "labels", draw as u64).shuffle(&mut shuffled.of_trace);
            tables
                .iter()
                .map(|table| statistic(&shuffled, table))
                .fold(-1.0, f64::max)
        })
        .collect();
    let blocks = (searched as f64 / tables.len().max(1) as f64).max(1.0);
    let p_values = adjusted_by_maximum(&observed, &maxima)
        .into_iter()
        .map(|count| 1.0 - (1.0 - permutation_p_value(count, draws)).powf(blocks))
        .collect();
    LabelChance {
        p_values,
        looked_at: tables.len(),
        draws,
    }
}

/// What a test against surrogates found.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct SurrogateChance {
    /// The p-value of the groups as a whole.
    pub p_value: f64,
    /// Templates and traces that the test was made on.
    pub templates: usize,
    /// See `templates`.
    pub traces: usize,
    /// Draws.
    pub draws: usize,
}

/// Tests whether the groups found could come from a cloud without groups.
/// `None` when there are too few usable columns.
pub fn surrogate_chance(
    embeddings: &[&Embedding],
    draws: usize,
    seed: u64,
) -> Option<SurrogateChance> {
    let (columns, widths) = sample_columns(embeddings);
    let traces = columns.first()?.len();
    let observed = best_by_groups(&cut(&columns, &widths), seed);
    let components = Components::of(&columns)?;
    let random: Vec<Vec<f64>> = (0..draws)
        .map(|draw| {
            let surrogate = components.shuffled(&mut Stream::new(seed, "surrogate", draw as u64));
            best_by_groups(&cut(&surrogate, &widths), seed)
        })
        .collect();
    let medians: Vec<f64> = (0..observed.len())
        .map(|k| {
            let mut best: Vec<f64> = random.iter().map(|draw| draw[k]).collect();
            best.sort_unstable_by(f64::total_cmp);
            best[best.len() / 2]
        })
        .collect();
    let statistic = |best: &[f64]| {
        let ratios = best
            .iter()
            .zip(&medians)
            .filter(|(_, median)| **median > 0.0);
        ratios
            .map(|(best, median)| best / median)
            .fold(0.0, f64::max)
    };
    let own = statistic(&observed);
    let at_least = random.iter().filter(|draw| statistic(draw) >= own).count();
    Some(SurrogateChance {
        p_value: permutation_p_value(at_least, draws),
        templates: widths.len(),
        traces,
        draws,
    })
}

/// Scaled columns of a sample of templates and traces, side by side, and how
/// many columns each template has.
fn sample_columns(embeddings: &[&Embedding]) -> (Vec<Vec<f64>>, Vec<usize>) {
    let count = embeddings.len().min(SURROGATE_TEMPLATES);
    let mut columns = Vec::new();
    let mut widths = Vec::new();
    for k in 0..count {
        let embedding = embeddings[k * embeddings.len() / count];
        let Some(points) = scaled(&capped(embedding), Scaling::SignedLog) else {
            continue;
        };
        widths.push(points.dimensions());
        let kept = points.count().min(SURROGATE_TRACES);
        for dimension in 0..points.dimensions() {
            let column = points.column(dimension);
            columns.push((0..kept).map(|i| column[i * column.len() / kept]).collect());
        }
    }
    (columns, widths)
}

/// Columns side by side, cut back into templates.
fn cut(columns: &[Vec<f64>], widths: &[usize]) -> Vec<Vec<Vec<f64>>> {
    let mut rest = columns;
    widths
        .iter()
        .map(|width| {
            let (own, others) = rest.split_at(*width);
            rest = others;
            own.to_vec()
        })
        .collect()
}

/// Principal components of columns.
struct Components {
    /// Traces by components.
    scores: DMatrix<f64>,
    /// Components by columns, orthonormal rows.
    axes: DMatrix<f64>,
    means: Vec<f64>,
}

impl Components {
    fn of(columns: &[Vec<f64>]) -> Option<Self> {
        let traces = columns.first()?.len();
        let means: Vec<f64> = columns
            .iter()
            .map(|c| c.iter().sum::<f64>() / traces as f64)
            .collect();
        let data = DMatrix::from_fn(traces, columns.len(), |i, j| columns[j][i] - means[j]);
        let eigen = SymmetricEigen::new(&data * data.transpose());
        let largest = eigen.eigenvalues.max();
        let kept: Vec<usize> = (0..traces)
            .filter(|at| eigen.eigenvalues[*at] > 1e-9 * largest)
            .collect();
        if kept.is_empty() {
            return None;
        }
        let root = |at: usize| eigen.eigenvalues[kept[at]].sqrt();
        let vectors = DMatrix::from_fn(traces, kept.len(), |i, at| {
            eigen.eigenvectors[(i, kept[at])]
        });
        let mut axes = vectors.transpose() * &data;
        for (at, mut row) in axes.row_iter_mut().enumerate() {
            row /= root(at);
        }
        let scores = DMatrix::from_fn(traces, kept.len(), |i, at| vectors[(i, at)] * root(at));
        Some(Components {
            scores,
            axes,
            means,
        })
    }

    /// Columns rebuilt after shuffling each component over the traces.
    fn shuffled(&self, stream: &mut Stream) -> Vec<Vec<f64>> {
        let mut scores = self.scores.clone();
        for mut component in scores.column_iter_mut() {
            stream.shuffle(component.as_mut_slice());
        }
        let data = scores * &self.axes;
        (0..self.means.len())
            .map(|j| data.column(j).iter().map(|x| x + self.means[j]).collect())
            .collect()
    }
}
