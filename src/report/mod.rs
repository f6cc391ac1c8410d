//! Results for people and for other programs. Everything here turns the plain
//! data of `search::outcome` into text; nothing is computed again.

mod terminal;

pub use terminal::{explanation, ranking};
