//! Clustering arithmetic: points, distances, k-means, silhouette, agreement.

use crate::support::Stream;

/// Points, feature-major.
#[derive(Debug, Clone, PartialEq)]
pub struct Points {
    columns: Vec<Vec<f64>>,
    count: usize,
}

impl Points {
    /// Points from columns.
    pub fn new(columns: Vec<Vec<f64>>) -> Self {
        let count = columns.first().map_or(0, Vec::len);
        assert!(columns.iter().all(|column| column.len() == count));
        Points { columns, count }
    }
    /// Number of points.
    pub fn count(&self) -> usize {
        self.count
    }
    /// Number of dimensions.
    pub fn dimensions(&self) -> usize {
        self.columns.len()
    }
    /// One dimension.
    pub fn column(&self, j: usize) -> &[f64] {
        &self.columns[j]
    }
    /// Some of the points.
    pub fn select(&self, chosen: &[usize]) -> Points {
        Points {
            columns: self
                .columns
                .iter()
                .map(|column| chosen.iter().map(|i| column[*i]).collect())
                .collect(),
            count: chosen.len(),
        }
    }
}

/// All distances.
#[derive(Debug, Clone, PartialEq)]
pub struct Distances {
    count: usize,
    values: Vec<f64>,
}

impl Distances {
    /// Euclidean distances.
    pub fn euclidean(points: &Points) -> Self {
        let n = points.count;
        let mut values = vec![0.0; n * n];
        for column in &points.columns {
            for (row, x) in values.chunks_exact_mut(n.max(1)).zip(column) {
                for (value, y) in row.iter_mut().zip(column) {
                    *value += (x - y) * (x - y);
                }
            }
        }
        values.iter_mut().for_each(|value| *value = value.sqrt());
        Distances { count: n, values }
    }
    /// From a matrix.
    pub fn from_matrix(count: usize, values: Vec<f64>) -> Self {
        assert_eq!(values.len(), count * count);
        Distances { count, values }
    }
    /// Number of points.
    pub fn count(&self) -> usize {
        self.count
    }
    /// One row.
    pub fn row(&self, i: usize) -> &[f64] {
        &self.values[i * self.count..(i + 1) * self.count]
    }
    /// One distance.
    pub fn between(&self, i: usize, j: usize) -> f64 {
        self.values[i * self.count + j]
    }
}

/// A partition.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Partition {
    /// Group of each.
    pub group_of: Vec<usize>,
    /// Number of groups.
    pub groups: usize,
}

impl Partition {
    /// Sizes.
    pub fn sizes(&self) -> Vec<usize> {
        let mut sizes = vec![0; self.groups];
        for group in &self.group_of {
            sizes[*group] += 1;
        }
        sizes
    }
    /// Members of a group.
    pub fn members(&self, group: usize) -> Vec<usize> {
        (0..self.group_of.len())
            .filter(|i| self.group_of[*i] == group)
            .collect()
    }
    /// Largest first.
    pub fn relabelled_by_size(&self) -> Partition {
        let sizes = self.sizes();
        let first = |group: usize| self.group_of.iter().position(|g| *g == group);
        let mut order: Vec<usize> = (0..self.groups).collect();
        order.sort_by_key(|group| (std::cmp::Reverse(sizes[*group]), first(*group)));
        let mut new = vec![0; self.groups];
        for (place, group) in order.iter().enumerate() {
            new[*group] = place;
        }
        Partition {
            group_of: self.group_of.iter().map(|g| new[*g]).collect(),
            groups: self.groups,
        }
    }
}

/// Widths.
pub fn widths(distances: &Distances, partition: &Partition) -> Vec<f64> {
    let sizes = partition.sizes();
    let mut sums = vec![0.0; partition.groups];
    (0..distances.count)
        .map(|i| {
            sums.fill(0.0);
            for (distance, group) in distances.row(i).iter().zip(&partition.group_of) {
                sums[*group] += distance;
            }
            let own = partition.group_of[i];
            if sizes[own] < 2 {
                return 0.0;
            }
            let a = sums[own] / (sizes[own] - 1) as f64;
            let b = (0..partition.groups)
                .filter(|g| *g != own && sizes[*g] > 0)
                .map(|g| sums[g] / sizes[g] as f64)
                .fold(f64::INFINITY, f64::min);
            let most = a.max(b);
            if b.is_infinite() || most <= 0.0 {
                0.0
            } else {
                (b - a) / most
            }
        })
        .collect()
}

/// Mean width.
pub fn mean_width(distances: &Distances, partition: &Partition) -> f64 {
    let all = widths(distances, partition);
    all.iter().sum::<f64>() / all.len().max(1) as f64
}

/// Adjusted Rand index.
pub fn adjusted_rand(a: &[usize], b: &[usize]) -> f64 {
    let pairs = |n: u64| (n * n.saturating_sub(1) / 2) as f64;
    let ka = a.iter().max().map_or(0, |m| m + 1);
    let kb = b.iter().max().map_or(0, |m| m + 1);
    let mut table = vec![0u64; ka * kb];
    for (x, y) in a.iter().zip(b) {
        table[x * kb + y] += 1;
    }
    let both: f64 = table.iter().map(|n| pairs(*n)).sum();
    let rows: f64 = (0..ka)
        .map(|x| pairs((0..kb).map(|y| table[x * kb + y]).sum()))
        .sum();
    let columns: f64 = (0..kb)
        .map(|y| pairs((0..ka).map(|x| table[x * kb + y]).sum()))
        .sum();
    let all = pairs(a.len() as u64);
    let expected = if all > 0.0 { rows * columns / all } else { 0.0 };
    let most = f64::midpoint(rows, columns);
    if (most - expected).abs() < 1e-12 {
        return 1.0;
    }
    (both - expected) / (most - expected)
}

/// k-means.
#[derive(Debug, Clone, PartialEq)]
pub struct KMeans {
    /// Partition.
    pub partition: Partition,
    /// Centroids.
    pub centroids: Vec<Vec<f64>>,
    /// Sum of squares.
    pub sum_of_squares: f64,
}

fn squares(points: &Points, centroid: &[f64]) -> Vec<f64> {
    let mut sums = vec![0.0; points.count];
    for (column, c) in points.columns.iter().zip(centroid) {
        for (sum, x) in sums.iter_mut().zip(column) {
            *sum += (x - c) * (x - c);
        }
    }
    sums
}

fn assign(points: &Points, centroids: &[Vec<f64>]) -> (Vec<usize>, Vec<f64>) {
    let mut group = vec![0; points.count];
    let mut best = vec![f64::INFINITY; points.count];
    for (g, centroid) in centroids.iter().enumerate() {
        for (i, d) in squares(points, centroid).into_iter().enumerate() {
            if d < best[i] {
                best[i] = d;
                group[i] = g;
            }
        }
    }
    (group, best)
}

/// Nearest centroid of each point.
pub fn nearest(points: &Points, centroids: &[Vec<f64>]) -> Vec<usize> {
    assign(points, centroids).0
}

fn point(points: &Points, i: usize) -> Vec<f64> {
    points.columns.iter().map(|column| column[i]).collect()
}

fn seeds(points: &Points, k: usize, stream: &mut Stream) -> Vec<Vec<f64>> {
    let mut centroids = vec![point(points, stream.below(points.count))];
    while centroids.len() < k {
        let (_, near) = assign(points, &centroids);
        let total: f64 = near.iter().sum();
        let mut target = stream.uniform() * total;
        let mut chosen = points.count - 1;
        for (i, d) in near.iter().enumerate() {
            target -= d;
            if target < 0.0 {
                chosen = i;
                break;
            }
        }
        centroids.push(point(points, chosen));
    }
    centroids
}

fn lloyd(points: &Points, mut centroids: Vec<Vec<f64>>) -> KMeans {
    let k = centroids.len();
    let (mut group, mut near) = assign(points, &centroids);
    for _ in 0..100 {
        let mut sizes = vec![0usize; k];
        for g in &group {
            sizes[*g] += 1;
        }
        for (j, column) in points.columns.iter().enumerate() {
            let mut sums = vec![0.0; k];
            for (x, g) in column.iter().zip(&group) {
                sums[*g] += x;
            }
            for g in 0..k {
                if sizes[g] > 0 {
                    centroids[g][j] = sums[g] / sizes[g] as f64;
                }
            }
        }
        for g in 0..k {
            if sizes[g] == 0 {
                let far = (0..points.count)
                    .max_by(|a, b| near[*a].total_cmp(&near[*b]).then(b.cmp(a)))
                    .unwrap_or(0);
                centroids[g] = point(points, far);
                near[far] = 0.0;
            }
        }
        let (next, distances) = assign(points, &centroids);
        let same = next == group;
        group = next;
        near = distances;
        if same {
            break;
        }
    }
    KMeans {
        partition: Partition {
            group_of: group,
            groups: k,
        },
        centroids,
        sum_of_squares: near.iter().sum(),
    }
}

/// k-means with several starts.
pub fn kmeans(points: &Points, k: usize, starts: usize, stream: &mut Stream) -> KMeans {
    let mut best = lloyd(points, seeds(points, k, stream));
    for _ in 1..starts {
        let other = lloyd(points, seeds(points, k, stream));
        if other.sum_of_squares < best.sum_of_squares {
            best = other;
        }
    }
    best
}

/// Stability under subsampling.
pub fn subsample_stability(
    points: &Points,
    found: &KMeans,
    rounds: usize,
    share: f64,
    stream: &mut Stream,
) -> f64 {
    let size = ((points.count as f64 * share).round() as usize).max(found.centroids.len());
    let mut sum = 0.0;
    for _ in 0..rounds {
        let chosen = stream.sample(points.count, size);
        let refit = lloyd(&points.select(&chosen), found.centroids.clone());
        sum += adjusted_rand(
            &found.partition.group_of,
            &nearest(points, &refit.centroids),
        );
    }
    sum / rounds as f64
}
