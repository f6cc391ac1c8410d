//! Windows of growing length over one row.

use super::code::Code;
use super::worker::Worker;

/// The largest (smallest) from each instant to the end and beyond.
pub(super) fn scan_back<T: Code>(out: &mut [T], demands: &[T], max: bool, beyond: T) {
    let mut so_far = beyond;
    for (out, demand) in out.iter_mut().zip(demands).rev() {
        so_far = if max {
            so_far.max(*demand)
        } else {
            so_far.min(*demand)
        };
        *out = so_far;
    }
}

/// Each value so many instants earlier.
pub(super) fn shift<T: Code>(out: &mut [T], demands: &[T], by: usize, beyond: T) {
    let kept = demands.len().saturating_sub(by);
    out[..kept].copy_from_slice(&demands[demands.len() - kept..]);
    out[kept..demands.len()].fill(beyond);
}

/// Windows of growing length over one row.
pub(super) struct Ladder<'w, 'p, T: Code> {
    worker: &'w Worker<'p, T>,
    current: Vec<T>,
    spare: Vec<T>,
    /// Instants in the current window.
    width: usize,
    lower: usize,
    max: bool,
    beyond: T,
}

impl<'w, 'p, T: Code> Ladder<'w, 'p, T> {
    pub(super) fn new(
        worker: &'w Worker<'p, T>,
        demands: &[T],
        lower: usize,
        max: bool,
        beyond: T,
    ) -> Self {
        let mut current = worker.buffer();
        shift(&mut current, demands, lower, beyond);
        Ladder {
            worker,
            current,
            spare: worker.buffer(),
            width: 1,
            lower,
            max,
            beyond,
        }
    }

    /// Steps that are missing for the window up to `upper`, but for the last
    /// one; and that one, if any.
    fn climb(&mut self, upper: usize) -> Option<usize> {
        // A window longer than the record says no more.
        let count = (upper - self.lower + 1).min(self.current.len() + 1);
        loop {
            let missing = count.saturating_sub(self.width);
            if missing == 0 {
                return None;
            }
            let step = missing.min(self.width);
            self.width += step;
            if step == missing {
                return Some(step);
            }
            self.step(step);
        }
    }

    fn step(&mut self, step: usize) {
        let widen = self.worker.kernels.widen[usize::from(self.max)];
        widen(&mut self.spare, &self.current, step, self.beyond);
        std::mem::swap(&mut self.spare, &mut self.current);
    }

    /// The window up to `upper`, which must not be below the last one asked for.
    pub(super) fn reach(&mut self, upper: usize) -> &[T] {
        if let Some(step) = self.climb(upper) {
            self.step(step);
        }
        &self.current
    }

    /// The same, folded to the largest (smallest) value, under a mask if there
    /// is one.
    pub(super) fn reach_folded(&mut self, upper: usize, fold: bool, mask: Option<&[T]>) -> T {
        let kernels = &self.worker.kernels;
        let (own, fold) = (usize::from(self.max), usize::from(fold));
        match (self.climb(upper), mask) {
            (None, None) => (kernels.fold[fold])(&self.current),
            (None, Some(mask)) => (kernels.mask_fold[fold])(&self.current, mask),
            (Some(step), None) => {
                let widen = kernels.widen_fold[own][fold];
                let folded = widen(&mut self.spare, &self.current, step, self.beyond);
                std::mem::swap(&mut self.spare, &mut self.current);
                folded
            }
            (Some(step), Some(mask)) => {
                let widen = kernels.widen_mask_fold[own][fold];
                let folded = widen(&mut self.spare, &self.current, step, self.beyond, mask);
                std::mem::swap(&mut self.spare, &mut self.current);
                folded
            }
        }
    }

    pub(super) fn finish(self) {
        self.worker.put_back(self.current);
        self.worker.put_back(self.spare);
    }
}
