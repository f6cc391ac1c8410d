//! Agreement of two groupings of the same points.

/// The adjusted Rand index (Hubert and Arabie, *Comparing partitions*, Journal
/// of Classification 2, 1985, 193-218): 1 for equal groupings, 0 on average
/// for unrelated ones. Names of groups do not matter. Where the index is 0/0
/// (both put all points together, or both keep all apart) it counts as 1.
///
/// The pairs are counted in whole numbers, so only one division is rounded.
///
/// # Panics
/// When the groupings are of different numbers of points.
pub fn adjusted_rand(a: &[usize], b: &[usize]) -> f64 {
    assert_eq!(a.len(), b.len(), "both groupings need the same points");
    let (a, rows) = compact(a);
    let (b, columns) = compact(b);
    let mut table = vec![0u64; rows * columns];
    let mut row_sums = vec![0u64; rows];
    let mut column_sums = vec![0u64; columns];
    for (row, column) in a.iter().zip(&b) {
        table[row * columns + column] += 1;
        row_sums[*row] += 1;
        column_sums[*column] += 1;
    }
    let together = pairs(&table);
    let (in_a, in_b) = (pairs(&row_sums), pairs(&column_sums));
    let all = pairs(&[a.len() as u64]);
    let most = all * (in_a + in_b) - 2 * in_a * in_b;
    if most == 0 {
        return 1.0;
    }
    (2 * (all * together - in_a * in_b)) as f64 / most as f64
}

/// The number of pairs inside groups of these sizes.
fn pairs(sizes: &[u64]) -> i128 {
    let pairs = |size: &u64| i128::from(*size) * (i128::from(*size) - 1) / 2;
    sizes.iter().map(pairs).sum()
}

/// Labels as numbers from 0, and how many numbers to count for. Labels below
/// the number of points are left as they are.
fn compact(labels: &[usize]) -> (Vec<usize>, usize) {
    let end = labels
        .iter()
        .max()
        .map_or(0, |label| label.saturating_add(1));
    if end <= labels.len() {
        return (labels.to_vec(), end);
    }
    let mut names = labels.to_vec();
    names.sort_unstable();
    names.dedup();
    let place = |label: &usize| names.partition_point(|name| name < label);
    (labels.iter().map(place).collect(), names.len())
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn large_labels_are_mere_names() {
        let plain = adjusted_rand(&[0, 0, 1, 2], &[0, 0, 1, 1]);
        let named = adjusted_rand(&[usize::MAX, usize::MAX, 7, 1000], &[9, 9, 5, 5]);
        assert_eq!(plain, 4.0 / 7.0);
        assert_eq!(plain, named);
    }

    #[test]
    fn trivial_groupings_agree() {
        assert_eq!(adjusted_rand(&[], &[]), 1.0);
        assert_eq!(adjusted_rand(&[3], &[0]), 1.0);
    }
}
