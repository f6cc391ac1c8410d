//! How well a template tells given labels apart.
//!
//! score = cross-validated accuracy of a short tree + accuracy of the nearest
//! neighbour (each trace left out in turn) + 0.2 times the label silhouette - 0.005
//! times the size.
//! The first says that a short description exists, the second that the
//! embedding as a whole keeps the labels apart, the third tells apart the many
//! templates that do both perfectly.

use serde::{Deserialize, Serialize};

use super::columns::{Scaling, capped, scaled};
use super::tree::cross_validated_accuracy;
use crate::embedding::Embedding;
use crate::grouping::{Distances, Partition, mean_width};
use crate::support::Stream;
use crate::traces::Labels;

/// Repeats of the cross-validation.
const REPEATS: usize = 3;
/// Most columns that trees look at; more are thinned out evenly.
const TREE_COLUMNS: usize = 32;

/// What a template pays for each unit of its size.
const SIZE_PRICE: f64 = 0.005;

/// A template judged by labels.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct LabelledScore {
    /// What templates are ranked by.
    pub score: f64,
    /// Cross-validated accuracy of a short tree.
    pub accuracy: f64,
    /// Accuracy of the nearest neighbour, each trace left out in turn.
    pub neighbour: f64,
    /// Mean silhouette of the labels in the embedding.
    pub silhouette: f64,
}

/// Judges a template. The same seed gives the same folds for every template.
pub fn score(embedding: &Embedding, labels: &Labels, seed: u64) -> LabelledScore {
    let columns = capped(embedding);
    let Some(points) = scaled(&columns, Scaling::SignedLog) else {
        return LabelledScore {
            score: 0.0,
            accuracy: 0.0,
            neighbour: 0.0,
            silhouette: 0.0,
        };
    };
    let count = columns.len().min(TREE_COLUMNS);
    let thinned: Vec<Vec<f64>> = (0..count)
        .map(|k| columns[(2 * k + 1) * columns.len() / (2 * count)].clone())
        .collect();
    let mut stream = Stream::new(seed, "folds", 0);
    let accuracy = cross_validated_accuracy(
        &thinned,
        &labels.of_trace,
        labels.names.len(),
        REPEATS,
        &mut stream,
    );
    let distances = Distances::euclidean(&points);
    let neighbour = neighbour_accuracy(&distances, &labels.of_trace);
    let silhouette = label_silhouette(&distances, labels);
    LabelledScore {
        score: accuracy + neighbour + 0.2 * silhouette
            - SIZE_PRICE * f64::from(embedding.formula.size()),
        accuracy,
        neighbour,
        silhouette,
    }
}

/// Mean silhouette of the labels.
pub fn label_silhouette(distances: &Distances, labels: &Labels) -> f64 {
    let partition = Partition {
        group_of: labels.of_trace.clone(),
        groups: labels.names.len(),
    };
    mean_width(distances, &partition)
}

/// The share of traces whose nearest other trace has their label. Where several
/// are equally near, the share of those that have it: an embedding with few
/// values must not profit from the order of the traces.
fn neighbour_accuracy(distances: &Distances, label: &[usize]) -> f64 {
    let count = label.len();
    let mut right = 0.0;
    for i in 0..count {
        let row = distances.row(i);
        let others = || (0..count).filter(|j| *j != i);
        let nearest = others().map(|j| row[j]).fold(f64::INFINITY, f64::min);
        let near = nearest * (1.0 + 1e-12);
        let (mut same, mut all) = (0.0, 0.0);
        for j in others().filter(|j| row[*j] <= near) {
            all += 1.0;
            same += f64::from(u8::from(label[j] == label[i]));
        }
        right += if all > 0.0 { same / all } else { 0.0 };
    }
    right / count as f64
}
