//! Typed indices, so that a trace number is never taken for a channel number.

macro_rules! typed_id {
    ($(#[$doc:meta])* $name:ident) => {
        $(#[$doc])*
        #[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
        pub struct $name(pub u32);

        impl $name {
            /// The position as an index into a slice.
            pub fn index(self) -> usize {
                self.0 as usize
            }

            /// The id of a position.
            ///
            /// # Panics
            /// When the position does not fit 32 bits.
            pub fn at(index: usize) -> Self {
                $name(u32::try_from(index).expect("more than 2^32 items"))
            }
        }
    };
}

typed_id!(
    /// A trace of a trace set, by position.
    TraceId
);
typed_id!(
    /// A signal (recorded or derived, numeric channel or flag) of a trace set.
    SignalId
);
typed_id!(
    /// A slot of a template, numbered from 0 in the order of its text
    /// (printed from 1: `?1`).
    SlotId
);
