//! Hydraulics: the steady state of one condition of a network, by the global gradient method (Todini & Pilati 1988).
//! Sees no coordinate, no file and no unit but SI.
//!
//! [`Solver`] is the face. Behind it, one subject a file: the friction factor and the law of a part; the equations of a
//! network and their numbering; the linear algebra; Newton's method; the flow at a held head; and the residuals, which are
//! recomputed from the values that are returned.

mod equations;
mod excess;
mod friction;
mod headloss;
mod held;
mod linear;
mod newton;
mod pressure_driven;
mod residuals;
mod settings;
mod solution;
mod solver;
mod water;

pub use friction::{FrictionFactor, colebrook_white, friction_factor};
pub use headloss::{HeadLoss, Loss, STRAIGHT_BELOW_M};
pub use held::{Held, Kept, Limit};
pub use linear::Factoring;
pub use pressure_driven::{Delivered, Tap};
pub use residuals::{Residuals, residuals};
pub use settings::{HazenWilliams, Settings, USUAL_TEMPERATURE_C};
pub use solution::{NotSettled, State};
pub use solver::Solver;
pub use water::{density_kg_per_m3, dynamic_viscosity_pa_s, viscosity_m2_per_s};

#[cfg(test)]
mod solver_tests;
