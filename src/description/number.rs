//! Numbers a person would write.

use crate::traces::Grid;

/// How far from both sides of the gap a threshold stays, as a share of it.
const MARGIN: f64 = 0.2;

/// The number with the fewest digits well inside a gap: a multiple of the
/// largest of ..., 10, 5, 2, 1, 0.5, ... that lies in the middle three fifths
/// of it, and of those the one nearest to the middle.
///
/// # Panics
/// When the gap is not a gap.
pub fn nice_number(low: f64, high: f64) -> f64 {
    assert!(low < high && low.is_finite() && high.is_finite());
    let width = high - low;
    let (inner_low, inner_high) = (low + MARGIN * width, high - MARGIN * width);
    let middle = f64::midpoint(low, high);
    // Zero is the shortest number of all.
    if inner_low <= 0.0 && inner_high >= 0.0 {
        return 0.0;
    }
    let first = middle.abs().max(width).log10().ceil() as i32;
    for exponent in (first - 18..=first).rev() {
        for digit in [5.0, 2.0, 1.0] {
            let found = nearest_multiple(middle, digit, exponent);
            if (inner_low..=inner_high).contains(&found) {
                return found;
            }
        }
    }
    middle
}

/// The multiple of digit x 10^exponent nearest to a value, without the noise
/// of binary fractions: 3 x 0.1 is read from the text "3e-1".
fn nearest_multiple(value: f64, digit: f64, exponent: i32) -> f64 {
    let unit = digit * 10f64.powi(exponent);
    let count = (value / unit).round() * digit;
    format!("{count}e{exponent}").parse().unwrap_or(value)
}

/// A whole number of steps from `low` to `high`, both included, whose duration
/// a person would write.
pub fn nice_steps(low: f64, high: f64, grid: &Grid) -> f64 {
    let middle = f64::midpoint(low, high);
    let first = grid.duration(high.max(1.0)).log10().ceil() as i32;
    for exponent in (first - 6..=first).rev() {
        for digit in [5.0, 2.0, 1.0] {
            let duration = nearest_multiple(grid.duration(middle), digit, exponent);
            let steps = duration / grid.step;
            let whole = steps.round();
            let fits = (steps - whole).abs() < 1e-6 && (low..=high).contains(&whole);
            if fits {
                return whole;
            }
        }
    }
    middle.floor().clamp(low, high)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::template::TimeUnit;

    #[test]
    fn numbers_have_as_few_digits_as_the_gap_allows() {
        for (low, high, expected) in [
            (4.13, 4.29, 4.2),
            (3.1, 8.9, 5.0),
            (-2.0, 3.0, 0.0),
            (1234.0, 1301.0, 1250.0),
            (0.001_21, 0.001_29, 0.001_25),
            (-17.3, -12.1, -15.0),
            (0.3, 0.30001, 0.300_005),
        ] {
            let found = nice_number(low, high);
            assert!((found - expected).abs() < 1e-9, "{low} to {high}: {found}");
            assert!(low < found && found < high);
        }
    }

    #[test]
    fn steps_make_durations_a_person_would_write() {
        let grid = Grid {
            step: 0.1,
            unit: TimeUnit::Second,
        };
        assert!((nice_steps(43.0, 58.0, &grid) - 50.0).abs() < 1e-9);
        assert!((nice_steps(13.0, 13.0, &grid) - 13.0).abs() < 1e-9);
        assert!((nice_steps(7.0, 8.0, &Grid::samples()) - 8.0).abs() < 1.5);
    }
}
