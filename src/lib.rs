//! strandline discovers temporal-logic templates in time-series traces.
//!
//! The modules, in the order in which a module may use those before it:
//! support, template, grammar, equivalence, traces, kernels, embedding,
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

pub mod grouping;

pub mod scoring;

pub mod description;

pub mod search;

pub mod store;

pub mod handover;

pub mod report;

pub mod cli;
