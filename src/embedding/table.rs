//! The table of heights of one template on all traces.

use crate::support::{Finite, SlotId};
use crate::template::{Direction, Duration, Formula, SlotKind, SlotValue};
use crate::traces::Grid;

/// A slot laid on a grid.
#[derive(Debug, Clone, PartialEq)]
pub struct Axis {
    /// The slot.
    pub slot: SlotId,
    /// The grid, ascending: thresholds in the signal's unit, times in steps.
    pub points: Vec<f64>,
}

/// The heights of one template on all traces.
///
/// A height is a threshold in the signal's unit or a time in whole steps. With
/// [`Direction::LargerIsEasier`] a trace satisfies the specification at height
/// p exactly when its height is at most p; with [`Direction::LargerIsHarder`]
/// when its height is at least p. A trace that no value satisfies (`never`) or
/// every value does (`always`) has an infinite height of the sign that keeps
/// this true: see [`Embedding::never`] and [`Embedding::always`].
#[derive(Debug, Clone, PartialEq)]
pub struct Embedding {
    /// The template.
    pub formula: Formula,
    /// The slot that is solved.
    pub height: SlotId,
    /// The other slots. Columns run through the grid with the last axis
    /// fastest.
    pub axes: Vec<Axis>,
    /// `columns[j][i]` is the height of trace i at grid point j.
    pub columns: Vec<Vec<f64>>,
}

impl Embedding {
    /// What a larger height does to the verdict.
    pub fn direction(&self) -> Direction {
        self.formula.slot(self.height).direction
    }

    /// The height of a trace that no value satisfies.
    pub fn never(&self) -> f64 {
        match self.direction() {
            Direction::LargerIsEasier => f64::INFINITY,
            Direction::LargerIsHarder => f64::NEG_INFINITY,
        }
    }

    /// The height of a trace that every value satisfies.
    pub fn always(&self) -> f64 {
        -self.never()
    }

    /// Whether a trace of this height satisfies the specification at `p`.
    pub fn satisfied(&self, height: f64, p: f64) -> bool {
        match self.direction() {
            Direction::LargerIsEasier => height <= p,
            Direction::LargerIsHarder => height >= p,
        }
    }

    /// The position on each axis of a grid point.
    pub fn position(&self, column: usize) -> Vec<usize> {
        let mut rest = column;
        let mut position: Vec<usize> = self
            .axes
            .iter()
            .rev()
            .map(|axis| {
                let at = rest % axis.points.len();
                rest /= axis.points.len();
                at
            })
            .collect();
        position.reverse();
        position
    }

    /// The specification at a grid point and height: the template with every
    /// slot filled.
    ///
    /// # Panics
    /// When the height is not finite.
    pub fn specification(&self, column: usize, height: f64, grid: &Grid) -> Formula {
        let mut values: Vec<Option<SlotValue>> = vec![None; self.formula.slots().len()];
        values[self.height.index()] = Some(self.slot_value(self.height, height, grid));
        for (axis, at) in self.axes.iter().zip(self.position(column)) {
            values[axis.slot.index()] = Some(self.slot_value(axis.slot, axis.points[at], grid));
        }
        self.formula.fill(&values)
    }

    /// A number as a value for a slot; times are given in steps and written in
    /// the data's own unit.
    fn slot_value(&self, slot: SlotId, value: f64, grid: &Grid) -> SlotValue {
        match self.formula.slot(slot).kind {
            SlotKind::Threshold(_) => SlotValue::Threshold(finite(value)),
            SlotKind::Time => SlotValue::Time(Duration {
                value: finite(to_twelve_digits(grid.duration(value))),
                unit: grid.unit,
            }),
        }
    }
}

fn finite(value: f64) -> Finite {
    Finite::new(value).expect("a specification needs finite slot values")
}

/// Rounds away the noise of binary fractions, so that three steps of 0.1 s are
/// written 0.3 s. Bounds are read with a tolerance far above this.
fn to_twelve_digits(value: f64) -> f64 {
    format!("{value:.11e}").parse().unwrap_or(value)
}
