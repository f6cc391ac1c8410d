//! Points in a space of a few dimensions, stored one dimension after another.
//!
//! All the arithmetic of this module runs over one dimension of all points at
//! a time: such loops have no jumps and the compiler vectorises them.

/// Points, feature-major: `columns[j][i]` is coordinate `j` of point `i`.
#[derive(Debug, Clone, PartialEq)]
pub struct Points {
    columns: Vec<Vec<f64>>,
    count: usize,
}

impl Points {
    /// Points from their coordinates, one column for each dimension.
    ///
    /// # Panics
    /// When columns differ in length or a coordinate is not finite.
    pub fn new(columns: Vec<Vec<f64>>) -> Points {
        let count = columns.first().map_or(0, Vec::len);
        assert!(
            columns.iter().all(|column| column.len() == count),
            "every dimension needs a coordinate of every point"
        );
        assert!(
            columns.iter().flatten().all(|x| x.is_finite()),
            "coordinates must be finite"
        );
        Points { columns, count }
    }

    /// The number of points.
    pub fn count(&self) -> usize {
        self.count
    }

    /// The number of dimensions.
    pub fn dimensions(&self) -> usize {
        self.columns.len()
    }

    /// Coordinate `j` of all points.
    ///
    /// # Panics
    /// When there is no such dimension.
    pub fn column(&self, j: usize) -> &[f64] {
        &self.columns[j]
    }

    /// The chosen points, in the order given; a point may be chosen twice.
    ///
    /// # Panics
    /// When there is no such point.
    pub fn select(&self, chosen: &[usize]) -> Points {
        let pick = |column: &Vec<f64>| chosen.iter().map(|i| column[*i]).collect();
        Points {
            columns: self.columns.iter().map(pick).collect(),
            count: chosen.len(),
        }
    }

    /// All columns.
    pub(super) fn columns(&self) -> &[Vec<f64>] {
        &self.columns
    }

    /// All coordinates of one point.
    pub(super) fn point(&self, i: usize) -> Vec<f64> {
        self.columns.iter().map(|column| column[i]).collect()
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn select_keeps_order_and_repeats() {
        let points = Points::new(vec![vec![1.0, 2.0, 3.0], vec![4.0, 5.0, 6.0]]);
        let chosen = points.select(&[2, 0, 2]);
        assert_eq!((chosen.count(), chosen.dimensions()), (3, 2));
        assert_eq!(chosen.column(0), [3.0, 1.0, 3.0]);
        assert_eq!(chosen.point(1), [1.0, 4.0]);
    }

    #[test]
    #[should_panic(expected = "every dimension")]
    fn columns_must_be_of_one_length() {
        Points::new(vec![vec![1.0], vec![]]);
    }

    #[test]
    #[should_panic(expected = "finite")]
    fn coordinates_must_be_finite() {
        Points::new(vec![vec![1.0, f64::INFINITY]]);
    }
}
