//! Confidence intervals of shares.

/// The 95 % quantile of the standard normal distribution, two-sided.
const Z: f64 = 1.959_963_984_540_054;

/// The 95 % Wilson score interval of `hits` out of `of` (Wilson 1927; method 3
/// of Newcombe, Statistics in Medicine 17, 1998, 857-872). Of nothing: 0 to 1.
pub fn wilson(hits: usize, of: usize) -> (f64, f64) {
    if of == 0 {
        return (0.0, 1.0);
    }
    let (x, n) = (hits as f64, of as f64);
    let middle = 2.0 * x + Z * Z;
    let width = Z * (Z * Z + 4.0 * x * (1.0 - x / n)).sqrt();
    let scale = 2.0 * (n + Z * Z);
    let low = if hits == 0 {
        0.0
    } else {
        (middle - width) / scale
    };
    let high = if hits == of {
        1.0
    } else {
        (middle + width) / scale
    };
    (low, high)
}
