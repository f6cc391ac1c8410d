//! strandline discovers temporal-logic templates in time-series traces.
//!
//! An engineer has many traces of a machine and no written specification. The
//! program proposes **templates** (sentences of temporal logic with free
//! numbers, the **slots**), keeps those that sort the traces well, and says in
//! formulas with numbers and in words what sets each group apart.
//!
//! The central types, in the order in which the data flows:
//!
//! * [`traces::TraceSet`]: traces on one time grid, with derived signals.
//! * [`template::Formula`]: a template in analysed form, built only through
//!   constructors that compute its size, its slots and their directions.
//! * [`grammar::Enumerator`]: lists the templates of a grammar by size.
//! * [`equivalence::Seen`]: the e-graph that never lets the same one in twice.
//! * [`embedding::Embedding`]: the exact boundary of every trace, at every grid
//!   point. Each entry *is* a specification, which is why a rule on the numbers
//!   is a formula.
//! * [`search::Explanation`]: groups, their descriptions, and how far to
//!   believe them.
//!
//! What a formula means is defined in [`kernels::naive`], and everything else
//! is checked against it. A template is read, put against data and measured
//! like this:
//!
//! ```
//! use strandline::embedding::{embed, resolve};
//! use strandline::template::{parse, Signal};
//! use strandline::traces::{Channel, Grid, TraceSet};
//!
//! let speed = Channel {
//!     signal: Signal::channel("speed"),
//!     unit: None,
//!     samples: vec![1.0, 4.0, 2.0, /* second trace */ 3.0, 3.0, 3.0],
//! };
//! let names = vec!["a".to_owned(), "b".to_owned()];
//! let mut traces = TraceSet::new(names, &[3, 3], None, Grid::samples(), vec![speed]);
//! let template = parse("throughout [0, end] (speed <= ?)").unwrap();
//! resolve(&template, &mut traces).unwrap();
//! assert_eq!(embed(&template, &traces).unwrap().columns, [[4.0, 3.0]]);
//! ```
//!
//! The modules, in the order in which one may use those before it: support,
//! template, grammar, equivalence, traces, kernels, embedding, comparison,
//! grouping, scoring, description, search, store, handover, report, cli.
#![cfg_attr(
    test,
    allow(
        clippy::unwrap_used,
        clippy::float_cmp,
        reason = "a test that fails says so by panicking, and compares exact values"
    )
)]

pub mod support;
pub mod template;

pub mod grammar;

pub mod equivalence;

pub mod traces;

pub mod kernels;

pub mod embedding;

pub mod comparison;

pub mod grouping;

pub mod scoring;

pub mod description;

pub mod search;

pub mod store;

pub mod handover;

pub mod report;

pub mod cli;
