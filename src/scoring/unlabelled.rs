//! Groups found without labels: witness consensus.
//!
//! 1. **Columns** of a template's embedding that survive a little noise on the
//!    traces are kept.
//! 2. **Candidates**: k-means for k = 2 to 7 in two scalings.
//! 3. **Guards** throw out groupings that are tiny, that flip with noise, or
//!    that rest on `never` and `always` or on a handful of values.
//! 4. **Witnesses**: every other template says how well it sees a grouping.
//! 5. **Score** = stability times the weighted sum of (agreement^4 times
//!    entropy)^2. The high power prefers some witnesses that see it almost
//!    perfectly to many that see a blunt split; entropy stops two groups from
//!    always winning.

use rayon::prelude::*;

use super::columns::{
    Scaling, cap, commonest_share, distinct_values, has_enough_finite, scaled, spearman,
};
use super::witness::{Witness, entropy, weights};
use crate::embedding::Embedding;
use crate::grouping::{
    Distances, Partition, adjusted_rand, kmeans, mean_width, nearest, subsample_stability,
};
use crate::support::Stream;

/// Numbers of groups tried.
const GROUPS: std::ops::RangeInclusive<usize> = 2..=7;
/// Starts of k-means.
const STARTS: usize = 3;
/// Rounds and share of the subsamples that stability is measured with.
const ROUNDS: usize = 8;
const SHARE: f64 = 0.6;
/// Most witnesses; more are thinned out evenly over the search.
const MOST_WITNESSES: usize = 250;
/// Most candidates scored; the most stable ones.
const MOST_CANDIDATES: usize = 4000;
/// Fewer candidates than this relax the guards.
const FEWEST_CANDIDATES: usize = 20;

/// What a grouping must be to be considered.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Guards {
    /// Smallest share of traces in a group.
    pub smallest_group: f64,
    /// Largest share of `never` and `always` among the heights.
    pub most_infinite: f64,
    /// Smallest median share of different values in a column.
    pub distinct: f64,
    /// Smallest agreement with the grouping of the noisy traces.
    pub noise_agreement: f64,
}

impl Guards {
    /// The guards to start with.
    pub const STRICT: Guards = Guards {
        smallest_group: 0.10,
        most_infinite: 0.10,
        distinct: 0.30,
        noise_agreement: 0.80,
    };
    /// What they are relaxed to where hardly anything passes.
    pub const RELAXED: Guards = Guards {
        smallest_group: 0.05,
        noise_agreement: 0.70,
        ..Guards::STRICT
    };
}

/// A grouping proposed by one template.
#[derive(Debug, Clone)]
pub struct Candidate {
    /// The number of the template.
    pub template: usize,
    /// The size of the template.
    pub size: u32,
    /// The grouping.
    pub partition: Partition,
    /// Mean adjusted Rand index to groupings refitted on subsamples.
    pub stability: f64,
    /// Adjusted Rand index to the grouping of the noisy traces.
    pub noise_agreement: f64,
    /// Mean silhouette in the scaling it was found in.
    pub silhouette: f64,
    /// Share of traces in the smallest group.
    smallest: f64,
}

/// A scored grouping.
#[derive(Debug, Clone)]
pub struct Grouping {
    /// The candidate.
    pub candidate: Candidate,
    /// What groupings are ranked by.
    pub score: f64,
    /// Share of the witnesses, by weight, that agree at 0.8 or better.
    pub support: f64,
}

/// What one template contributes.
#[derive(Debug, Clone)]
struct Contribution {
    candidates: Vec<Candidate>,
    witness: Option<Witness>,
}

/// Everything proposed so far.
#[derive(Debug, Clone, Default)]
pub struct Consensus {
    contributions: Vec<Contribution>,
}

impl Consensus {
    /// Adds templates: numbers, embeddings, and embeddings of the noisy traces
    /// on the same axes. On all cores; the order of the result is that given.
    pub fn add(&mut self, templates: &[(usize, &Embedding, &Embedding)], seed: u64) {
        let found: Vec<Contribution> = templates
            .par_iter()
            .map(|(number, embedding, noisy)| contribution(*number, embedding, noisy, seed))
            .collect();
        self.contributions.extend(found);
    }

    /// The number of candidates proposed.
    pub fn candidates(&self) -> usize {
        self.contributions.iter().map(|c| c.candidates.len()).sum()
    }

    /// The scored groupings, best first; and the guards that were applied.
    pub fn finish(&self) -> (Vec<Grouping>, Guards) {
        let (candidates, guards) = self.guarded();
        let witnesses = self.witnesses();
        let weights = weights(&witnesses);
        let mut found: Vec<Grouping> = candidates
            .into_par_iter()
            .map(|candidate| judge(candidate, &witnesses, &weights))
            .collect();
        found.sort_by(|a, b| {
            b.score
                .total_cmp(&a.score)
                .then(a.candidate.size.cmp(&b.candidate.size))
                .then(a.candidate.template.cmp(&b.candidate.template))
        });
        (found, guards)
    }

    fn guarded(&self) -> (Vec<Candidate>, Guards) {
        let pass = |guards: Guards| -> Vec<Candidate> {
            let all = self.contributions.iter().flat_map(|c| &c.candidates);
            all.filter(|candidate| {
                candidate.smallest >= guards.smallest_group
                    && candidate.noise_agreement >= guards.noise_agreement
            })
            .cloned()
            .collect()
        };
        let mut guards = Guards::STRICT;
        let mut candidates = pass(guards);
        if candidates.len() < FEWEST_CANDIDATES {
            guards = Guards::RELAXED;
            candidates = pass(guards);
        }
        if candidates.len() > MOST_CANDIDATES {
            candidates.sort_by(|a, b| {
                b.stability
                    .total_cmp(&a.stability)
                    .then(a.template.cmp(&b.template))
            });
            candidates.truncate(MOST_CANDIDATES);
        }
        (candidates, guards)
    }

    fn witnesses(&self) -> Vec<Witness> {
        let all: Vec<&Witness> = self
            .contributions
            .iter()
            .filter_map(|c| c.witness.as_ref())
            .collect();
        let kept = all.len().min(MOST_WITNESSES);
        (0..kept)
            .map(|k| all[k * all.len() / kept].clone())
            .collect()
    }
}

/// The best score for each number of groups, from 2, over templates given as
/// scaled columns: what the chance test repeats on surrogates. No noise guard,
/// since surrogates have no traces to add noise to.
pub(super) fn best_by_groups(templates: &[Vec<Vec<f64>>], seed: u64) -> Vec<f64> {
    let contributions: Vec<Contribution> = templates
        .par_iter()
        .enumerate()
        .map(|(number, columns)| {
            let mut candidates = Vec::new();
            propose(
                number,
                0,
                columns,
                columns,
                Scaling::SignedLog,
                seed,
                &mut candidates,
            );
            Contribution {
                candidates,
                witness: Witness::new(number, columns),
            }
        })
        .collect();
    let (found, _) = Consensus { contributions }.finish();
    GROUPS
        .map(|groups| {
            let of_size = found
                .iter()
                .filter(|g| g.candidate.partition.groups == groups);
            of_size.map(|g| g.score).fold(0.0, f64::max)
        })
        .collect()
}

fn judge(candidate: Candidate, witnesses: &[Witness], weights: &[f64]) -> Grouping {
    let evenness = entropy(&candidate.partition);
    let (mut sum, mut support, mut all) = (0.0, 0.0, 0.0);
    for (witness, weight) in witnesses.iter().zip(weights) {
        // A template is no witness to its own grouping.
        if witness.template == candidate.template {
            continue;
        }
        let kappa = witness.agreement(&candidate.partition);
        sum += weight * (kappa.powi(4) * evenness).powi(2);
        all += weight;
        if kappa >= 0.8 {
            support += weight;
        }
    }
    Grouping {
        score: candidate.stability * sum,
        support: if all > 0.0 { support / all } else { 0.0 },
        candidate,
    }
}

/// The columns that survive noise, and what is proposed on them.
fn contribution(
    number: usize,
    embedding: &Embedding,
    noisy: &Embedding,
    seed: u64,
) -> Contribution {
    let none = Contribution {
        candidates: Vec::new(),
        witness: None,
    };
    if !has_enough_finite(embedding, Guards::STRICT.most_infinite) {
        return none;
    }
    let (columns, noisy_columns) = kept_columns(embedding, noisy);
    let Some(first) = columns.first() else {
        return none;
    };
    let count = first.len();
    let mut shares: Vec<f64> = columns
        .iter()
        .map(|column| distinct_values(column) as f64 / count as f64)
        .collect();
    shares.sort_unstable_by(f64::total_cmp);
    let distinct = shares[shares.len() / 2];
    if distinct < 0.2 {
        return none;
    }
    let mut candidates = Vec::new();
    if distinct >= Guards::STRICT.distinct {
        for scaling in [Scaling::Rank, Scaling::SignedLog] {
            let size = embedding.formula.size();
            propose(
                number,
                size,
                &columns,
                &noisy_columns,
                scaling,
                seed,
                &mut candidates,
            );
        }
    }
    Contribution {
        candidates,
        witness: Witness::new(number, &columns),
    }
}

fn kept_columns(embedding: &Embedding, noisy: &Embedding) -> (Vec<Vec<f64>>, Vec<Vec<f64>>) {
    let mut kept = (Vec::new(), Vec::new());
    for (column, with_noise) in embedding.columns.iter().zip(&noisy.columns) {
        let (Some(clean), Some(rough)) = (cap(column), cap(with_noise)) else {
            continue;
        };
        if commonest_share(&clean) <= 0.9 && spearman(&clean, &rough) >= 0.9 {
            kept.0.push(clean);
            kept.1.push(rough);
        }
    }
    kept
}

/// Groupings of one template in one scaling.
fn propose(
    template: usize,
    size: u32,
    columns: &[Vec<f64>],
    noisy: &[Vec<f64>],
    scaling: Scaling,
    seed: u64,
    candidates: &mut Vec<Candidate>,
) {
    let (Some(points), Some(rough)) = (scaled(columns, scaling), scaled(noisy, scaling)) else {
        return;
    };
    let count = points.count();
    let mut distances: Option<Distances> = None;
    for groups in GROUPS.filter(|groups| 2 * groups <= count) {
        let mut stream = Stream::new(seed, "groups", (template * 16 + groups) as u64);
        let found = kmeans(&points, groups, STARTS, &mut stream);
        let smallest = found.partition.sizes().into_iter().min().unwrap_or(0);
        let smallest = smallest as f64 / count as f64;
        if smallest < Guards::RELAXED.smallest_group {
            continue;
        }
        let noise_agreement = adjusted_rand(
            &found.partition.group_of,
            &nearest(&rough, &found.centroids),
        );
        if noise_agreement < Guards::RELAXED.noise_agreement {
            continue;
        }
        let stability = subsample_stability(&points, &found, ROUNDS, SHARE, &mut stream);
        let distances = distances.get_or_insert_with(|| Distances::euclidean(&points));
        candidates.push(Candidate {
            template,
            size,
            stability,
            noise_agreement,
            silhouette: mean_width(distances, &found.partition),
            partition: found.partition.relabelled_by_size(),
            smallest,
        });
    }
}
