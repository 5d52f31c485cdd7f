//! GeoJSON (RFC 7946, with the older `crs` member).
//!
//! The file is read once over its text without building a tree of it: our own visitor sees the members in any order,
//! keeps coordinates and the columns asked for, and remembers where in the text each feature's properties end. A writer
//! puts our members there and leaves every other byte as it was. (The streaming reader of the `geojson` crate takes the
//! first bracket of the file for the features and ends quietly in a file that is cut short.)

mod coordinates;
mod properties;
mod read;
mod write;

pub(super) use read::read;
pub(super) use write::{read_again, write_converted, write_marked, write_new};

/// Where our members go into a feature's text.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Splice {
    /// Byte offset in the file.
    pub at: usize,
    /// What stands there.
    pub place: Place,
}

/// What stands where our members go.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) enum Place {
    /// The opening brace of empty properties stands before.
    InEmpty,
    /// The last of the user's members stands before.
    AfterMember,
    /// The word `null` stands after and gives way to an object.
    OverNull,
    /// The feature has no properties; the value of its `type` stands before.
    AfterType,
}
