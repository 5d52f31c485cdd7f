//! Hydraulics: the steady state of one condition of a network, by the global gradient method (Todini & Pilati 1988).
//! Sees no coordinate, no file and no unit but SI.

mod residuals;
mod settings;
mod solver;
mod water;

pub use residuals::Residuals;
pub use settings::{HazenWilliams, Settings, USUAL_TEMPERATURE_C};
pub use solver::{Held, Kept, Limit, NotSettled, Solver, State};
pub use water::{density_kg_per_m3, dynamic_viscosity_pa_s, viscosity_m2_per_s};
