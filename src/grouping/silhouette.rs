//! Silhouettes (Rousseeuw, *Silhouettes: a graphical aid to the interpretation
//! and validation of cluster analysis*, Journal of Computational and Applied
//! Mathematics 20, 1987, 53-65).
//!
//! The width of a point is (b - a) / max(a, b), where a is its mean distance to
//! the others of its group and b the smallest mean distance to another group.
//! A point alone in its group has width 0, as the paper sets. 0/0 counts as 0.
//! With one group there is no b, and every width is 0.

use super::distance::Distances;
use super::partition::Partition;

/// The silhouette width of each point, in [-1, 1].
///
/// # Panics
/// When the distances and the partition are of different numbers of points.
pub fn widths(distances: &Distances, partition: &Partition) -> Vec<f64> {
    let count = distances.count();
    assert_eq!(partition.group_of.len(), count, "one group for each point");
    let sizes = partition.sizes();
    let sums = sums_by_group(distances, partition);
    (0..count)
        .map(|i| {
            let own = partition.group_of[i];
            if sizes[own] < 2 {
                return 0.0;
            }
            let a = sums[own * count + i] / (sizes[own] - 1) as f64;
            let b = (0..partition.groups)
                .filter(|group| *group != own && sizes[*group] > 0)
                .map(|group| sums[group * count + i] / sizes[group] as f64)
                .reduce(f64::min);
            b.map_or(0.0, |b| width(a, b))
        })
        .collect()
}

/// The mean silhouette width of all points; 0 when there are none.
///
/// # Panics
/// When the distances and the partition are of different numbers of points.
pub fn mean_width(distances: &Distances, partition: &Partition) -> f64 {
    let widths = widths(distances, partition);
    widths.iter().sum::<f64>() / widths.len().max(1) as f64
}

fn width(a: f64, b: f64) -> f64 {
    let larger = a.max(b);
    if larger > 0.0 { (b - a) / larger } else { 0.0 }
}

/// The sum of distances of each point to each group, group after group. Since
/// distances are symmetric, whole rows are added instead of single values.
fn sums_by_group(distances: &Distances, partition: &Partition) -> Vec<f64> {
    let count = distances.count();
    let mut sums = vec![0.0; partition.groups * count];
    for (j, group) in partition.group_of.iter().enumerate() {
        let to_group = &mut sums[group * count..(group + 1) * count];
        for (sum, distance) in to_group.iter_mut().zip(distances.row(j)) {
            *sum += distance;
        }
    }
    sums
}

#[cfg(test)]
mod tests {
    use super::super::points::Points;
    use super::*;

    #[test]
    fn two_pairs_on_a_line() {
        let points = Points::new(vec![vec![0.0, 1.0, 4.0, 5.0]]);
        let distances = Distances::euclidean(&points);
        let mut partition = Partition {
            group_of: vec![0, 0, 2, 2],
            groups: 3,
        };
        let expected = [1.0 - 1.0 / 4.5, 1.0 - 1.0 / 3.5];
        let found = widths(&distances, &partition);
        assert!((found[0] - expected[0]).abs() < 1e-15);
        assert!((found[2] - expected[1]).abs() < 1e-15);
        partition.group_of = vec![1; 4];
        assert_eq!(mean_width(&distances, &partition), 0.0);
    }
}
