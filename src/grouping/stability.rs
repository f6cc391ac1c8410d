//! Whether a grouping comes back when the points change a little.

use super::agreement::adjusted_rand;
use super::kmeans::{KMeans, kmeans, lloyd, nearest};
use super::partition::Partition;
use super::points::Points;
use crate::support::Stream;

/// Starts of k-means on all points and on each bootstrap sample.
const BOOTSTRAP_STARTS: usize = 20;

/// The mean adjusted Rand index between a grouping and those of refitted
/// centroids. In each round the iterations of Lloyd run from the centroids
/// found on a random `share` of the points (at least one for each group), and
/// all points then go to their nearest centroid. In the manner of Ben-Hur,
/// Elisseeff and Guyon (*A stability based method for discovering structure in
/// clustered data*, PSB 2002, 6-17), but without new seeds, so it tells how
/// steady this grouping is, not whether it would be found. 1 for no rounds.
///
/// # Panics
/// When the points are not those of the grouping.
pub fn subsample_stability(
    points: &Points,
    found: &KMeans,
    rounds: usize,
    share: f64,
    stream: &mut Stream,
) -> f64 {
    let count = points.count();
    let wanted = (share * count as f64).round() as usize;
    let size = wanted.max(found.centroids.len()).min(count);
    let agreements = (0..rounds).map(|_| {
        let sample = points.select(&stream.sample(count, size));
        let refitted = lloyd(&sample, found.centroids.clone());
        let labels = nearest(points, &refitted.centroids);
        adjusted_rand(&found.partition.group_of, &labels)
    });
    mean(agreements).unwrap_or(1.0)
}

/// The clusterwise stability of Hennig (*Cluster-wise assessment of cluster
/// stability*, Computational Statistics and Data Analysis 52, 2007, 258-271)
/// for k-means: all points are grouped, then as many drawn with replacement
/// are grouped anew, and each old group is compared with the new one most like
/// it by the Jaccard index (points in both over points in either, among those
/// drawn). The means over the rounds, largest group first; 0.75 and more
/// counts as stable, 0.5 and less as dissolved. A round that draws no point of
/// a group says nothing about it; with no round at all the mean is 0.
///
/// # Panics
/// When there are no points, or no groups are asked for.
pub fn jaccard_stability(
    points: &Points,
    k: usize,
    rounds: usize,
    stream: &mut Stream,
) -> Vec<f64> {
    let found = kmeans(points, k, BOOTSTRAP_STARTS, stream).partition;
    let groups = found.relabelled_by_size();
    let indices: Vec<Vec<Option<f64>>> = (0..rounds)
        .map(|_| one_bootstrap(points, &groups, stream))
        .collect();
    (0..k)
        .map(|group| mean(indices.iter().filter_map(|round| round[group])).unwrap_or(0.0))
        .collect()
}

/// The Jaccard index of each group in one bootstrap sample.
fn one_bootstrap(points: &Points, groups: &Partition, stream: &mut Stream) -> Vec<Option<f64>> {
    let count = points.count();
    let mut drawn: Vec<usize> = (0..count).map(|_| stream.below(count)).collect();
    drawn.sort_unstable();
    let sample = points.select(&drawn);
    let again = kmeans(&sample, groups.groups, BOOTSTRAP_STARTS, stream);
    let mut pairs: Vec<(usize, usize, usize)> = drawn
        .iter()
        .zip(again.partition.group_of)
        .map(|(i, new)| (*i, groups.group_of[*i], new))
        .collect();
    pairs.dedup();
    jaccard(
        pairs.into_iter().map(|(_, old, new)| (old, new)),
        groups.groups,
    )
}

/// The largest Jaccard index of each old group with a new one; `None` for an
/// old group without points.
fn jaccard(pairs: impl Iterator<Item = (usize, usize)>, groups: usize) -> Vec<Option<f64>> {
    let mut both = vec![0usize; groups * groups];
    let (mut olds, mut news) = (vec![0; groups], vec![0; groups]);
    for (old, new) in pairs {
        both[old * groups + new] += 1;
        olds[old] += 1;
        news[new] += 1;
    }
    let index = |old: usize, new: usize| {
        let common = both[old * groups + new];
        common as f64 / (olds[old] + news[new] - common) as f64
    };
    (0..groups)
        .map(|old| {
            let all = (0..groups).filter(|_| olds[old] > 0);
            all.map(|new| index(old, new)).reduce(f64::max)
        })
        .collect()
}

fn mean(values: impl Iterator<Item = f64>) -> Option<f64> {
    let (count, sum) = values.fold((0usize, 0.0), |(n, sum), x| (n + 1, sum + x));
    (count > 0).then(|| sum / count as f64)
}

#[cfg(test)]
mod tests {
    use super::*;

    /// The example of the R package fpc: nine of ten points in common.
    #[test]
    fn jaccard_of_nine_in_ten() {
        let pairs = (0..10).map(|i| (0, usize::from(i == 0)));
        assert_eq!(jaccard(pairs, 2), [Some(0.9), None]);
    }

    #[test]
    fn no_rounds() {
        let points = Points::new(vec![vec![0.0, 1.0, 5.0, 6.0]]);
        let mut stream = Stream::new(1, "test", 0);
        let found = kmeans(&points, 2, 3, &mut stream);
        assert_eq!(
            subsample_stability(&points, &found, 0, 0.6, &mut stream),
            1.0
        );
        assert_eq!(jaccard_stability(&points, 2, 0, &mut stream), [0.0, 0.0]);
    }
}
