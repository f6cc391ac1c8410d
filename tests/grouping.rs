//! The arithmetic of groups against published values, against answers of
//! reference libraries, and against twins written straight from definitions.

use strandline::grouping::{
    Distances, KMeans, Partition, Points, adjusted_rand, jaccard_stability, kmeans, mean_width,
    nearest, subsample_stability, ward, widths,
};
use strandline::support::Stream;

fn partition(labels: &[usize]) -> Partition {
    Partition {
        group_of: labels.to_vec(),
        groups: labels.iter().max().unwrap() + 1,
    }
}

/// Labels written as digits.
fn labels(text: &str) -> Vec<usize> {
    text.bytes()
        .map(|digit| usize::from(digit - b'0'))
        .collect()
}

#[track_caller]
fn near(found: &[f64], expected: &[f64], tolerance: f64) {
    assert_eq!(found.len(), expected.len());
    for (one, other) in found.iter().zip(expected) {
        assert!((one - other).abs() <= tolerance, "{found:?} {expected:?}");
    }
}

/// The mean width of each group.
fn group_means(widths: &[f64], partition: &Partition) -> Vec<f64> {
    let mean = |group| {
        let members = partition.members(group);
        members.iter().map(|i| widths[*i]).sum::<f64>() / members.len() as f64
    };
    (0..partition.groups).map(mean).collect()
}

/// Distances from a lower triangle without diagonal, row by row.
fn symmetric(count: usize, triangle: &str) -> Distances {
    let mut values = vec![0.0; count * count];
    let mut next = triangle.split_whitespace();
    for row in 1..count {
        for column in 0..row {
            let value = next.next().unwrap().parse().unwrap();
            values[row * count + column] = value;
            values[column * count + row] = value;
        }
    }
    assert!(next.next().is_none());
    Distances::from_matrix(count, values)
}

// Rousseeuw, Silhouettes: a graphical aid to the interpretation and validation
// of cluster analysis, J. Comput. Appl. Math. 20 (1987) 53-65, table 1:
// dissimilarities of BEL BRA CHI CUB EGY FRA IND ISR USA USS YUG ZAI.
const COUNTRIES: &str = "
    5.58
    7.00 6.50
    7.08 7.00 3.83
    4.83 5.08 8.17 5.83
    2.17 5.75 6.67 6.92 4.92
    6.42 5.00 5.58 6.00 4.67 6.42
    3.42 5.50 6.42 6.42 5.00 3.92 6.17
    2.50 4.92 6.25 7.33 4.50 2.25 6.33 2.75
    6.08 6.67 4.25 2.67 6.00 6.17 6.17 6.92 6.17
    5.25 6.83 4.50 3.75 5.75 5.42 6.08 5.83 6.67 3.67
    4.75 3.00 6.08 6.67 5.00 5.58 4.83 6.17 5.67 6.50 6.92";

#[test]
fn silhouettes_of_twelve_countries() {
    // Averages 0.28 and 0.33: Rousseeuw 1987, figures 2 and 3. Six digits:
    // recomputed from the table with scikit-learn 1.9.1.
    let distances = symmetric(12, COUNTRIES);
    let two = partition(&labels("001100100110"));
    let three = partition(&labels("012200100221"));
    let (in_two, in_three) = (widths(&distances, &two), widths(&distances, &three));
    let of_two = [
        0.391298, 0.223177, 0.325122, 0.398148, 0.196526, 0.351530, -0.044662, 0.297859, 0.425191,
        0.341047, 0.261776, 0.188978,
    ];
    let of_three = [
        0.421493, 0.254566, 0.307269, 0.478902, 0.021186, 0.439718, 0.174990, 0.365611, 0.468085,
        0.436822, 0.313047, 0.279536,
    ];
    near(&in_two, &of_two, 1e-6);
    near(&in_three, &of_three, 1e-6);
    let means = [mean_width(&distances, &two), mean_width(&distances, &three)];
    near(&means, &[0.28, 0.33], 0.005);
    near(&means, &[0.279666, 0.330102], 1e-6);
    near(&group_means(&in_two, &two), &[0.296366, 0.256286], 1e-6);
    let of_groups = [0.343219, 0.236364, 0.384010];
    near(&group_means(&in_three, &three), &of_groups, 1e-6);
}

// Ruspini (1970), 75 points in four known groups, as in the data file of the R
// package cluster.
const RUSPINI: [&str; 4] = [
    "4,53 5,63 10,59 9,77 13,49 13,69 12,88 15,75 18,61 19,65 22,74 27,72 28,76 24,58 27,55 28,60 \
     30,52 31,60 32,61 36,72",
    "28,147 32,149 35,153 33,154 38,151 41,150 38,145 38,143 32,143 34,141 44,156 44,149 44,143 \
     46,142 47,149 49,152 50,142 53,144 52,152 55,155 54,124 60,136 63,139",
    "86,132 85,115 85,96 78,94 74,96 97,122 98,116 98,124 99,119 99,128 101,115 108,111 110,111 \
     108,116 111,126 115,117 117,115",
    "70,4 77,12 83,21 61,15 69,15 78,16 66,18 58,13 64,20 69,21 66,23 61,25 76,27 72,31 64,30",
];

fn ruspini() -> (Points, Partition) {
    let mut columns = vec![Vec::new(), Vec::new()];
    let mut groups = Vec::new();
    for (group, text) in RUSPINI.iter().enumerate() {
        for pair in text.split_whitespace() {
            let (x, y) = pair.split_once(',').unwrap();
            columns[0].push(x.parse().unwrap());
            columns[1].push(y.parse().unwrap());
            groups.push(group);
        }
    }
    (Points::new(columns), partition(&groups))
}

#[test]
fn silhouettes_of_ruspini() {
    // R cluster 2.1.8.2, reference output of its test pam: the average, the
    // averages of the groups, and single rows.
    let (points, groups) = ruspini();
    let distances = Distances::euclidean(&points);
    near(&[mean_width(&distances, &groups)], &[0.737657], 1e-6);
    let widths = widths(&distances, &groups);
    let of_groups = [0.7262347, 0.7548344, 0.6691154, 0.8042285];
    near(&group_means(&widths, &groups), &of_groups, 1e-6);
    let rows = [1, 7, 26, 44, 60, 70].map(|row: usize| widths[row - 1]);
    let of_rows = [
        0.6798381, 0.5900575, 0.8357433, 0.4196093, 0.7206840, 0.8548947,
    ];
    near(&rows, &of_rows, 1e-6);
    let lowest = widths.iter().copied().fold(f64::INFINITY, f64::min);
    let highest = widths.iter().copied().fold(f64::NEG_INFINITY, f64::max);
    assert_eq!([lowest, highest], [widths[43], widths[69]]);
}

#[test]
fn k_means_on_ruspini() {
    // Best sums of squares and their silhouettes: scikit-learn 1.9.1, 200
    // starts. k = 4 finds the four known groups.
    let (points, groups) = ruspini();
    let distances = Distances::euclidean(&points);
    for (k, squares, silhouette) in [
        (2, 89337.8321, 0.582726),
        (3, 51063.4750, 0.632705),
        (4, 12881.0512, 0.737657),
        (5, 10126.7198, 0.701924),
    ] {
        let found = kmeans(&points, k, 200, &mut Stream::new(1, "test", k as u64));
        near(&[found.sum_of_squares], &[squares], 1e-4);
        let width = mean_width(&distances, &found.partition);
        near(&[width], &[silhouette], 1e-6);
        if k == 4 {
            let labels = &found.partition.group_of;
            assert_eq!(adjusted_rand(labels, &groups.group_of), 1.0);
            let mut stream = Stream::new(1, "test", 0);
            let stability = subsample_stability(&points, &found, 50, 0.6, &mut stream);
            assert_eq!(stability, 1.0);
        }
    }
}

#[test]
fn ward_on_ruspini() {
    // Silhouettes of agglomerative clustering with Ward linkage: scikit-learn
    // 1.9.1.
    let (points, _) = ruspini();
    let distances = Distances::euclidean(&points);
    let merges = ward(&points);
    let found = [2, 3, 4, 5].map(|k| mean_width(&distances, &merges.cut(k)));
    near(&found, &[0.582726, 0.632705, 0.737657, 0.713479], 1e-6);
}

#[test]
fn bootstrap_of_ruspini() {
    // Clusterwise mean Jaccard (Hennig, CSDA 52 (2007) 258-271) of k-means in
    // 100 bootstrap samples, measured with scikit-learn 1.9.1; Monte Carlo.
    let (points, _) = ruspini();
    let stability = |k| jaccard_stability(&points, k, 100, &mut Stream::new(1, "test", 0));
    assert_eq!(stability(2), [1.0; 2]);
    assert_eq!(stability(4), [1.0; 4]);
    let mut three = stability(3);
    three.sort_by(f64::total_cmp);
    near(&three, &[0.743, 0.805, 0.806], 0.08);
}

#[test]
fn silhouettes_of_edge_cases() {
    // R cluster, its test "pathological": 0/0 counts as 0.
    let triangle = "0  0 .05  0 1 1  .4 1 1 .25  1 0 0 1 1";
    let pathological = symmetric(6, triangle);
    let groups = partition(&labels("001122"));
    let found = widths(&pathological, &groups);
    let expected = [0.0, 1.0, -0.975, -0.5, -0.375, -0.5];
    near(&found, &expected, 1e-15);
    near(&[mean_width(&pathological, &groups)], &[-0.225], 1e-15);
    // scikit-learn, its test of a group of one and of equal points.
    let line = Points::new(vec![vec![0.0, 1.0, 1.0, 2.0, 3.0, 3.0]]);
    let distances = Distances::euclidean(&line);
    let groups = partition(&labels("011122"));
    let expected = [0.0, 0.5, 0.5, 0.0, 1.0, 1.0];
    assert_eq!(widths(&distances, &groups), expected);
    // R cluster, help of silhouette: undefined for one group and for groups of
    // one. Here they count as 0.
    assert_eq!(widths(&distances, &partition(&[0; 6])), [0.0; 6]);
    assert_eq!(mean_width(&distances, &partition(&[0, 1, 2, 3, 4, 5])), 0.0);
}

#[test]
fn adjusted_rand_as_fractions() {
    // Hubert and Arabie, J. Classification 2 (1985) 193-218. Values: scikit-
    // learn 1.9.1; 4/7 and 8/33 are also in its documentation and tests, 1/6 in
    // an example of R partitionComparison, data of 4/15 in R shallot; 2/17 is
    // the example of Rand, JASA 66 (1971) 846-850 (its partitions from memory).
    for (a, b, expected) in [
        ("0011", "0011", 1.0),
        ("0011", "1100", 1.0),
        ("0012", "0011", 4.0 / 7.0),
        ("0000", "0123", 0.0),
        ("0011", "0101", -1.0 / 2.0),
        ("000111", "010122", 8.0 / 33.0),
        ("00011", "00111", 1.0 / 6.0),
        ("001122", "211002", -1.0 / 4.0),
        ("112221333", "122221233", 4.0 / 15.0),
        ("000111", "001112", 2.0 / 17.0),
        ("0000", "0000", 1.0),
        ("0123", "0123", 1.0),
    ] {
        assert_eq!(adjusted_rand(&labels(a), &labels(b)), expected, "{a} {b}");
        assert_eq!(adjusted_rand(&labels(b), &labels(a)), expected, "{b} {a}");
    }
    // Contingency tables of Yeung and Ruzzo, Bioinformatics 17 (2001),
    // supplement (.313), and of Manning, Raghavan and Schuetze, Introduction to
    // Information Retrieval (2008), section 16.3. Both tables are quoted from
    // memory; their index was computed with scikit-learn 1.9.1.
    let yeung = [[1, 1, 0], [1, 2, 1], [0, 0, 4]];
    let manning = [[5, 1, 2], [1, 4, 0], [0, 1, 3]];
    for (table, expected) in [(yeung, 266.0 / 851.0), (manning, 60.0 / 247.0)] {
        let (mut a, mut b) = (Vec::new(), Vec::new());
        for (i, j) in (0..9).map(|cell| (cell / 3, cell % 3)) {
            a.extend(vec![i; table[i][j]]);
            b.extend(vec![j; table[i][j]]);
        }
        assert_eq!(adjusted_rand(&a, &b), expected);
    }
}

#[test]
fn adjusted_rand_of_random_labels() {
    // scikit-learn, its test on random labels: near 0. Symmetry and renaming
    // follow from the definition.
    let mut sum = 0.0;
    for case in 0..200 {
        let mut stream = Stream::new(4, "rand", case);
        let groups = 2 + stream.below(8);
        let a: Vec<usize> = (0..200).map(|_| stream.below(groups)).collect();
        let b: Vec<usize> = (0..200).map(|_| stream.below(4)).collect();
        let found = adjusted_rand(&a, &b);
        assert!(found.abs() < 0.06, "{found}");
        sum += found;
        assert_eq!(found, adjusted_rand(&b, &a));
        let mut names: Vec<usize> = (0..1000).collect();
        stream.shuffle(&mut names);
        let renamed: Vec<usize> = a.iter().map(|label| names[*label]).collect();
        assert_eq!(found, adjusted_rand(&renamed, &b));
        assert_eq!(adjusted_rand(&a, &renamed), 1.0);
        near(&[found], &[naive_rand(&a, &b)], 1e-12);
    }
    assert!((sum / 200.0).abs() < 0.003, "{sum}");
}

/// The index from all pairs of points.
fn naive_rand(a: &[usize], b: &[usize]) -> f64 {
    let (mut both, mut in_a, mut in_b, mut all) = (0.0, 0.0, 0.0, 0.0);
    for i in 0..a.len() {
        for j in 0..i {
            let (one, other) = (a[i] == a[j], b[i] == b[j]);
            both += f64::from(one && other);
            in_a += f64::from(one);
            in_b += f64::from(other);
            all += 1.0;
        }
    }
    let expected = in_a * in_b / all;
    (both - expected) / (f64::midpoint(in_a, in_b) - expected)
}

/// Random points as rows; on a coarse grid every other case, so that distances
/// are often equal.
fn random_rows(stream: &mut Stream, count: usize, coarse: bool) -> Vec<Vec<f64>> {
    let dimensions = 1 + stream.below(5);
    let coordinate = |stream: &mut Stream| match coarse {
        true => stream.below(4) as f64,
        false => stream.normal(),
    };
    (0..count)
        .map(|_| (0..dimensions).map(|_| coordinate(stream)).collect())
        .collect()
}

fn from_rows(rows: &[Vec<f64>]) -> Points {
    let column = |j| rows.iter().map(|row| row[j]).collect();
    Points::new((0..rows[0].len()).map(column).collect())
}

fn square(a: &[f64], b: &[f64]) -> f64 {
    a.iter().zip(b).map(|(x, y)| (x - y).powi(2)).sum()
}

fn mean_point(rows: &[Vec<f64>], members: &[usize]) -> Vec<f64> {
    let mean = |j| members.iter().map(|i| rows[*i][j]).sum::<f64>() / members.len() as f64;
    (0..rows[0].len()).map(mean).collect()
}

fn naive_width(rows: &[Vec<f64>], groups: &Partition, i: usize) -> f64 {
    let mean = |group: usize| {
        let mut others = groups.members(group);
        others.retain(|j| *j != i);
        let sum: f64 = others
            .iter()
            .map(|j| square(&rows[i], &rows[*j]).sqrt())
            .sum();
        (!others.is_empty()).then(|| sum / others.len() as f64)
    };
    let own = groups.group_of[i];
    let others = (0..groups.groups).filter(|group| *group != own);
    match (mean(own), others.filter_map(mean).reduce(f64::min)) {
        (Some(a), Some(b)) if a.max(b) > 0.0 => (b - a) / a.max(b),
        _ => 0.0,
    }
}

#[test]
fn distances_and_widths_equal_their_definitions() {
    for case in 0..100 {
        let mut stream = Stream::new(6, "points", case);
        let count = 1 + stream.below(40);
        let rows = random_rows(&mut stream, count, case % 2 == 0);
        let groups = 1 + stream.below(5);
        let groups = Partition {
            group_of: (0..count).map(|_| stream.below(groups)).collect(),
            groups,
        };
        let distances = Distances::euclidean(&from_rows(&rows));
        for i in 0..count {
            let expected: Vec<f64> = (0..count)
                .map(|j| square(&rows[i], &rows[j]).sqrt())
                .collect();
            near(distances.row(i), &expected, 1e-12);
            assert_eq!(distances.between(i, 0), distances.row(i)[0]);
        }
        let expected: Vec<f64> = (0..count).map(|i| naive_width(&rows, &groups, i)).collect();
        near(&widths(&distances, &groups), &expected, 1e-10);
    }
}

/// What every answer of k-means must satisfy.
fn check_k_means(rows: &[Vec<f64>], found: &KMeans) {
    let groups = &found.partition;
    let mut total = 0.0;
    for (row, own) in rows.iter().zip(&groups.group_of) {
        let squares = found.centroids.iter().map(|c| square(row, c));
        let least = squares.fold(f64::INFINITY, f64::min);
        near(&[square(row, &found.centroids[*own])], &[least], 1e-10);
        total += least;
    }
    near(&[found.sum_of_squares], &[total], 1e-9);
    for group in 0..groups.groups {
        let members = groups.members(group);
        if members.is_empty() {
            assert_eq!(found.sum_of_squares, 0.0, "a group could be filled");
        } else {
            let mean = mean_point(rows, &members);
            near(&found.centroids[group], &mean, 1e-12);
        }
    }
}

#[test]
fn k_means_equals_its_definition() {
    for case in 0..150 {
        let mut stream = Stream::new(7, "points", case);
        let count = 2 + stream.below(40);
        let rows = random_rows(&mut stream, count, case % 2 == 0);
        let points = from_rows(&rows);
        let k = 1 + stream.below(count.min(7));
        let found = kmeans(&points, k, 3, &mut Stream::new(case, "kmeans", 0));
        check_k_means(&rows, &found);
        let again = kmeans(&points, k, 3, &mut Stream::new(case, "kmeans", 0));
        assert_eq!(found, again);
        assert_eq!(nearest(&points, &found.centroids), found.partition.group_of);
    }
}

#[test]
fn k_means_finds_the_best_of_all_splits() {
    for case in 0..20 {
        let mut stream = Stream::new(8, "points", case);
        let rows = random_rows(&mut stream, 9, case % 2 == 0);
        let within = |members: &[usize]| {
            let mean = mean_point(&rows, members);
            members
                .iter()
                .map(|i| square(&rows[*i], &mean))
                .sum::<f64>()
        };
        let best = (1..256usize)
            .map(|mask| {
                let (a, b): (Vec<_>, Vec<_>) = (0..9).partition(|i| mask >> i & 1 == 1);
                within(&a) + within(&b)
            })
            .fold(f64::INFINITY, f64::min);
        let found = kmeans(&from_rows(&rows), 2, 100, &mut stream);
        near(&[found.sum_of_squares], &[best], 1e-9);
    }
}

/// Ward's method from its definition: merge the two groups whose union adds
/// least to the sum of squares, `k` groups left.
fn naive_ward(rows: &[Vec<f64>], k: usize) -> Vec<usize> {
    let mut groups: Vec<Vec<usize>> = (0..rows.len()).map(|i| vec![i]).collect();
    while groups.len() > k {
        let mut best = (f64::INFINITY, 0, 0);
        for j in 0..groups.len() {
            for i in 0..j {
                let (a, b) = (groups[i].len() as f64, groups[j].len() as f64);
                let [one, other] = [i, j].map(|g| mean_point(rows, &groups[g]));
                let growth = a * b / (a + b) * square(&one, &other);
                if growth < best.0 {
                    best = (growth, i, j);
                }
            }
        }
        let moved = groups.remove(best.2);
        groups[best.1].extend(moved);
    }
    let group = |i| groups.iter().position(|group| group.contains(&i)).unwrap();
    (0..rows.len()).map(group).collect()
}

#[test]
fn ward_equals_its_definition() {
    for case in 0..40 {
        let mut stream = Stream::new(9, "points", case);
        let count = 1 + stream.below(25);
        let rows = random_rows(&mut stream, count, false);
        let merges = ward(&from_rows(&rows));
        for k in 1..=count {
            let found = merges.cut(k);
            assert_eq!(found.groups, k);
            let expected = naive_ward(&rows, k);
            assert_eq!(adjusted_rand(&found.group_of, &expected), 1.0);
        }
    }
}

#[test]
fn ward_survives_ties() {
    for case in 0..100 {
        let mut stream = Stream::new(10, "points", case);
        let rows = random_rows(&mut stream, 60, true);
        let merges = ward(&from_rows(&rows));
        for k in 1..=60 {
            let cut = merges.cut(k);
            assert!(cut.groups == k && !cut.sizes().contains(&0));
        }
    }
}

#[test]
fn stability_is_a_share_and_repeats() {
    let mut stream = Stream::new(11, "points", 0);
    let columns = (0..3).map(|_| (0..60).map(|_| stream.normal()).collect());
    let points = Points::new(columns.collect());
    let found = kmeans(&points, 4, 5, &mut stream);
    let subsample =
        |seed| subsample_stability(&points, &found, 20, 0.6, &mut Stream::new(seed, "test", 0));
    let bootstrap = |seed| jaccard_stability(&points, 4, 10, &mut Stream::new(seed, "test", 0));
    // Noise has no groups, so those found in it come back only in part.
    assert!(subsample(1) > 0.0 && subsample(1) < 1.0, "{}", subsample(1));
    assert_eq!(subsample(1), subsample(1));
    assert_ne!(subsample(1), subsample(2));
    let shares = bootstrap(1);
    assert!(shares.iter().all(|share| *share > 0.0 && *share < 1.0));
    assert_eq!(shares, bootstrap(1));
    // All points in every round: nothing changes.
    let all = subsample_stability(&points, &found, 5, 1.0, &mut stream);
    assert_eq!(all, 1.0);
}
