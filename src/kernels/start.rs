//! Demands at the first sample: outermost operators are asked for nothing else,
//! so a fold takes the place of a window, and the pass that makes the last rows
//! below folds them on the way.
//!
//! What lies beyond the record never decides here: outermost, `throughout`
//! reads it as satisfied and `sometime` as violated.

use super::code::{Code, boolean};
use super::ladder::{Ladder, shift};
use super::plan::{Op, Upper};
use super::runs;
use super::worker::{Worker, place_of};

impl<T: Code> Worker<'_, T> {
    /// The demand at the first sample for each row of an operation.
    pub(super) fn at_start(&self, node: usize) -> Vec<T> {
        let rows = self.plan.nodes[node].rows;
        let mut out = vec![T::NEVER; rows];
        match &self.plan.nodes[node].op {
            Op::Level { .. } | Op::Cut { .. } | Op::Place { .. } => {
                self.each(node, &mut |row, demands| out[row] = demands[0]);
            }
            Op::Join { max, parts } => return self.join_at_start(*max, parts),
            Op::Window {
                max,
                lower,
                upper,
                part,
                ..
            } => self.window_at_start(*max, *lower as usize, upper, *part, &mut out),
            Op::From {
                max, lowers, part, ..
            } => self.each(*part, &mut |row, demands| {
                let cells = &mut out[row * lowers.len()..(row + 1) * lowers.len()];
                self.fold_from(demands, lowers, *max, cells);
            }),
            Op::Until {
                lower,
                upper,
                left,
                right,
                ..
            } => self.pairs(&[*left, *right], |row, before, then| {
                let waited = waited(before, then);
                let points = points(upper);
                let cells = &mut out[row * points..(row + 1) * points];
                self.fold_window(&waited, *lower as usize, upper, false, cells);
            }),
            Op::UntilFrom {
                lowers,
                left,
                right,
                ..
            } => self.pairs(&[*left, *right], |row, before, then| {
                let cells = &mut out[row * lowers.len()..(row + 1) * lowers.len()];
                self.fold_from(&waited(before, then), lowers, false, cells);
            }),
            Op::Run {
                run,
                lower,
                weak,
                parts,
            } => self.pairs(parts, |row, demands, then| {
                out[row] = runs::start(*run, demands, then, *lower as usize, *weak);
            }),
            Op::Met {
                points,
                above,
                part,
            } => {
                let starts = self.at_start(*part);
                let levels = (0..*points).map(|point| place_of(point, *points, *above));
                let levels: Vec<T> = levels.map(T::from_u32).collect();
                let cells = starts
                    .iter()
                    .flat_map(|start| levels.iter().map(move |level| boolean(start <= level)));
                return cells.collect();
            }
            Op::Scatter { .. } => self.scatter(node, &mut out),
        }
        out
    }

    fn join_at_start(&self, max: bool, parts: &[usize]) -> Vec<T> {
        let mut joined: Option<Vec<T>> = None;
        for part in parts {
            let own = self.at_start(*part);
            joined = Some(match joined {
                None => own,
                Some(before) => before
                    .iter()
                    .flat_map(|a| own.iter().map(move |b| larger(*a, *b, max)))
                    .collect(),
            });
        }
        joined.unwrap_or_default()
    }

    fn window_at_start(&self, max: bool, lower: usize, upper: &Upper, part: usize, out: &mut [T]) {
        let whole = lower == 0
            && match upper {
                Upper::End => true,
                Upper::At(upper) => *upper as usize + 1 >= self.length,
                Upper::Axis(_) => false,
            };
        if whole && !self.is_kept(part) && self.folded_on_the_way(max, part, out) {
            return;
        }
        let points = points(upper);
        self.each(part, &mut |row, demands| {
            let cells = &mut out[row * points..(row + 1) * points];
            self.fold_window(demands, lower, upper, max, cells);
        });
    }

    /// A whole window over windows of an axis, under a mask or not: each is
    /// folded by the pass that makes it. Says whether the operand is such.
    fn folded_on_the_way(&self, max: bool, part: usize, out: &mut [T]) -> bool {
        let windows = |node: usize| match &self.plan.nodes[node].op {
            Op::Window {
                max,
                lower,
                upper,
                weak,
                part,
            } if *upper != Upper::End && !self.is_kept(node) => {
                Some((*max, *lower as usize, upper, *weak, *part))
            }
            _ => None,
        };
        if let Some((own, lower, upper, weak, part)) = windows(part) {
            self.fold_ladder((own, lower, upper, weak, part), max, None, out);
            return true;
        }
        let Op::Join { max: joins, parts } = &self.plan.nodes[part].op else {
            return false;
        };
        let [first, second] = parts[..] else {
            return false;
        };
        if *joins == max {
            return false;
        }
        for (mask, ladder) in [(first, second), (second, first)] {
            if self.plan.nodes[mask].rows == 1
                && let Some(window) = windows(ladder)
            {
                let block = self.block(mask);
                self.fold_ladder(window, max, Some(block.row(0)), out);
                return true;
            }
        }
        false
    }

    fn fold_ladder(
        &self,
        (own, lower, upper, weak, part): (bool, usize, &Upper, bool, usize),
        fold: bool,
        mask: Option<&[T]>,
        out: &mut [T],
    ) {
        let single = [match upper {
            Upper::At(upper) => *upper,
            _ => 0,
        }];
        let uppers: &[u32] = match upper {
            Upper::Axis(points) => points,
            _ => &single,
        };
        self.each(part, &mut |row, demands| {
            let mut ladder = Ladder::new(self, demands, lower, own, boolean(weak));
            for (k, upper) in uppers.iter().enumerate() {
                out[row * uppers.len() + k] = ladder.reach_folded(*upper as usize, fold, mask);
            }
            ladder.finish();
        });
    }

    /// One row folded over a window from its first instant, for each point of
    /// the upper bound.
    fn fold_window(&self, row: &[T], lower: usize, upper: &Upper, max: bool, cells: &mut [T]) {
        let fold = self.kernels.fold[usize::from(max)];
        let length = row.len();
        let first = lower.min(length);
        let last = |upper: u32| (upper as usize).saturating_add(1).clamp(first, length);
        match upper {
            Upper::End => cells[0] = fold(&row[first..]),
            Upper::At(upper) => cells[0] = fold(&row[first..last(*upper)]),
            Upper::Axis(points) => {
                let mut so_far = fold(&[]);
                let mut from = first;
                for (cell, upper) in cells.iter_mut().zip(points.iter()) {
                    let to = last(*upper);
                    so_far = larger(so_far, fold(&row[from..to.max(from)]), max);
                    from = to.max(from);
                    *cell = so_far;
                }
            }
        }
    }

    /// One row folded from each of some instants to the end.
    fn fold_from(&self, row: &[T], lowers: &[u32], max: bool, cells: &mut [T]) {
        let fold = self.kernels.fold[usize::from(max)];
        let mut so_far = fold(&[]);
        let mut to = row.len();
        for (cell, lower) in cells.iter_mut().zip(lowers).rev() {
            let from = (*lower as usize).min(to);
            so_far = larger(so_far, fold(&row[from..to]), max);
            to = from;
            *cell = so_far;
        }
    }

    /// `sometime (height and place)` (with `max`, `throughout (height or
    /// place)`): the best height for each part of the window and each place of
    /// the threshold axis, gathered in one go, then joined over parts and
    /// places. Cells have 32 bits, which is faster to scatter into than 16.
    fn scatter(&self, node: usize, out: &mut [T]) {
        let Op::Scatter {
            max,
            lower,
            upper,
            points: levels,
            above,
            height,
            place,
        } = &self.plan.nodes[node].op
        else {
            return;
        };
        let (max, lower, levels) = (*max, *lower as usize, *levels as usize);
        let ends = window_ends(upper, lower, self.length);
        let mut table = vec![0_u32; ends.len() * (levels + 1)];
        let cells = ends.len() * levels;
        self.pairs(&[*height, *place], |row, heights, places| {
            table.fill(if max { 0 } else { u32::MAX });
            gather(&mut table, heights, places, lower, &ends, levels, max);
            for part in 1..ends.len() {
                for level in 0..=levels {
                    let before = table[(part - 1) * (levels + 1) + level];
                    let cell = &mut table[part * (levels + 1) + level];
                    *cell = larger(*cell, before, max);
                }
            }
            for part in 0..ends.len() {
                let row_of_table = &mut table[part * (levels + 1)..(part + 1) * (levels + 1)];
                let met = joined_places(row_of_table, max);
                for point in 0..levels {
                    let level = place_of(point as u32, levels as u32, *above) as usize;
                    out[row * cells + part * levels + point] = T::from_u32(met[level]);
                }
            }
        });
    }
}

/// Points of an upper bound.
fn points(upper: &Upper) -> usize {
    match upper {
        Upper::Axis(points) => points.len(),
        _ => 1,
    }
}

/// Where the windows of an upper bound stop, in a record of a length.
fn window_ends(upper: &Upper, lower: usize, length: usize) -> Vec<usize> {
    let end = |upper: u32| {
        let end = (upper as usize).saturating_add(1).min(length);
        end.max(lower.min(length))
    };
    match upper {
        Upper::End => vec![length],
        Upper::At(upper) => vec![end(*upper)],
        Upper::Axis(points) => points.iter().map(|point| end(*point)).collect(),
    }
}

/// The best height of each part of the window at each place.
fn gather<T: Code>(
    table: &mut [u32],
    heights: &[T],
    places: &[T],
    lower: usize,
    ends: &[usize],
    levels: usize,
    max: bool,
) {
    let mut from = lower.min(heights.len());
    for (part, end) in ends.iter().enumerate() {
        let cells = &mut table[part * (levels + 1)..(part + 1) * (levels + 1)];
        let to = (*end).max(from);
        for (height, place) in heights[from..to].iter().zip(&places[from..to]) {
            let cell = &mut cells[(place.raw() as usize).min(levels)];
            let height = height.to_u32();
            *cell = if max {
                (*cell).max(height)
            } else {
                (*cell).min(height)
            };
        }
        from = to;
    }
}

/// For each level: the best over all places that are met there, or with `max`
/// over those that are not.
fn joined_places(row: &mut [u32], max: bool) -> &[u32] {
    if max {
        for level in (0..row.len() - 1).rev() {
            row[level] = row[level].max(row[level + 1]);
        }
        &row[1..]
    } else {
        for level in 1..row.len() {
            row[level] = row[level].min(row[level - 1]);
        }
        row
    }
}

fn larger<N: Ord>(a: N, b: N, max: bool) -> N {
    if max { a.max(b) } else { a.min(b) }
}

/// For each instant what it demands that the right side comes there, the left
/// side being kept from the first instant until then.
fn waited<T: Code>(before: &[T], then: &[T]) -> Vec<T> {
    let mut kept = T::ZERO;
    let wait = |(before, then): (&T, &T)| {
        let demand = kept.max(*then);
        kept = kept.max(*before);
        demand
    };
    before.iter().zip(then).map(wait).collect()
}

/// `until` over windows of growing length, at every instant.
pub(super) struct Wait<'w, 'p, T: Code> {
    worker: &'w Worker<'p, T>,
    kept: Vec<T>,
    answer: Vec<T>,
    spare: (Vec<T>, Vec<T>),
    width: usize,
    beyond: (T, T),
}

impl<'w, 'p, T: Code> Wait<'w, 'p, T> {
    pub(super) fn new(worker: &'w Worker<'p, T>, before: &[T], then: &[T], beyond: (T, T)) -> Self {
        let copied = |row: &[T]| {
            let mut buffer = worker.buffer();
            buffer.copy_from_slice(row);
            buffer
        };
        Wait {
            kept: copied(before),
            answer: copied(then),
            spare: (worker.buffer(), worker.buffer()),
            worker,
            width: 1,
            beyond,
        }
    }

    /// The demand that the right side comes within so many steps, or ever. No
    /// window is asked for that is smaller than the last one.
    pub(super) fn reach(&mut self, steps: Option<usize>) -> &[T] {
        let length = self.answer.len();
        let count = match steps {
            Some(steps) if steps < length => steps + 1,
            _ => {
                // What came so far is right for shorter windows, so a scan from
                // the end over it is right for all.
                let mut after = self.beyond.1;
                for (answer, kept) in self.answer.iter_mut().zip(&self.kept).rev() {
                    after = (*answer).min((*kept).max(after));
                    *answer = after;
                }
                return &self.answer;
            }
        };
        while self.width < count {
            let step = self.width.min(count - self.width);
            (self.worker.kernels.until_step)(
                (&mut self.spare.0, &mut self.spare.1),
                (&self.kept, &self.answer),
                step,
                self.beyond,
            );
            std::mem::swap(&mut self.spare.0, &mut self.kept);
            std::mem::swap(&mut self.spare.1, &mut self.answer);
            self.width += step;
        }
        &self.answer
    }

    pub(super) fn finish(self) {
        for buffer in [self.kept, self.answer, self.spare.0, self.spare.1] {
            self.worker.put_back(buffer);
        }
    }
}

/// The demand of an `until` whose window opens so many steps later: the left
/// side must hold until then, too. `None` when it opens now.
pub(super) fn opened<T: Code>(
    worker: &Worker<'_, T>,
    before: &[T],
    answer: &[T],
    lower: usize,
    beyond: (T, T),
) -> Option<Vec<T>> {
    if lower == 0 {
        return None;
    }
    let mut later = worker.buffer();
    shift(&mut later, answer, lower, beyond.1);
    let mut ladder = Ladder::new(worker, before, 0, true, beyond.0);
    let mut out = vec![T::ZERO; answer.len()];
    (worker.kernels.join[1])(&mut out, ladder.reach(lower - 1), &later);
    ladder.finish();
    worker.put_back(later);
    Some(out)
}
