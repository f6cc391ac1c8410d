//! Judging templates.
//!
//! * `columns` turns an embedding into numbers that distances can be taken of.
//! * `labelled` asks how well a template tells given labels apart.
//! * `unlabelled` looks for groups: every template proposes some, and every
//!   other template is a witness of whether they are seen there too.
//! * `chance` asks how well luck would do after so many tries.
//! * `interval` has the confidence intervals of shares.

mod chance;
mod columns;
mod interval;
mod labelled;
mod tree;
mod unlabelled;
mod witness;

pub use chance::{
    LabelChance, SurrogateChance, Verdict, adjusted_by_maximum, label_chance, permutation_p_value,
    surrogate_chance,
};
pub use columns::{Scaling, capped, has_enough_finite, is_usable, scaled, spearman};
pub use interval::wilson;
pub use labelled::{LabelledScore, label_silhouette, score};
pub use tree::{cross_validated_accuracy, max_literals, stratified_folds};
pub use unlabelled::{Candidate, Consensus, Grouping, Guards};
pub use witness::Witness;
