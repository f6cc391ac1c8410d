//! Distances between all pairs of points.

use super::points::Points;

/// A symmetric matrix of distances, stored in full so that a row is a slice.
#[derive(Debug, Clone, PartialEq)]
pub struct Distances {
    count: usize,
    values: Vec<f64>,
}

impl Distances {
    /// Euclidean distances of all pairs.
    pub fn euclidean(points: &Points) -> Distances {
        Distances::of_squares(points, f64::sqrt)
    }

    /// Squared Euclidean distances of all pairs.
    pub(super) fn squared(points: &Points) -> Distances {
        Distances::of_squares(points, |square| square)
    }

    /// The upper triangle, which is then mirrored: row by row, since a row and
    /// all columns fit into the nearest cache, and in each row one pass per
    /// dimension.
    fn of_squares(points: &Points, finish: impl Fn(f64) -> f64) -> Distances {
        let count = points.count();
        let mut values = vec![0.0; count * count];
        for i in 0..count {
            let row = &mut values[i * count + i + 1..(i + 1) * count];
            for column in points.columns() {
                let x = column[i];
                for (sum, y) in row.iter_mut().zip(&column[i + 1..]) {
                    *sum += (x - y) * (x - y);
                }
            }
            row.iter_mut().for_each(|sum| *sum = finish(*sum));
        }
        for i in 0..count {
            for j in i + 1..count {
                values[j * count + i] = values[i * count + j];
            }
        }
        Distances { count, values }
    }

    /// Distances given as a full matrix, row by row.
    ///
    /// # Panics
    /// When there are not `count` x `count` values, or they are not symmetric.
    pub fn from_matrix(count: usize, values: Vec<f64>) -> Distances {
        assert_eq!(values.len(), count * count, "a full matrix is needed");
        let same = |i: usize, j: usize| {
            let (one, other) = (values[i * count + j], values[j * count + i]);
            one.total_cmp(&other).is_eq()
        };
        assert!(
            (0..count).all(|i| (0..i).all(|j| same(i, j))),
            "distances must be symmetric"
        );
        Distances { count, values }
    }

    /// The number of points.
    pub fn count(&self) -> usize {
        self.count
    }

    /// The distances of one point to all points, itself included.
    ///
    /// # Panics
    /// When there is no such point.
    pub fn row(&self, i: usize) -> &[f64] {
        &self.values[i * self.count..(i + 1) * self.count]
    }

    /// The distance between two points.
    ///
    /// # Panics
    /// When there is no such point.
    pub fn between(&self, i: usize, j: usize) -> f64 {
        self.row(i)[j]
    }

    /// The full matrix, row by row.
    pub(super) fn into_values(self) -> Vec<f64> {
        self.values
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn three_four_five() {
        let points = Points::new(vec![vec![0.0, 3.0], vec![0.0, 4.0]]);
        let distances = Distances::euclidean(&points);
        assert_eq!(distances.row(0), [0.0, 5.0]);
        assert_eq!(distances.between(1, 0), 5.0);
        assert_eq!(Distances::euclidean(&Points::new(vec![])).count(), 0);
    }

    #[test]
    #[should_panic(expected = "symmetric")]
    fn a_matrix_must_be_symmetric() {
        Distances::from_matrix(2, vec![0.0, 1.0, 2.0, 0.0]);
    }
}
