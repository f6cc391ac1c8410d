//! All integration tests, in one binary.
#![allow(
    clippy::unwrap_used,
    clippy::float_cmp,
    reason = "a test that fails says so by panicking, and compares exact values"
)]

mod chance;
mod commands;
mod demo_data;
mod descriptions;
mod equivalence;
mod grammars;
mod grouping;
#[allow(dead_code, reason = "shared with the benchmark")]
mod judged;
mod kernels;
mod known_answers;
mod language;
mod measures;
mod scoring;
mod support;
mod tidy;
mod trace_files;
