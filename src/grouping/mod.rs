//! Groups of points: distances, k-means and Ward's method, silhouettes,
//! agreement of two groupings, and stability.
//!
//! The points are traces, their coordinates the columns of an embedding, but
//! nothing here knows that. Every function is plain arithmetic on
//! [`Points`], [`Distances`] and [`Partition`]; those that draw random numbers
//! take a [`Stream`](crate::support::Stream), so the same stream gives the same
//! answer. Published methods keep their names and cite their papers; where a
//! method is undefined, the function says what it returns.

mod agreement;
mod distance;
mod kmeans;
mod linkage;
mod partition;
mod points;
mod silhouette;
mod stability;

pub use agreement::adjusted_rand;
pub use distance::Distances;
pub use kmeans::{KMeans, kmeans, nearest};
pub use linkage::{Merges, ward};
pub use partition::Partition;
pub use points::Points;
pub use silhouette::{mean_width, widths};
pub use stability::{jaccard_stability, subsample_stability};
