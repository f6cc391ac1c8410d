//! k-means: seeds by k-means++ (Arthur and Vassilvitskii, *k-means++: the
//! advantages of careful seeding*, SODA 2007, 1027-1035), then the iterations
//! of Lloyd (*Least squares quantization in PCM*, IEEE Transactions on
//! Information Theory 28, 1982, 129-137).

use super::partition::Partition;
use super::points::Points;
use crate::support::Stream;

/// Most iterations of one start; a few dozen are usual.
const MOST_ITERATIONS: usize = 300;

/// A grouping found by k-means.
#[derive(Debug, Clone, PartialEq)]
pub struct KMeans {
    /// Each point is in the group of its nearest centroid. A group is empty
    /// only where there are fewer different points than groups.
    pub partition: Partition,
    /// The centroids, `[group][dimension]`.
    pub centroids: Vec<Vec<f64>>,
    /// The squared distances of all points to their centroids, summed.
    pub sum_of_squares: f64,
}

/// The best of several starts of k-means, the first of equally good ones. At
/// least one start is made.
///
/// # Panics
/// When there are no points, or no groups are asked for.
pub fn kmeans(points: &Points, k: usize, starts: usize, stream: &mut Stream) -> KMeans {
    assert!(
        points.count() > 0 && k > 0,
        "k-means needs points and groups"
    );
    let mut best = lloyd(points, seeds(points, k, stream));
    for _ in 1..starts {
        let found = lloyd(points, seeds(points, k, stream));
        if found.sum_of_squares < best.sum_of_squares {
            best = found;
        }
    }
    best
}

/// The group of the nearest centroid, for points that may be new; of equally
/// near centroids the first.
///
/// # Panics
/// When a centroid has fewer dimensions than the points.
pub fn nearest(points: &Points, centroids: &[Vec<f64>]) -> Vec<usize> {
    let mut assignment = Assignment::new(points.count());
    assignment.assign(points, centroids);
    assignment.group_of
}

/// Iterations from given centroids until no point changes its group.
pub(super) fn lloyd(points: &Points, mut centroids: Vec<Vec<f64>>) -> KMeans {
    let mut now = Assignment::new(points.count());
    now.assign(points, &centroids);
    let mut before = Vec::new();
    for _ in 0..MOST_ITERATIONS {
        before.clone_from(&now.group_of);
        move_centroids(points, &mut now, &mut centroids);
        now.assign(points, &centroids);
        if now.group_of == before && !now.can_fill(centroids.len()) {
            break;
        }
    }
    KMeans {
        sum_of_squares: now.squares.iter().sum(),
        partition: Partition {
            group_of: now.group_of,
            groups: centroids.len(),
        },
        centroids,
    }
}

/// The nearest centroid of each point, with room for the work.
struct Assignment {
    group_of: Vec<usize>,
    /// Squared distance of each point to its centroid.
    squares: Vec<f64>,
    room: Vec<f64>,
}

impl Assignment {
    fn new(count: usize) -> Assignment {
        Assignment {
            group_of: vec![0; count],
            squares: vec![f64::INFINITY; count],
            room: vec![0.0; count],
        }
    }

    fn assign(&mut self, points: &Points, centroids: &[Vec<f64>]) {
        self.group_of.fill(0);
        self.squares.fill(f64::INFINITY);
        for (group, centroid) in centroids.iter().enumerate() {
            self.offer(points, group, centroid);
        }
    }

    /// Whether a group is empty though some point is away from its centroid.
    fn can_fill(&self, groups: usize) -> bool {
        let mut is_empty = vec![true; groups];
        for group in &self.group_of {
            is_empty[*group] = false;
        }
        is_empty.contains(&true) && self.squares.iter().any(|square| *square > 0.0)
    }

    /// Gives the points nearer to this centroid than to their own to `group`.
    fn offer(&mut self, points: &Points, group: usize, centroid: &[f64]) {
        self.room.fill(0.0);
        for (j, column) in points.columns().iter().enumerate() {
            let c = centroid[j];
            for (sum, x) in self.room.iter_mut().zip(column) {
                *sum += (x - c) * (x - c);
            }
        }
        let mine = self.squares.iter_mut().zip(&mut self.group_of);
        for ((square, own), found) in mine.zip(&self.room) {
            let nearer = found < square;
            *own = if nearer { group } else { *own };
            *square = if nearer { *found } else { *square };
        }
    }
}

/// Puts each centroid in the middle of its group. That of an empty group goes
/// to the point farthest from its own centroid.
fn move_centroids(points: &Points, now: &mut Assignment, centroids: &mut [Vec<f64>]) {
    let (order, starts) = by_group(&now.group_of, centroids.len());
    for (group, centroid) in centroids.iter_mut().enumerate() {
        let members = &order[starts[group]..starts[group + 1]];
        if members.is_empty() {
            let far = farthest(&now.squares);
            now.squares[far] = 0.0;
            *centroid = points.point(far);
            continue;
        }
        for (mean, column) in centroid.iter_mut().zip(points.columns()) {
            *mean = sum(column, members) / members.len() as f64;
        }
    }
}

/// The points sorted by group, and where each group starts.
fn by_group(group_of: &[usize], groups: usize) -> (Vec<usize>, Vec<usize>) {
    let mut starts = vec![0; groups + 1];
    for group in group_of {
        starts[group + 1] += 1;
    }
    for group in 0..groups {
        starts[group + 1] += starts[group];
    }
    let mut next = starts.clone();
    let mut order = vec![0; group_of.len()];
    for (i, group) in group_of.iter().enumerate() {
        order[next[*group]] = i;
        next[*group] += 1;
    }
    (order, starts)
}

/// The sum of some values, in four lanes that do not wait for each other.
fn sum(values: &[f64], chosen: &[usize]) -> f64 {
    let mut lanes = [0.0; 4];
    let (fours, rest) = chosen.as_chunks::<4>();
    for four in fours {
        for (lane, i) in lanes.iter_mut().zip(four) {
            *lane += values[*i];
        }
    }
    for (lane, i) in lanes.iter_mut().zip(rest) {
        *lane += values[*i];
    }
    (lanes[0] + lanes[1]) + (lanes[2] + lanes[3])
}

/// The place of the largest value, the first of equal ones.
fn farthest(squares: &[f64]) -> usize {
    let mut best = 0;
    for (i, square) in squares.iter().enumerate() {
        if *square > squares[best] {
            best = i;
        }
    }
    best
}

/// Seeds of k-means++: the first at random, each next with a probability
/// proportional to its squared distance to the nearest seed so far.
fn seeds(points: &Points, k: usize, stream: &mut Stream) -> Vec<Vec<f64>> {
    let mut near = Assignment::new(points.count());
    let mut chosen = stream.below(points.count());
    let mut seeds = Vec::with_capacity(k);
    loop {
        let seed = points.point(chosen);
        near.offer(points, seeds.len(), &seed);
        seeds.push(seed);
        if seeds.len() == k {
            return seeds;
        }
        chosen = weighted(&near.squares, stream);
    }
}

/// A place drawn with probability proportional to its weight; the first when
/// all weights are 0, for then every point is a seed already.
fn weighted(weights: &[f64], stream: &mut Stream) -> usize {
    let mut left = stream.uniform() * weights.iter().sum::<f64>();
    let mut last = 0;
    for (i, weight) in weights.iter().enumerate() {
        if *weight > 0.0 {
            last = i;
            left -= weight;
            if left < 0.0 {
                break;
            }
        }
    }
    last
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn weights_are_kept_to() {
        let mut stream = Stream::new(1, "test", 0);
        let mut counts = [0.0f64; 4];
        for _ in 0..40_000 {
            counts[weighted(&[1.0, 0.0, 2.0, 5.0], &mut stream)] += 1.0;
        }
        for (count, share) in counts.iter().zip([0.125, 0.0, 0.25, 0.625]) {
            assert!((count / 40_000.0 - share).abs() < 0.01, "{counts:?}");
        }
        assert_eq!(weighted(&[0.0, 0.0], &mut stream), 0);
    }

    #[test]
    fn an_empty_group_takes_the_farthest_point() {
        let points = Points::new(vec![vec![0.0, 1.0, 2.0, 9.0]]);
        let found = lloyd(&points, vec![vec![1.0], vec![1000.0]]);
        assert_eq!(found.partition.group_of, [0, 0, 0, 1]);
        assert_eq!(found.centroids, [[1.0], [9.0]]);
        assert_eq!(found.sum_of_squares, 2.0);
    }

    #[test]
    fn every_group_that_can_be_filled_is_filled() {
        // Two empty groups take two points.
        let points = Points::new(vec![vec![0.0, 1.0, 8.0, 9.0]]);
        let found = lloyd(&points, vec![vec![1.0], vec![99.0], vec![99.0]]);
        assert_eq!(found.partition.sizes().iter().min(), Some(&1));
        // The farthest point is alone and its centroid has just come to it.
        let points = Points::new(vec![vec![0.0, 1.0, 2.0, 100.0]]);
        let found = lloyd(&points, vec![vec![1.0], vec![150.0], vec![999.0]]);
        assert_eq!(found.partition.sizes().iter().min(), Some(&1));
    }

    #[test]
    fn of_equally_near_centroids_the_first() {
        let points = Points::new(vec![vec![1.0, 2.0]]);
        let centroids = [vec![0.0], vec![2.0], vec![2.0]];
        assert_eq!(nearest(&points, &centroids), [0, 1]);
    }

    #[test]
    fn fewer_different_points_than_groups() {
        let points = Points::new(vec![vec![2.0, 2.0, 5.0]]);
        let found = kmeans(&points, 3, 5, &mut Stream::new(1, "test", 0));
        assert_eq!(found.sum_of_squares, 0.0);
        assert_eq!(found.partition.groups, 3);
        assert_eq!(nearest(&points, &found.centroids), found.partition.group_of);
    }

    #[test]
    fn lanes_sum_every_value() {
        let values: Vec<f64> = (0..11).map(f64::from).collect();
        for count in 0..11 {
            let chosen: Vec<usize> = (0..count).collect();
            let expected: f64 = values[..count].iter().sum();
            assert_eq!(sum(&values, &chosen), expected);
        }
    }
}
