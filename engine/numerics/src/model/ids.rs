//! Indices as types: a node can not be taken for a segment.

use std::fmt;

macro_rules! index {
    ($name:ident, $what:literal) => {
        #[doc = concat!("Index of a ", $what, " in its net, in the order in which they were given.")]
        #[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
        pub struct $name(u32);

        impl $name {
            /// The index as it is used in slices.
            ///
            /// # Panics
            /// At construction, if the index does not fit 32 bits.
            #[must_use]
            pub fn new(index: usize) -> Self {
                Self(u32::try_from(index).expect("a net has fewer than 2^32 parts of a kind"))
            }

            /// Position in the slices that range over this kind.
            #[must_use]
            pub fn index(self) -> usize {
                self.0 as usize
            }
        }

        impl fmt::Display for $name {
            fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
                write!(f, "{} {}", $what, self.0)
            }
        }
    };
}

index!(NodeId, "node");
index!(CableId, "cable");
index!(StrutId, "strut");
index!(SegmentId, "segment");
index!(ReachId, "reach");
