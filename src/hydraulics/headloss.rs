//! The law of one part: head lost along it at a flow, and the slope of that law.

use std::f64::consts::PI;

use super::friction::{LAMINAR_TO_REYNOLDS, friction_factor};
use super::settings::Settings;
use crate::network::{Friction, Part};

/// Head loss below which the Hazen-Williams law is replaced, m: see [`HeadLoss`].
pub const STRAIGHT_BELOW_M: f64 = 1e-8;

/// Share of its wanted flow below which an outflow's slope is taken as if it were this share: the law is flat at no flow.
const FLATTEST_SHARE: f64 = 1e-5;

/// Head lost along a part as a function of flow: odd, strictly increasing, once continuously differentiable.
///
/// A Hazen-Williams law has no slope at zero flow, which leaves a flow of zero without a stable answer. Where the loss of
/// the part, minor loss included, is below 1e-8 m, it is replaced by the odd cubic a q + b q^3 that starts as a straight
/// line with about half the mean slope and meets the law with its value and its slope. From 1e-8 m on the law is exact.
/// The Darcy-Weisbach law needs no such help: laminar flow is straight already.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct HeadLoss {
    friction: Law,
    /// Minor loss, m/(m3/s)^2.
    minor: f64,
}

#[derive(Clone, Copy, Debug, PartialEq)]
enum Law {
    /// h = resistance q^exponent from `near_m3_per_s` on, a q + b q^3 below.
    HazenWilliams {
        resistance: f64,
        exponent: f64,
        near_m3_per_s: f64,
        near_line: f64,
        near_cube: f64,
    },
    /// h = f(Re) per_factor q^2, or laminar q while flow is laminar.
    DarcyWeisbach {
        per_factor: f64,
        reynolds_per_flow: f64,
        relative_roughness: f64,
        laminar: f64,
    },
    /// h = least + rise (q/wanted)^2 between no flow and the wanted one, straight and steep beyond.
    Outflow {
        least_m: f64,
        rise_m: f64,
        wanted_m3_per_s: f64,
        stop_slope: f64,
    },
}

/// Head loss of a flow and its slope there.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Loss {
    /// Head lost from the start of the part to its end, m; the sign is that of the flow.
    pub head_m: f64,
    /// Its derivative, m/(m3/s); above zero.
    pub slope: f64,
}

impl HeadLoss {
    /// The law of a part.
    ///
    /// The minor loss is K v^2/2g with the velocity in the part's own bore.
    pub fn new(part: &Part, settings: &Settings) -> Self {
        let diameter = part.diameter_m;
        let area = PI / 4.0 * diameter * diameter;
        let velocity_head = 1.0 / (2.0 * settings.gravity_m_per_s2 * area * area);
        let minor = part.minor_loss_k.max(0.0) * velocity_head;
        let friction = match part.friction {
            Friction::CFactor(c) => {
                let law = settings.hazen_williams;
                let resistance =
                    law.constant * part.length_m / (c.powf(law.flow_exponent) * diameter.powf(law.diameter_exponent));
                hazen_williams(resistance, law.flow_exponent, minor)
            }
            Friction::RoughnessM(roughness) => {
                let per_factor = part.length_m / diameter * velocity_head;
                let reynolds_per_flow = diameter / (area * settings.viscosity_m2_per_s);
                Law::DarcyWeisbach {
                    per_factor,
                    reynolds_per_flow,
                    relative_roughness: roughness / diameter,
                    laminar: 64.0 * per_factor / reynolds_per_flow,
                }
            }
        };
        Self { friction, minor }
    }

    /// Outflow from a node to the open, as a part whose far end has a head of zero: the square root law of
    /// `pressure_driven.rs`, with `stop_slope` beyond its two ends.
    pub(super) fn outflow(least_m: f64, rise_m: f64, wanted_m3_per_s: f64, stop_slope: f64) -> Self {
        Self {
            friction: Law::Outflow {
                least_m,
                rise_m,
                wanted_m3_per_s,
                stop_slope,
            },
            minor: 0.0,
        }
    }

    /// Head lost at a flow, and the slope there.
    pub fn at(&self, flow_m3_per_s: f64) -> Loss {
        let q = flow_m3_per_s;
        let size = q.abs();
        match self.friction {
            Law::HazenWilliams {
                resistance,
                exponent,
                near_m3_per_s,
                near_line,
                near_cube,
            } => {
                if size < near_m3_per_s {
                    let cube = near_cube * q * q;
                    return Loss {
                        head_m: (near_line + cube) * q,
                        slope: near_line + 3.0 * cube,
                    };
                }
                let chord = resistance * size.powf(exponent - 1.0);
                let minor = self.minor * size;
                Loss {
                    head_m: (chord + minor) * q,
                    slope: exponent * chord + 2.0 * minor,
                }
            }
            Law::DarcyWeisbach {
                per_factor,
                reynolds_per_flow,
                relative_roughness,
                laminar,
            } => {
                let minor = self.minor * size;
                let reynolds = reynolds_per_flow * size;
                if reynolds <= LAMINAR_TO_REYNOLDS {
                    return Loss {
                        head_m: (laminar + minor) * q,
                        slope: laminar + 2.0 * minor,
                    };
                }
                let found = friction_factor(reynolds, relative_roughness);
                let chord = per_factor * found.factor * size;
                Loss {
                    head_m: (chord + minor) * q,
                    slope: chord * (2.0 + found.log_slope) + 2.0 * minor,
                }
            }
            Law::Outflow {
                least_m,
                rise_m,
                wanted_m3_per_s,
                stop_slope,
            } => {
                let within = q.clamp(0.0, wanted_m3_per_s);
                let share = within / wanted_m3_per_s;
                let head_m = least_m + rise_m * share * share + stop_slope * (q - within);
                let slope = if q == within {
                    2.0 * rise_m * share.max(FLATTEST_SHARE) / wanted_m3_per_s
                } else {
                    stop_slope
                };
                Loss { head_m, slope }
            }
        }
    }

    /// Head lost at a flow, m.
    pub fn head_m(&self, flow_m3_per_s: f64) -> f64 {
        self.at(flow_m3_per_s).head_m
    }
}

/// The Hazen-Williams law with its replacement near zero.
fn hazen_williams(resistance: f64, exponent: f64, minor: f64) -> Law {
    let loss = |q: f64| resistance * q.powf(exponent) + minor * q * q;
    let slope = |q: f64| exponent * resistance * q.powf(exponent - 1.0) + 2.0 * minor * q;
    // The smaller of the two flows that would lose 1e-8 m by one term alone loses more by both: Newton's method comes
    // down from it without crossing the root.
    let mut near = (STRAIGHT_BELOW_M / resistance).powf(1.0 / exponent);
    if minor > 0.0 {
        near = near.min((STRAIGHT_BELOW_M / minor).sqrt());
        for _ in 0..20 {
            let step = (loss(near) - STRAIGHT_BELOW_M) / slope(near);
            near -= step;
            if step <= 1e-15 * near {
                break;
            }
        }
    }
    let mean = loss(near) / near;
    let local = slope(near) / mean;
    Law::HazenWilliams {
        resistance,
        exponent,
        near_m3_per_s: near,
        near_line: (3.0 - local) / 2.0 * mean,
        near_cube: (local - 1.0) / 2.0 * mean / (near * near),
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::network::NodeIx;

    fn part(length_m: f64, diameter_m: f64, friction: Friction, minor_loss_k: f64) -> Part {
        Part {
            from: NodeIx(0),
            to: NodeIx(1),
            length_m,
            diameter_m,
            friction,
            minor_loss_k,
        }
    }

    fn laws() -> Vec<HeadLoss> {
        let settings = Settings::default();
        let mut found = Vec::new();
        for length in [1e-3, 100.0, 1e5] {
            for diameter in [0.01, 0.15, 3.0] {
                for k in [0.0, 0.5, 100.0] {
                    for friction in [
                        Friction::CFactor(130.0),
                        Friction::RoughnessM(0.0),
                        Friction::RoughnessM(1e-3),
                    ] {
                        found.push(HeadLoss::new(&part(length, diameter, friction, k), &settings));
                    }
                }
            }
        }
        found
    }

    #[test]
    fn every_law_is_odd_and_rises_without_a_jump_in_value_or_slope() {
        for law in laws() {
            let mut before = law.at(0.0);
            assert_eq!(before.head_m, 0.0);
            assert!(before.slope > 0.0);
            let mut q = 1e-14;
            while q < 10.0 {
                let here = law.at(q);
                assert!(here.head_m > before.head_m && here.slope > 0.0, "{law:?} at {q}");
                assert_eq!(law.at(-q).head_m, -here.head_m);
                let near = law.at(q * (1.0 + 1e-9));
                assert!((near.head_m / here.head_m - 1.0).abs() < 1e-8, "{law:?} at {q}");
                assert!((near.slope / here.slope - 1.0).abs() < 1e-7, "{law:?} at {q}");
                before = here;
                q *= 1.07;
            }
        }
    }

    #[test]
    fn slopes_agree_with_differences() {
        for law in laws() {
            for q in [1e-12, 1e-9, 1e-6, 1e-3, 1.0] {
                let step = 1e-5 * q;
                let by_difference = (law.head_m(q + step) - law.head_m(q - step)) / (2.0 * step);
                let slope = law.at(q).slope;
                assert!(
                    (slope / by_difference - 1.0).abs() < 1e-4,
                    "{law:?} at {q}: {slope} {by_difference}"
                );
            }
        }
    }

    #[test]
    fn above_a_hundred_millionth_of_a_metre_the_law_is_exact() {
        let settings = Settings::default();
        let law = HeadLoss::new(&part(1000.0, 0.2, Friction::CFactor(110.0), 3.0), &settings);
        let q: f64 = 1e-6;
        let hw = settings.hazen_williams;
        let exact = hw.constant * 1000.0 * (q / 110.0).powf(hw.flow_exponent) / 0.2_f64.powf(hw.diameter_exponent)
            + 3.0 * (q / (PI / 4.0 * 0.04)).powi(2) / (2.0 * settings.gravity_m_per_s2);
        assert!(exact > STRAIGHT_BELOW_M);
        assert!((law.head_m(q) / exact - 1.0).abs() < 1e-13);
    }
}
