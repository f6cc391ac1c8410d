//! Grammars: which templates are worth proposing.
//!
//! A grammar file is read ([`Grammar::read`]) into rules of alternatives, each
//! a piece of the template language in which names of rules stand for
//! formulas, signals or durations. `check` refuses what cannot work. A grammar
//! meets a [`Palette`] (what the data offers) in `production`: every rule in
//! every place where it is used becomes a list of productions. From those,
//! `count` tells how many templates there are of each size by a recurrence, and
//! `enumerate` lists them, size by size, in an order that depends on nothing
//! but grammar and palette.
//!
//! Counts are of derivations: a grammar that can say one template in two ways
//! counts it twice. Throwing the second one away is the business of
//! `equivalence`, which the enumerator consults through [`Canonical`], so that
//! larger templates are built from canonical parts only.

mod check;
mod count;
mod enumerate;
mod file;
mod palette;
mod piece;
mod production;
mod report;

pub use count::{Counts, count};
pub use enumerate::{Canonical, Enumerator, Identity, Portion};
pub use file::{Alternative, Binding, Grammar, GrammarError, Limits, Pool, Rule, SHIPPED};
pub use palette::Palette;
pub use production::ProductionError;
pub use report::{GrammarReport, RuleReport, report};
