//! Evaluates a batch on one trace after another.
//!
//! A trace goes through all operations before the next one is looked at, in
//! buffers of the length of one trace, so it stays in the nearest cache. Rows
//! of an operation that several others use are kept until the trace is done;
//! those of the rest are handed on one at a time. Windows of an axis come from
//! one another by a **ladder**: the points of an axis are at most twice the one
//! before, so each window is one pass away from the last.

use std::cell::RefCell;
use std::rc::Rc;

use super::code::{Code, boolean};
use super::dispatch::{Kernels, Level};
use super::ladder::{Ladder, scan_back, shift};
use super::plan::{Op, Plan, Upper};
use super::runs;
use super::start;
use crate::support::SignalId;
use crate::traces::{Ranks, Record};

/// Codes of kept rows, per operation, above which they are computed again
/// instead: 2 MiB of 16-bit codes.
const MOST_KEPT: usize = 1 << 20;

/// Rows of one operation on one trace.
#[derive(Debug)]
pub(super) struct Block<T> {
    codes: Vec<T>,
    length: usize,
}

impl<T> Block<T> {
    pub(super) fn row(&self, row: usize) -> &[T] {
        &self.codes[row * self.length..(row + 1) * self.length]
    }
}

/// What is told about each row: its number and its demands.
pub(super) type Visit<'v, T> = &'v mut dyn FnMut(usize, &[T]);

/// Evaluates a batch; one a thread.
#[derive(Debug)]
pub struct Worker<'p, T: Code> {
    pub(super) plan: &'p Plan,
    pub(super) kernels: Kernels<T>,
    pub(super) record: Option<Record<'p>>,
    pub(super) length: usize,
    pool: RefCell<Vec<Vec<T>>>,
    kept: RefCell<Vec<Option<Rc<Block<T>>>>>,
}

impl<'p, T: Code> Worker<'p, T> {
    /// A worker on the passes of this machine.
    pub fn new(plan: &'p Plan) -> Self {
        Worker::at(plan, Level::detect())
    }

    /// A worker on the passes of a level.
    pub fn at(plan: &'p Plan, level: Level) -> Self {
        Worker {
            plan,
            kernels: Kernels::of(level),
            record: None,
            length: 0,
            pool: RefCell::new(Vec::new()),
            kept: RefCell::new(Vec::new()),
        }
    }

    /// The demands at the first sample of a record: template after template,
    /// for each its grid points.
    pub fn demands(&mut self, record: Record<'p>) -> Vec<u32> {
        self.record = Some(record);
        if self.length != record.length() {
            self.length = record.length();
            self.pool.borrow_mut().clear();
        }
        let mut kept = self.kept.borrow_mut();
        kept.clear();
        kept.resize_with(self.plan.nodes.len(), || None);
        drop(kept);
        let mut all = Vec::with_capacity(self.plan.cells());
        for root in &self.plan.roots {
            let first = all.len();
            all.resize(first + root.cell_of_row.len(), 0);
            let starts = self.at_start(root.node);
            for (demand, cell) in starts.iter().zip(&root.cell_of_row) {
                all[first + *cell as usize] = demand.to_u32();
            }
        }
        all
    }

    pub(super) fn buffer(&self) -> Vec<T> {
        let taken = self.pool.borrow_mut().pop();
        taken.unwrap_or_else(|| vec![T::ZERO; self.length])
    }

    pub(super) fn put_back(&self, buffer: Vec<T>) {
        self.pool.borrow_mut().push(buffer);
    }

    pub(super) fn ranks(&self, signal: SignalId) -> Ranks<'p> {
        self.record
            .expect("a record is set before anything is computed")
            .ranks(signal)
    }

    /// Whether the rows of an operation are kept.
    pub(super) fn is_kept(&self, node: usize) -> bool {
        let node = &self.plan.nodes[node];
        node.uses > 1 && node.rows * self.length <= MOST_KEPT
    }

    /// All rows of an operation at once.
    pub(super) fn block(&self, node: usize) -> Rc<Block<T>> {
        if let Some(block) = &self.kept.borrow()[node] {
            return Rc::clone(block);
        }
        let length = self.length;
        let mut codes = vec![T::ZERO; self.plan.nodes[node].rows * length];
        self.compute(node, &mut |row, demands| {
            codes[row * length..(row + 1) * length].copy_from_slice(demands);
        });
        let block = Rc::new(Block { codes, length });
        if self.is_kept(node) {
            self.kept.borrow_mut()[node] = Some(Rc::clone(&block));
        }
        block
    }

    /// Every row of an operation, in some order.
    pub(super) fn each(&self, node: usize, visit: Visit<'_, T>) {
        if self.is_kept(node) {
            let block = self.block(node);
            for row in 0..self.plan.nodes[node].rows {
                visit(row, block.row(row));
            }
        } else {
            self.compute(node, visit);
        }
    }

    fn compute(&self, node: usize, visit: Visit<'_, T>) {
        match &self.plan.nodes[node].op {
            Op::Level {
                signal,
                easier,
                count,
                weak,
            } => self.level(*signal, *easier, *count, *weak, visit),
            Op::Cut {
                signal,
                cut,
                above,
                weak,
            } => self.cut(*signal, *cut, *above, *weak, visit),
            Op::Place {
                signal,
                cuts,
                above,
                weak,
            } => self.place(*signal, cuts, *above, *weak, visit),
            Op::Join { max, parts } => self.join(*max, parts, visit),
            Op::Window {
                max,
                lower,
                upper,
                weak,
                part,
            } => self.window(*max, *lower, upper, *weak, *part, visit),
            Op::From {
                max,
                lowers,
                weak,
                part,
            } => self.from(*max, lowers, *weak, *part, visit),
            Op::Until {
                lower,
                upper,
                weak,
                left,
                right,
            } => self.until(*lower, upper, *weak, (*left, *right), visit),
            Op::UntilFrom {
                lowers,
                weak,
                left,
                right,
            } => self.until_from(lowers, *weak, (*left, *right), visit),
            Op::Run {
                run,
                lower,
                weak,
                parts,
            } => self.pairs(parts, |row, demands, then| {
                let out = runs::run(*run, demands, then, *lower as usize, *weak);
                visit(row, &out);
            }),
            Op::Met {
                points,
                above,
                part,
            } => self.met(*points, *above, *part, visit),
            Op::Scatter { .. } => unreachable!("a scatter stands outermost"),
        }
    }

    fn level(&self, signal: SignalId, easier: bool, count: u32, weak: bool, visit: Visit<'_, T>) {
        let mut out = self.buffer();
        let at = usize::from(easier);
        match self.ranks(signal) {
            Ranks::Narrow(ranks) => {
                (self.kernels.level_narrow[at])(&mut out, ranks, count, boolean(weak));
            }
            Ranks::Wide(ranks) => {
                (self.kernels.level_wide[at])(&mut out, ranks, count, boolean(weak));
            }
        }
        visit(0, &out);
        self.put_back(out);
    }

    fn cut(&self, signal: SignalId, cut: u32, above: bool, weak: bool, visit: Visit<'_, T>) {
        let mut out = self.buffer();
        let at = usize::from(above);
        match self.ranks(signal) {
            Ranks::Narrow(ranks) => {
                let cut = u16::from_u32(cut);
                (self.kernels.cut_narrow[at])(&mut out, ranks, cut, boolean(weak));
            }
            Ranks::Wide(ranks) => {
                (self.kernels.cut_wide[at])(&mut out, ranks, cut, boolean(weak));
            }
        }
        visit(0, &out);
        self.put_back(out);
    }

    fn place(&self, signal: SignalId, cuts: &[u32], above: bool, weak: bool, visit: Visit<'_, T>) {
        let mut out = self.buffer();
        out.fill(T::ZERO);
        let (at, points, unknown) = (usize::from(above), cuts.len() as u32, boolean(weak));
        match self.ranks(signal) {
            Ranks::Narrow(ranks) => {
                for cut in cuts {
                    (self.kernels.count_narrow[at])(&mut out, ranks, u16::from_u32(*cut));
                }
                (self.kernels.close_narrow)(&mut out, ranks, points, unknown);
            }
            Ranks::Wide(ranks) => {
                for cut in cuts {
                    (self.kernels.count_wide[at])(&mut out, ranks, *cut);
                }
                (self.kernels.close_wide)(&mut out, ranks, points, unknown);
            }
        }
        visit(0, &out);
        self.put_back(out);
    }

    fn join(&self, max: bool, parts: &[usize], visit: Visit<'_, T>) {
        let rows = |part: usize| self.plan.nodes[part].rows;
        // The part with most rows is handed on one at a time, the others are
        // joined with one another first.
        let most = (0..parts.len()).max_by_key(|at| rows(parts[*at]));
        let most = most.unwrap_or(0);
        let stride = |at: usize| -> usize { parts[at + 1..].iter().map(|p| rows(*p)).product() };
        let mut others: Vec<(usize, Vec<T>)> = Vec::new();
        for (at, part) in parts.iter().enumerate() {
            if at == most {
                continue;
            }
            let block = self.block(*part);
            let own = (0..rows(*part)).map(|row| (row * stride(at), block.row(row)));
            others = if others.is_empty() {
                own.map(|(place, row)| (place, row.to_vec())).collect()
            } else {
                let join = self.kernels.join[usize::from(max)];
                let own: Vec<(usize, &[T])> = own.collect();
                let pairs = others.iter().flat_map(|(place, before)| {
                    own.iter().map(move |(more, row)| {
                        let mut out = vec![T::ZERO; row.len()];
                        join(&mut out, before, row);
                        (place + more, out)
                    })
                });
                pairs.collect()
            };
        }
        let mut out = self.buffer();
        self.each(parts[most], &mut |row, demands| {
            for (place, other) in &others {
                (self.kernels.join[usize::from(max)])(&mut out, demands, other);
                visit(place + row * stride(most), &out);
            }
        });
        self.put_back(out);
    }

    /// Every row of one operand, or every pair of rows of two.
    pub(super) fn pairs(&self, parts: &[usize], mut visit: impl FnMut(usize, &[T], &[T])) {
        match parts {
            [one] => self.each(*one, &mut |row, demands| visit(row, demands, &[])),
            [left, right] => {
                let block = self.block(*right);
                let rows = self.plan.nodes[*right].rows;
                self.each(*left, &mut |row, demands| {
                    for other in 0..rows {
                        visit(row * rows + other, demands, block.row(other));
                    }
                });
            }
            _ => unreachable!("operators have one or two operands"),
        }
    }

    fn window(
        &self,
        max: bool,
        lower: u32,
        upper: &Upper,
        weak: bool,
        part: usize,
        visit: Visit<'_, T>,
    ) {
        let beyond = boolean(weak);
        let lower = lower as usize;
        self.each(part, &mut |row, demands| match upper {
            Upper::End => {
                let mut scanned = self.buffer();
                scan_back(&mut scanned, demands, max, beyond);
                if lower > 0 {
                    let mut out = self.buffer();
                    shift(&mut out, &scanned, lower, beyond);
                    visit(row, &out);
                    self.put_back(out);
                } else {
                    visit(row, &scanned);
                }
                self.put_back(scanned);
            }
            Upper::At(upper) => {
                let mut ladder = Ladder::new(self, demands, lower, max, beyond);
                visit(row, ladder.reach(*upper as usize));
                ladder.finish();
            }
            Upper::Axis(points) => {
                let mut ladder = Ladder::new(self, demands, lower, max, beyond);
                for (k, upper) in points.iter().enumerate() {
                    visit(row * points.len() + k, ladder.reach(*upper as usize));
                }
                ladder.finish();
            }
        });
    }

    fn from(&self, max: bool, lowers: &[u32], weak: bool, part: usize, visit: Visit<'_, T>) {
        let beyond = boolean(weak);
        let mut scanned = self.buffer();
        let mut out = self.buffer();
        self.each(part, &mut |row, demands| {
            scan_back(&mut scanned, demands, max, beyond);
            for (k, lower) in lowers.iter().enumerate() {
                shift(&mut out, &scanned, *lower as usize, beyond);
                visit(row * lowers.len() + k, &out);
            }
        });
        self.put_back(scanned);
        self.put_back(out);
    }

    fn met(&self, points: u32, above: bool, part: usize, visit: Visit<'_, T>) {
        let mut out = self.buffer();
        self.each(part, &mut |row, demands| {
            for point in 0..points {
                let level = place_of(point, points, above);
                (self.kernels.met)(&mut out, demands, T::from_u32(level));
                visit(row * points as usize + point as usize, &out);
            }
        });
        self.put_back(out);
    }

    fn until(
        &self,
        lower: u32,
        upper: &Upper,
        weak: (bool, bool),
        (left, right): (usize, usize),
        visit: Visit<'_, T>,
    ) {
        let beyond = (boolean(weak.0), boolean(weak.1));
        let lower = lower as usize;
        let uppers: Vec<Option<usize>> = match upper {
            Upper::End => vec![None],
            Upper::At(upper) => vec![Some(*upper as usize)],
            Upper::Axis(points) => points.iter().map(|p| Some(*p as usize)).collect(),
        };
        self.pairs(&[left, right], |row, before, then| {
            let mut wait = start::Wait::new(self, before, then, beyond);
            for (k, upper) in uppers.iter().enumerate() {
                let answer = wait.reach(upper.map(|upper| upper - lower));
                let out = start::opened(self, before, answer, lower, beyond);
                visit(row * uppers.len() + k, out.as_deref().unwrap_or(answer));
            }
            wait.finish();
        });
    }

    fn until_from(
        &self,
        lowers: &[u32],
        weak: (bool, bool),
        (left, right): (usize, usize),
        visit: Visit<'_, T>,
    ) {
        let beyond = (boolean(weak.0), boolean(weak.1));
        self.pairs(&[left, right], |row, before, then| {
            let mut wait = start::Wait::new(self, before, then, beyond);
            let answer = wait.reach(None);
            for (k, lower) in lowers.iter().enumerate() {
                let out = start::opened(self, before, answer, *lower as usize, beyond);
                visit(row * lowers.len() + k, out.as_deref().unwrap_or(answer));
            }
            wait.finish();
        });
    }
}

/// The level at which a point of a threshold axis is met: its place counted
/// from the easy end.
pub(super) fn place_of(point: u32, points: u32, above: bool) -> u32 {
    if above { points - 1 - point } else { point }
}
