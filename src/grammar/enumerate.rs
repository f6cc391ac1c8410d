//! Listing the templates of a grammar, size by size.
//!
//! The lists of all smaller parts are kept (they are needed again and again);
//! the templates of the size being listed are made one at a time and handed
//! over, never kept. So memory is that of the parts, which are smaller by at
//! least one operator, and the order is fixed: by weight, then as the grammar
//! has its alternatives, then as the data has its channels.

use std::collections::BTreeMap;
use std::ops::ControlFlow;
use std::rc::Rc;

use super::count::is_same_twice;
use super::file::{Grammar, Limits};
use super::palette::Palette;
use super::piece::{Head, Piece, PieceId, Value};
use super::production::{ProductionError, Productions, productions};
use crate::template::Formula;

/// Decides which parts larger templates are built from.
pub trait Canonical {
    /// The form in which a part is used, or `None` when it is the same as one
    /// that was used before. `rule` is the position of the rule it came from:
    /// parts are compared with those of the same rule only.
    fn part(&mut self, rule: usize, formula: &Formula) -> Option<Formula>;
}

/// Uses every part as it is.
#[derive(Debug, Clone, Copy, Default)]
pub struct Identity;

impl Canonical for Identity {
    fn part(&mut self, _: usize, formula: &Formula) -> Option<Formula> {
        Some(formula.clone())
    }
}

/// Which templates of a size are handed over.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Portion {
    /// Templates passed over first: where an earlier listing stopped.
    pub from: usize,
    /// Slice `.0` of `.1`, counted from 0: every template belongs to exactly
    /// one slice.
    pub slice: (usize, usize),
}

impl Portion {
    /// All templates.
    pub const WHOLE: Portion = Portion {
        from: 0,
        slice: (0, 1),
    };

    /// Whether the template at a place of its size belongs to it.
    pub fn has(&self, place: usize) -> bool {
        place >= self.from && place % self.slice.1 == self.slice.0
    }
}

/// A value with what it counts against the limits.
#[derive(Debug, Clone)]
struct Entry {
    value: Value,
    slots: u32,
    flags: u32,
}

/// Lists the templates of a grammar on a palette.
#[derive(Debug)]
pub struct Enumerator {
    productions: Productions,
    limits: Limits,
    /// Which rule a piece is, where it is one as a formula.
    rule_of: BTreeMap<PieceId, usize>,
    lists: BTreeMap<(PieceId, u32), Rc<Vec<Entry>>>,
}

impl Enumerator {
    /// An enumerator of a grammar on a palette.
    ///
    /// # Errors
    /// When rules do not fit together.
    pub fn new(grammar: &Grammar, palette: &Palette) -> Result<Self, ProductionError> {
        let productions = productions(grammar, palette)?;
        let rule_of = productions
            .formulas
            .iter()
            .map(|(rule, piece)| (*piece, *rule))
            .collect();
        Ok(Enumerator {
            productions,
            limits: grammar.limits,
            rule_of,
            lists: BTreeMap::new(),
        })
    }

    /// The largest size that the grammar allows.
    pub fn largest_size(&self) -> u32 {
        self.limits.size
    }

    /// Hands over every template of a size, in order, until `visit` breaks.
    /// `visit` is given the chooser of parts too, since it usually decides
    /// about whole templates as well.
    pub fn for_each<C: Canonical>(
        &mut self,
        size: u32,
        canonical: &mut C,
        mut visit: impl FnMut(&mut C, Formula) -> ControlFlow<()>,
    ) -> ControlFlow<()> {
        if size > self.limits.size {
            return ControlFlow::Continue(());
        }
        self.stream(
            self.productions.goal,
            size,
            canonical,
            &mut |canonical, entry| match entry.value {
                Value::Formula(formula) => visit(canonical, formula),
                _ => ControlFlow::Continue(()),
            },
        )
    }

    /// As [`Enumerator::for_each`], for a portion of the size only. The place of
    /// each template in its size is handed over too, so that a listing that is
    /// cut short can go on behind it. Parts are always listed whole, so the
    /// order does not depend on the portion.
    pub fn for_each_in<C: Canonical>(
        &mut self,
        size: u32,
        portion: Portion,
        canonical: &mut C,
        mut visit: impl FnMut(&mut C, usize, Formula) -> ControlFlow<()>,
    ) -> ControlFlow<()> {
        let mut next = 0;
        self.for_each(size, canonical, |canonical, formula| {
            let place = next;
            next += 1;
            if portion.has(place) {
                visit(canonical, place, formula)
            } else {
                ControlFlow::Continue(())
            }
        })
    }

    /// Makes every value of a piece of a size, in order.
    fn stream<C: Canonical>(
        &mut self,
        piece: PieceId,
        size: u32,
        canonical: &mut C,
        visit: &mut dyn FnMut(&mut C, Entry) -> ControlFlow<()>,
    ) -> ControlFlow<()> {
        let here = self.productions.pieces[piece].clone();
        if let Head::Choice(choices) = &here.head {
            for choice in choices {
                self.stream(*choice, size, canonical, visit)?;
            }
            return ControlFlow::Continue(());
        }
        let Some(rest) = size.checked_sub(here.size()) else {
            return ControlFlow::Continue(());
        };
        let mut sizes = Vec::new();
        self.splits(&here, rest, &mut Vec::new(), &mut sizes);
        for split in sizes {
            let mut lists = Vec::with_capacity(split.len());
            for (part, size) in here.parts.iter().zip(&split) {
                let list = self.list(*part, *size, canonical);
                if list.is_empty() {
                    break;
                }
                lists.push(list);
            }
            if lists.len() == split.len() {
                let same = is_same_twice(&here.parts) && matches!(here.head, Head::And | Head::Or);
                let unordered = same && split[0] == split[1];
                combine(&here, &lists, unordered, self.limits, &mut |entry| {
                    visit(canonical, entry)
                })?;
            }
        }
        ControlFlow::Continue(())
    }

    /// The ways to share a size among the parts. Of two equal operands the
    /// left one is not the larger.
    fn splits(&self, piece: &Piece, rest: u32, taken: &mut Vec<u32>, all: &mut Vec<Vec<u32>>) {
        if taken.len() == piece.parts.len() {
            if rest == 0 {
                all.push(taken.clone());
            }
            return;
        }
        let same = is_same_twice(&piece.parts) && matches!(piece.head, Head::And | Head::Or);
        let last = taken.len() + 1 == piece.parts.len();
        let sizes = if last { rest..=rest } else { 0..=rest };
        for size in sizes {
            if same && !taken.is_empty() && size < taken[0] {
                continue;
            }
            taken.push(size);
            self.splits(piece, rest - size, taken, all);
            taken.pop();
        }
    }

    /// All values of a piece of a size, kept.
    fn list<C: Canonical>(
        &mut self,
        piece: PieceId,
        size: u32,
        canonical: &mut C,
    ) -> Rc<Vec<Entry>> {
        if let Some(list) = self.lists.get(&(piece, size)) {
            return Rc::clone(list);
        }
        // A rule that only renames itself comes back here; the empty list says
        // that nothing new is to be had that way.
        self.lists.insert((piece, size), Rc::new(Vec::new()));
        let rule = self.rule_of.get(&piece).copied();
        let mut found = Vec::new();
        let _ = self.stream(piece, size, canonical, &mut |canonical, mut entry| {
            if let (Some(rule), Value::Formula(formula)) = (rule, &entry.value) {
                match canonical.part(rule, formula) {
                    None => return ControlFlow::Continue(()),
                    Some(form) => {
                        entry.slots = form.slots().len() as u32;
                        entry.value = Value::Formula(form);
                    }
                }
            }
            found.push(entry);
            ControlFlow::Continue(())
        });
        let list = Rc::new(found);
        self.lists.insert((piece, size), Rc::clone(&list));
        list
    }
}

/// Every combination of one value of each list, in order.
fn combine(
    piece: &Piece,
    lists: &[Rc<Vec<Entry>>],
    unordered: bool,
    limits: Limits,
    visit: &mut dyn FnMut(Entry) -> ControlFlow<()>,
) -> ControlFlow<()> {
    let mut at = vec![0usize; lists.len()];
    loop {
        let chosen: Vec<&Entry> = lists.iter().zip(&at).map(|(list, at)| &list[*at]).collect();
        let slots = piece.slots() + chosen.iter().map(|entry| entry.slots).sum::<u32>();
        let flags = piece.flags() + chosen.iter().map(|entry| entry.flags).sum::<u32>();
        if slots <= limits.slots && flags <= limits.flags {
            let parts: Vec<&Value> = chosen.iter().map(|entry| &entry.value).collect();
            if let Some(value) = piece.build(&parts) {
                visit(Entry {
                    value,
                    slots,
                    flags,
                })?;
            }
        }
        if !advance(&mut at, lists, unordered) {
            return ControlFlow::Continue(());
        }
    }
}

/// Moves to the next combination, the last list fastest. Of unordered pairs the
/// right one never stands before the left one.
fn advance(at: &mut [usize], lists: &[Rc<Vec<Entry>>], unordered: bool) -> bool {
    for place in (0..at.len()).rev() {
        at[place] += 1;
        if at[place] < lists[place].len() {
            if unordered && place == 0 {
                at[1] = at[0];
            }
            return true;
        }
        at[place] = 0;
    }
    false
}
