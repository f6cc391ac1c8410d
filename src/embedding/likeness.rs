//! What an embedding says about the traces, apart from the order of its grid
//! points and the scale of its height.

use std::cmp::Ordering;

use super::table::Embedding;

/// The set of scaled columns that are not constant, as sorted digests.
pub fn column_digests(embedding: &Embedding) -> Vec<u64> {
    let mut digests: Vec<u64> = embedding
        .columns
        .iter()
        .filter_map(|column| column_digest(column))
        .collect();
    digests.sort_unstable();
    digests.dedup();
    digests
}

/// A digest of a column after scaling its finite heights to 0..1; `None` when
/// all traces have the same height. FNV-1a over quantised values: two columns
/// that differ by rounding noise alone agree.
fn column_digest(column: &[f64]) -> Option<u64> {
    let same = |pair: &[f64]| pair[0].partial_cmp(&pair[1]) == Some(Ordering::Equal);
    if column.windows(2).all(same) {
        return None;
    }
    let finite = column.iter().copied().filter(|height| height.is_finite());
    let low = finite.clone().fold(f64::INFINITY, f64::min);
    let high = finite.fold(f64::NEG_INFINITY, f64::max);
    let scale = if high > low { 1.0 / (high - low) } else { 0.0 };
    let mut digest = 0xcbf2_9ce4_8422_2325_u64;
    for height in column {
        let value = if height.is_finite() {
            ((height - low) * scale * 1e9).round() as i64
        } else if *height > 0.0 {
            i64::MAX
        } else {
            i64::MIN
        };
        for byte in value.to_le_bytes() {
            digest = (digest ^ u64::from(byte)).wrapping_mul(0x0100_0000_01b3);
        }
    }
    Some(digest)
}

/// For each trace the mean of its heights, each column scaled to 0..1; `never`
/// and `always` count as the ends of the scale.
pub fn mean_scaled_heights(embedding: &Embedding) -> Vec<f64> {
    let traces = embedding.columns.first().map_or(0, Vec::len);
    let mut sums = vec![0.0; traces];
    for column in &embedding.columns {
        let finite = column.iter().copied().filter(|height| height.is_finite());
        let low = finite.clone().fold(f64::INFINITY, f64::min);
        let high = finite.fold(f64::NEG_INFINITY, f64::max);
        for (sum, height) in sums.iter_mut().zip(column) {
            *sum += match (height.is_finite(), high > low) {
                (true, true) => (height - low) / (high - low),
                (true, false) => 0.5,
                (false, _) => f64::from(u8::from(*height > 0.0)),
            };
        }
    }
    let count = embedding.columns.len().max(1) as f64;
    sums.iter().map(|sum| sum / count).collect()
}
