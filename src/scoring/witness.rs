//! Witnesses: templates asked whether they, too, see a grouping.
//!
//! A grouping is real when traces of one group are near each other in the
//! embeddings of many other templates. A witness keeps each trace's nearest
//! neighbours; its agreement with a grouping is the share of neighbours in the
//! same group, corrected for chance. Witnesses that say the same count once:
//! each is weighed down by how alike the others are (RV coefficient of Robert
//! and Escoufier, Applied Statistics 25, 1976, to the fourth power).

use super::columns::{Scaling, scaled};
use crate::grouping::{Distances, Partition, Points};

/// Neighbours kept of each trace.
const NEIGHBOURS: usize = 3;
/// Traces that the likeness of witnesses is computed from; more are thinned
/// out evenly.
const MOST_TRACES: usize = 60;

/// What one template says about which traces are alike.
#[derive(Debug, Clone)]
pub struct Witness {
    /// The number of the template.
    pub template: usize,
    /// For each scaling, the nearest neighbours of each trace, nearest first.
    neighbours: Vec<Vec<[u32; NEIGHBOURS]>>,
    /// Centred inner products of (thinned) traces on rank-scaled columns,
    /// normalised to unit length.
    products: Vec<f32>,
}

impl Witness {
    /// The witness of a template's columns; `None` when there are fewer than
    /// five traces or no column.
    pub fn new(template: usize, columns: &[Vec<f64>]) -> Option<Self> {
        if columns.first()?.len() < NEIGHBOURS + 2 {
            return None;
        }
        let scalings = [Scaling::Rank, Scaling::SignedLog];
        let points: Vec<Points> = scalings
            .iter()
            .filter_map(|s| scaled(columns, *s))
            .collect();
        let neighbours = points
            .iter()
            .map(|points| nearest(&Distances::euclidean(points)))
            .collect();
        Some(Witness {
            template,
            neighbours,
            products: products(&points[0]),
        })
    }

    /// Agreement with a grouping beyond chance, from 0 to 1 (kappa).
    pub fn agreement(&self, partition: &Partition) -> f64 {
        let count = partition.group_of.len();
        let mut share = 0.0;
        for table in &self.neighbours {
            let (mut first, mut all) = (0usize, 0usize);
            for (trace, near) in table.iter().enumerate() {
                let own = partition.group_of[trace];
                let same = |other: &u32| usize::from(partition.group_of[*other as usize] == own);
                first += same(&near[0]);
                all += near.iter().map(same).sum::<usize>();
            }
            share += first as f64 / count as f64 / 2.0;
            share += all as f64 / (NEIGHBOURS * count) as f64 / 2.0;
        }
        let observed = share / self.neighbours.len() as f64;
        let chance = chance_agreement(partition);
        ((observed - chance) / (1.0 - chance)).max(0.0)
    }

    /// How alike two witnesses are: the RV coefficient, from 0 to 1.
    pub fn likeness(&self, other: &Witness) -> f64 {
        let dot: f32 = self
            .products
            .iter()
            .zip(&other.products)
            .map(|(a, b)| a * b)
            .sum();
        f64::from(dot.clamp(0.0, 1.0))
    }
}

/// The share of pairs in one group when groups are drawn at random:
/// (N sum share^2 - 1) / (N - 1).
fn chance_agreement(partition: &Partition) -> f64 {
    let n = partition.group_of.len() as f64;
    let squares: f64 = partition
        .sizes()
        .iter()
        .map(|size| (*size as f64 / n).powi(2))
        .sum();
    (n * squares - 1.0) / (n - 1.0)
}

/// The entropy of the group shares: pays for more and for evener groups.
pub(super) fn entropy(partition: &Partition) -> f64 {
    let n = partition.group_of.len() as f64;
    let shares = partition.sizes().into_iter().filter(|size| *size > 0);
    shares
        .map(|size| size as f64 / n)
        .map(|share| -share * share.ln())
        .sum()
}

/// The weight of each witness: one over how many are like it, summing to 1.
pub(super) fn weights(witnesses: &[Witness]) -> Vec<f64> {
    let mut crowd = vec![1.0; witnesses.len()];
    for first in 0..witnesses.len() {
        for second in first + 1..witnesses.len() {
            let alike = witnesses[first].likeness(&witnesses[second]).powi(4);
            crowd[first] += alike;
            crowd[second] += alike;
        }
    }
    let weights: Vec<f64> = crowd.iter().map(|crowd| 1.0 / crowd).collect();
    let sum: f64 = weights.iter().sum();
    weights.iter().map(|weight| weight / sum).collect()
}

fn nearest(distances: &Distances) -> Vec<[u32; NEIGHBOURS]> {
    (0..distances.count())
        .map(|trace| {
            let row = distances.row(trace);
            let mut near = [(f64::INFINITY, 0u32); NEIGHBOURS];
            for (other, distance) in row.iter().enumerate() {
                if other == trace || *distance >= near[NEIGHBOURS - 1].0 {
                    continue;
                }
                let place = near.partition_point(|(d, _)| d <= distance);
                near[place..].rotate_right(1);
                near[place] = (*distance, other as u32);
            }
            near.map(|(_, other)| other)
        })
        .collect()
}

/// Centred inner products of the thinned traces, as one unit vector.
fn products(points: &Points) -> Vec<f32> {
    let count = points.count();
    let kept = count.min(MOST_TRACES);
    let chosen: Vec<usize> = (0..kept).map(|k| k * count / kept).collect();
    let mut products = vec![0.0f32; kept * kept];
    for dimension in 0..points.dimensions() {
        let column = points.column(dimension);
        let mean = chosen.iter().map(|trace| column[*trace]).sum::<f64>() / kept as f64;
        let centred: Vec<f32> = chosen.iter().map(|t| (column[*t] - mean) as f32).collect();
        for (row, left) in products.chunks_exact_mut(kept).zip(&centred) {
            for (product, right) in row.iter_mut().zip(&centred) {
                *product += left * right;
            }
        }
    }
    let length = products.iter().map(|p| p * p).sum::<f32>().sqrt();
    if length > 0.0 {
        products.iter_mut().for_each(|product| *product /= length);
    }
    products
}
