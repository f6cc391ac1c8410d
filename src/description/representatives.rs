//! Traces to look at: the typical one of a group, and the one that fits least.

use crate::grouping::{Distances, Partition, widths};

/// Traces of one group, by number.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Representatives {
    /// The medoid: nearest to the others of its group.
    pub typical: usize,
    /// The trace with the smallest silhouette width.
    pub borderline: usize,
}

/// The representatives of each group; `None` for an empty one.
pub fn representatives(
    distances: &Distances,
    partition: &Partition,
) -> Vec<Option<Representatives>> {
    let widths = widths(distances, partition);
    (0..partition.groups)
        .map(|group| {
            let members = partition.members(group);
            let spread = |trace: &usize| -> f64 {
                members
                    .iter()
                    .map(|other| distances.between(*trace, *other))
                    .sum()
            };
            let typical = members
                .iter()
                .min_by(|a, b| spread(a).total_cmp(&spread(b)))?;
            let borderline = members
                .iter()
                .min_by(|a, b| widths[**a].total_cmp(&widths[**b]))?;
            Some(Representatives {
                typical: *typical,
                borderline: *borderline,
            })
        })
        .collect()
}
