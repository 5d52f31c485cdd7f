//! Hydraulics: the steady state of one condition of a network, by the global gradient method (Todini & Pilati 1988).
//! Sees no coordinate, no file and no unit but SI.

mod solver;

pub use solver::{Held, Kept, Limit, NotSettled, Residuals, Settings, Solver, State};
