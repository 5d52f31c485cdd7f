//! Tests of the room as a whole: each fault beside its innocent twin, properties, and whole invented towns.

mod draw;
mod faults;
mod points;
mod properties;
mod speed;
mod town;
