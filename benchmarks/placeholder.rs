//! Kept until the first benchmark lands.
