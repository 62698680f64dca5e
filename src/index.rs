//! Ids that tie the floors together: small numbers into the lists of a [`crate::problem::Problem`].

use serde::Serialize;

macro_rules! id {
    ($(#[$doc:meta])* $name:ident) => {
        $(#[$doc])*
        #[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash, Serialize)]
        pub struct $name(pub u32);

        impl $name {
            /// The place in the list, for indexing.
            pub fn index(self) -> usize {
                self.0 as usize
            }
            /// The id of the entry at `index`.
            pub fn new(index: usize) -> Self {
                Self(index as u32)
            }
        }
    };
}

id!(
    /// A sheet of the stack, bottom first.
    LayerId
);
id!(
    /// A terminal or a cell's end.
    ElectrodeId
);
id!(
    /// An area where two sheets lie on each other.
    ContactId
);
id!(
    /// A set of spots, seams or areas that join two sheets.
    JoinId
);
id!(
    /// A pair of meter tips.
    ProbeId
);
id!(
    /// A line across which current is counted.
    CrossingId
);
id!(
    /// A cell with both ends or one end in the job, seen as a voltage source.
    SourceId
);
