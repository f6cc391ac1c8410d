//! Hierarchical grouping by Ward's criterion (Ward, *Hierarchical grouping to
//! optimize an objective function*, Journal of the American Statistical
//! Association 58, 1963, 236-244): join the two groups whose union adds least
//! to the sum of squares.
//!
//! The nearest-neighbour chain (Murtagh, *A survey of recent advances in
//! hierarchical clustering algorithms*, Computer Journal 26, 1983, 354-359)
//! finds the same merges in quadratic time: it walks from group to nearest
//! group until two are nearest to each other, and merges those.

use super::distance::Distances;
use super::partition::Partition;
use super::points::Points;

/// One merge.
#[derive(Debug, Clone, Copy, PartialEq)]
struct Merge {
    /// A point of each of the two groups.
    pair: [usize; 2],
    /// Twice the growth of the sum of squares: the squared distance where two
    /// points merge.
    height: f64,
}

/// All merges from single points to one group, lowest first.
#[derive(Debug, Clone, PartialEq)]
pub struct Merges {
    count: usize,
    merges: Vec<Merge>,
}

/// The merges of Ward's method on Euclidean distances.
pub fn ward(points: &Points) -> Merges {
    let count = points.count();
    let mut groups = Groups {
        count,
        squares: Distances::squared(points).into_values(),
        sizes: vec![1; count],
    };
    let mut merges = Vec::with_capacity(count.saturating_sub(1));
    let mut chain: Vec<usize> = Vec::new();
    while merges.len() + 1 < count {
        let end = chain.pop().unwrap_or_else(|| groups.first());
        let before = chain.last().copied();
        let (next, height) = groups.nearest(end, before);
        if Some(next) == before {
            // Rounding might have brought one of the two in earlier as well.
            let keep = chain.iter().position(|group| [end, next].contains(group));
            chain.truncate(keep.unwrap_or(0));
            merges.push(groups.merge(end, next, height));
        } else {
            chain.extend([end, next]);
        }
    }
    merges.sort_by(|a, b| a.height.total_cmp(&b.height));
    Merges { count, merges }
}

impl Merges {
    /// The grouping into `k` groups, numbered by their first members.
    ///
    /// # Panics
    /// When `k` is 0 or larger than the number of points.
    pub fn cut(&self, k: usize) -> Partition {
        assert!(
            (1..=self.count).contains(&k),
            "between one group and one for each point"
        );
        let mut parent: Vec<usize> = (0..self.count).collect();
        for merge in &self.merges[..self.count - k] {
            let [one, other] = merge.pair.map(|i| root(&parent, i));
            parent[one.max(other)] = one.min(other);
        }
        let mut number = vec![0; self.count];
        let mut groups = 0;
        let mut group_of = Vec::with_capacity(self.count);
        for i in 0..self.count {
            let root = root(&parent, i);
            if root == i {
                number[i] = groups;
                groups += 1;
            }
            group_of.push(number[root]);
        }
        Partition { group_of, groups }
    }
}

/// The first member of the group a point is in.
fn root(parent: &[usize], mut i: usize) -> usize {
    while parent[i] != i {
        i = parent[i];
    }
    i
}

/// The groups so far. A group is known by one of its points; the size of the
/// others is 0.
struct Groups {
    count: usize,
    squares: Vec<f64>,
    sizes: Vec<usize>,
}

impl Groups {
    fn first(&self) -> usize {
        self.sizes.iter().position(|size| *size > 0).unwrap_or(0)
    }

    /// The nearest group, and how far. Among equally near ones the preferred
    /// one, else the first, so that a chain never walks in a circle.
    fn nearest(&self, group: usize, preferred: Option<usize>) -> (usize, f64) {
        let row = &self.squares[group * self.count..(group + 1) * self.count];
        let mut best = preferred.map_or((group, f64::INFINITY), |other| (other, row[other]));
        for (other, square) in row.iter().enumerate() {
            if other != group && self.sizes[other] > 0 && *square < best.1 {
                best = (other, *square);
            }
        }
        best
    }

    /// Puts group `from` into group `into`, with the distances of Lance and
    /// Williams (*A general theory of classificatory sorting strategies*,
    /// Computer Journal 9, 1967, 373-380).
    fn merge(&mut self, from: usize, into: usize, height: f64) -> Merge {
        let (a, b) = (self.sizes[from] as f64, self.sizes[into] as f64);
        for other in 0..self.count {
            if self.sizes[other] == 0 || other == from || other == into {
                continue;
            }
            let c = self.sizes[other] as f64;
            let to_from = self.squares[from * self.count + other];
            let to_into = self.squares[into * self.count + other];
            let square = ((a + c) * to_from + (b + c) * to_into - c * height) / (a + b + c);
            self.squares[into * self.count + other] = square;
            self.squares[other * self.count + into] = square;
        }
        self.sizes[into] += self.sizes[from];
        self.sizes[from] = 0;
        Merge {
            pair: [from, into],
            height,
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn pairs_on_a_line_merge_first() {
        let merges = ward(&Points::new(vec![vec![9.0, 0.0, 10.0, 1.5, 20.0]]));
        assert_eq!(merges.cut(5).group_of, [0, 1, 2, 3, 4]);
        assert_eq!(merges.cut(4).group_of, [0, 1, 0, 2, 3]);
        assert_eq!(merges.cut(3).group_of, [0, 1, 0, 1, 2]);
        assert_eq!(merges.cut(1).groups, 1);
        assert_eq!(merges.merges[0].height, 1.0);
    }

    #[test]
    fn equal_points_merge_at_height_zero() {
        let merges = ward(&Points::new(vec![vec![1.0; 6]]));
        assert!(merges.merges.iter().all(|merge| merge.height == 0.0));
        assert_eq!(merges.cut(2).groups, 2);
    }
}
