//! Clustering arithmetic against published values.

use strandline::grouping::{
    Distances, Partition, Points, adjusted_rand, kmeans, mean_width, nearest, subsample_stability,
    widths,
};
use strandline::support::Stream;

fn partition(labels: &[usize]) -> Partition {
    Partition {
        group_of: labels.to_vec(),
        groups: labels.iter().max().unwrap() + 1,
    }
}

fn near(found: &[f64], expected: &[f64], tolerance: f64) {
    assert_eq!(found.len(), expected.len());
    for (found, expected) in found.iter().zip(expected) {
        assert!(
            (found - expected).abs() <= tolerance,
            "{found} and {expected}"
        );
    }
}

/// Dissimilarities of twelve countries, lower triangle row by row: BEL BRA CHI
/// CUB EGY FRA IND ISR USA USS YUG ZAI.
const COUNTRIES: [f64; 66] = [
    5.58, 7.00, 6.50, 7.08, 7.00, 3.83, 4.83, 5.08, 8.17, 5.83, 2.17, 5.75, 6.67, 6.92, 4.92, 6.42,
    5.00, 5.58, 6.00, 4.67, 6.42, 3.42, 5.50, 6.42, 6.42, 5.00, 3.92, 6.17, 2.50, 4.92, 6.25, 7.33,
    4.50, 2.25, 6.33, 2.75, 6.08, 6.67, 4.25, 2.67, 6.00, 6.17, 6.17, 6.92, 6.17, 5.25, 6.83, 4.50,
    3.75, 5.75, 5.42, 6.08, 5.83, 6.67, 3.67, 4.75, 3.00, 6.08, 6.67, 5.00, 5.58, 4.83, 6.17, 5.67,
    6.50, 6.92,
];

fn symmetric(count: usize, triangle: &[f64]) -> Distances {
    let mut values = vec![0.0; count * count];
    let mut next = triangle.iter();
    for row in 1..count {
        for column in 0..row {
            let value = *next.next().unwrap();
            values[row * count + column] = value;
            values[column * count + row] = value;
        }
    }
    Distances::from_matrix(count, values)
}

/// Rousseeuw, Silhouettes, J. Comput. Appl. Math. 20 (1987) 53-65, table 1 and
/// figures 2 and 3: averages 0.28 and 0.33. The single widths to six digits
/// were recomputed from the same data with a reference library.
#[test]
fn silhouettes_of_the_twelve_countries() {
    let distances = symmetric(12, &COUNTRIES);
    let two = partition(&[0, 0, 1, 1, 0, 0, 1, 0, 0, 1, 1, 0]);
    let three = partition(&[0, 1, 2, 2, 0, 0, 1, 0, 0, 2, 2, 1]);
    near(
        &widths(&distances, &two),
        &[
            0.391298, 0.223177, 0.325122, 0.398148, 0.196526, 0.351530, -0.044662, 0.297859,
            0.425191, 0.341047, 0.261776, 0.188978,
        ],
        1e-6,
    );
    near(
        &widths(&distances, &three),
        &[
            0.421493, 0.254566, 0.307269, 0.478902, 0.021186, 0.439718, 0.174990, 0.365611,
            0.468085, 0.436822, 0.313047, 0.279536,
        ],
        1e-6,
    );
    near(
        &[mean_width(&distances, &two), mean_width(&distances, &three)],
        &[0.28, 0.33],
        0.005,
    );
}

/// The Ruspini data (75 points in four groups), as in the data file of R's
/// cluster package.
const RUSPINI: [&str; 4] = [
    "4,53 5,63 10,59 9,77 13,49 13,69 12,88 15,75 18,61 19,65 22,74 27,72 28,76 24,58 27,55 28,60 30,52 31,60 32,61 36,72",
    "28,147 32,149 35,153 33,154 38,151 41,150 38,145 38,143 32,143 34,141 44,156 44,149 44,143 46,142 47,149 49,152 50,142 53,144 52,152 55,155 54,124 60,136 63,139",
    "86,132 85,115 85,96 78,94 74,96 97,122 98,116 98,124 99,119 99,128 101,115 108,111 110,111 108,116 111,126 115,117 117,115",
    "70,4 77,12 83,21 61,15 69,15 78,16 66,18 58,13 64,20 69,21 66,23 61,25 76,27 72,31 64,30",
];

fn ruspini() -> (Points, Partition) {
    let mut columns = vec![Vec::new(), Vec::new()];
    let mut groups = Vec::new();
    for (group, text) in RUSPINI.iter().enumerate() {
        for pair in text.split(' ') {
            let (x, y) = pair.split_once(',').unwrap();
            columns[0].push(x.parse().unwrap());
            columns[1].push(y.parse().unwrap());
            groups.push(group);
        }
    }
    (Points::new(columns), partition(&groups))
}

/// R cluster 2.1.8.2, tests/pam.Rout.save: average silhouette 0.737657 of the
/// four groups, and the groups' averages; single rows 1, 7, 26, 44, 60, 70.
#[test]
fn silhouettes_of_ruspini() {
    let (points, groups) = ruspini();
    let distances = Distances::euclidean(&points);
    let widths = widths(&distances, &groups);
    let average = |group: usize| {
        let members = groups.members(group);
        members.iter().map(|i| widths[*i]).sum::<f64>() / members.len() as f64
    };
    near(&[mean_width(&distances, &groups)], &[0.737_657], 1e-6);
    near(
        &[average(0), average(1), average(2), average(3)],
        &[0.7262347, 0.7548344, 0.6691154, 0.8042285],
        1e-6,
    );
    near(
        &[
            widths[0], widths[6], widths[25], widths[43], widths[59], widths[69],
        ],
        &[
            0.6798381, 0.5900575, 0.8357433, 0.4196093, 0.7206840, 0.8548947,
        ],
        1e-6,
    );
}

/// k-means on Ruspini: sums of squares and silhouettes of the best of 200
/// starts, computed with scikit-learn 1.9.1; four groups are found for good.
#[test]
fn k_means_on_ruspini() {
    let (points, groups) = ruspini();
    let distances = Distances::euclidean(&points);
    for (k, squares, silhouette) in [
        (2, 89337.8321, 0.582726),
        (3, 51063.4750, 0.632705),
        (4, 12881.0512, 0.737657),
        (5, 10126.7198, 0.701924),
    ] {
        let found = kmeans(&points, k, 200, &mut Stream::new(1, "test", 0));
        near(&[found.sum_of_squares], &[squares], 1e-3);
        near(
            &[mean_width(&distances, &found.partition)],
            &[silhouette],
            1e-6,
        );
        assert_eq!(found.partition.group_of, nearest(&points, &found.centroids));
        if k == 4 {
            near(
                &[adjusted_rand(&found.partition.group_of, &groups.group_of)],
                &[1.0],
                1e-12,
            );
            let stability =
                subsample_stability(&points, &found, 20, 0.6, &mut Stream::new(1, "test", 1));
            near(&[stability], &[1.0], 1e-12);
        }
    }
}

/// R cluster's regression test for 0/0: six objects, labels 1 1 2 2 3 3, widths
/// 0, 1, -.975, -.5, -.375, -.5. And scikit-learn's test of a single point in a
/// group: X = 0, 1, 1, 2, 3, 3, widths 0, .5, .5, 0, 1, 1. One group: 0 by our
/// convention, since there is no other group to compare with.
#[test]
fn silhouettes_of_edge_cases() {
    let pathological = symmetric(
        6,
        &[
            0.0, 0.0, 0.05, 0.0, 1.0, 1.0, 0.4, 1.0, 1.0, 0.25, 1.0, 0.0, 0.0, 1.0, 1.0,
        ],
    );
    near(
        &widths(&pathological, &partition(&[0, 0, 1, 1, 2, 2])),
        &[0.0, 1.0, -0.975, -0.5, -0.375, -0.5],
        1e-12,
    );
    let line = Points::new(vec![vec![0.0, 1.0, 1.0, 2.0, 3.0, 3.0]]);
    let distances = Distances::euclidean(&line);
    near(
        &widths(&distances, &partition(&[0, 1, 1, 1, 2, 2])),
        &[0.0, 0.5, 0.5, 0.0, 1.0, 1.0],
        1e-12,
    );
    near(&widths(&distances, &partition(&[0; 6])), &[0.0; 6], 1e-12);
}

/// Adjusted Rand index (Hubert and Arabie, J. Classification 2, 1985), as exact
/// fractions; 8/33 and 4/7 are in scikit-learn's tests and docs, 1/6 and 4/15
/// in R packages' examples.
#[test]
fn adjusted_rand_fractions() {
    let digits = |text: &str| -> Vec<usize> {
        text.bytes()
            .map(|digit| usize::from(digit - b'0'))
            .collect()
    };
    for (a, b, expected) in [
        ("0011", "1100", 1.0),
        ("0012", "0011", 4.0 / 7.0),
        ("0000", "0123", 0.0),
        ("0011", "0101", -0.5),
        ("000111", "010122", 8.0 / 33.0),
        ("00011", "00111", 1.0 / 6.0),
        ("001122", "211002", -0.25),
        ("112221333", "122221233", 4.0 / 15.0),
        ("000111", "001112", 2.0 / 17.0 + 0.0),
        ("0000", "0000", 1.0),
        ("0123", "0123", 1.0),
    ] {
        let (a, b) = (digits(a), digits(b));
        if expected == 2.0 / 17.0 {
            // Rand 1971: {abc}{def} against {ab}{cde}{f}.
            near(
                &[adjusted_rand(&[0, 0, 0, 1, 1, 1], &[0, 0, 1, 1, 1, 2])],
                &[expected],
                1e-12,
            );
        }
        near(&[adjusted_rand(&a, &b)], &[expected], 1e-12);
        near(&[adjusted_rand(&b, &a)], &[expected], 1e-12);
    }
}

/// The index does not mind names, and is near 0 for labels drawn at random.
#[test]
fn adjusted_rand_of_random_labels() {
    for case in 0..20 {
        let mut stream = Stream::new(4, "rand", case);
        let a: Vec<usize> = (0..400).map(|_| stream.below(4)).collect();
        let b: Vec<usize> = (0..400).map(|_| stream.below(4)).collect();
        assert!(adjusted_rand(&a, &b).abs() < 0.04);
        let renamed: Vec<usize> = b.iter().map(|label| (label + 3) % 4).collect();
        near(
            &[adjusted_rand(&a, &b)],
            &[adjusted_rand(&a, &renamed)],
            1e-12,
        );
    }
}

/// Distances and silhouettes against twins written straight from the
/// definitions, on random points and groups.
#[test]
fn fast_forms_equal_their_definitions() {
    for case in 0..60 {
        let mut stream = Stream::new(6, "points", case);
        let (count, dimensions) = (3 + stream.below(40), 1 + stream.below(6));
        let column = |stream: &mut Stream| (0..count).map(|_| stream.below(7) as f64).collect();
        let columns: Vec<Vec<f64>> = (0..dimensions).map(|_| column(&mut stream)).collect();
        let groups = 1 + stream.below(4);
        let labels: Vec<usize> = (0..count).map(|_| stream.below(groups)).collect();
        let distance = |i: usize, j: usize| -> f64 {
            columns
                .iter()
                .map(|c| (c[i] - c[j]).powi(2))
                .sum::<f64>()
                .sqrt()
        };
        let partition = Partition {
            group_of: labels.clone(),
            groups,
        };
        let distances = Distances::euclidean(&Points::new(columns.clone()));
        let naive: Vec<f64> = (0..count)
            .map(|i| {
                let to = |group: usize| -> Option<f64> {
                    let others: Vec<usize> = (0..count)
                        .filter(|j| *j != i && labels[*j] == group)
                        .collect();
                    let sum: f64 = others.iter().map(|j| distance(i, *j)).sum();
                    (!others.is_empty()).then(|| sum / others.len() as f64)
                };
                let other = (0..groups).filter(|g| *g != labels[i]).filter_map(to);
                match (to(labels[i]), other.reduce(f64::min)) {
                    (Some(a), Some(b)) if a.max(b) > 0.0 => (b - a) / a.max(b),
                    _ => 0.0,
                }
            })
            .collect();
        near(&widths(&distances, &partition), &naive, 1e-9);
        near(
            &[distances.between(0, count - 1)],
            &[distance(0, count - 1)],
            1e-12,
        );
    }
}
