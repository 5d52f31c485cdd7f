//! Friction factors of the Darcy-Weisbach law: laminar, Colebrook-White, and the transition between them.

use std::f64::consts::LN_10;

/// Reynolds number up to which flow is laminar.
pub const LAMINAR_TO_REYNOLDS: f64 = 2000.0;
/// Reynolds number from which Colebrook-White holds alone.
pub const TURBULENT_FROM_REYNOLDS: f64 = 4000.0;
/// Relative roughness above which a larger value changes nothing: no wall is rougher than its bore is wide.
const ROUGHEST: f64 = 1.0;

/// A friction factor and how it changes with flow.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct FrictionFactor {
    /// Darcy's f (four times Fanning's).
    pub factor: f64,
    /// d ln f / d ln Re.
    pub log_slope: f64,
}

/// Darcy's friction factor at any Reynolds number above zero.
///
/// Up to 2000 it is 64/Re (Hagen-Poiseuille), from 4000 on Colebrook-White. Between, where no law is agreed, the two are
/// blended: f = (1-w) 64/Re + w f_CW(Re) with w = t^2 (3-2t) and t = (Re-2000)/2000, our own choice, so that f and its
/// slope are continuous and the head loss keeps growing with flow.
pub fn friction_factor(reynolds: f64, relative_roughness: f64) -> FrictionFactor {
    let laminar = 64.0 / reynolds;
    if reynolds <= LAMINAR_TO_REYNOLDS {
        return FrictionFactor {
            factor: laminar,
            log_slope: -1.0,
        };
    }
    let turbulent = colebrook_white(reynolds, relative_roughness);
    if reynolds >= TURBULENT_FROM_REYNOLDS {
        return turbulent;
    }
    let width = TURBULENT_FROM_REYNOLDS - LAMINAR_TO_REYNOLDS;
    let t = (reynolds - LAMINAR_TO_REYNOLDS) / width;
    let weight = t * t * (3.0 - 2.0 * t);
    let weight_slope = 6.0 * t * (1.0 - t) / width;
    let factor = (1.0 - weight) * laminar + weight * turbulent.factor;
    // d f / d ln Re, term by term.
    let slope = reynolds * weight_slope * (turbulent.factor - laminar) - (1.0 - weight) * laminar
        + weight * turbulent.factor * turbulent.log_slope;
    FrictionFactor {
        factor,
        log_slope: slope / factor,
    }
}

/// The Colebrook-White law (Colebrook 1939, J. Inst. Civ. Eng. 11:133-156),
/// 1/sqrt(f) = -2 log10(e/(3.7 D) + 2.51/(Re sqrt(f))), solved to rounding by Newton's method.
pub fn colebrook_white(reynolds: f64, relative_roughness: f64) -> FrictionFactor {
    let wall = relative_roughness.min(ROUGHEST) / 3.7;
    let film = 2.51 / reynolds;
    // With x = 1/sqrt(f) the law is x + 2 log10(wall + film x) = 0: increasing and concave in x, so that Newton's steps
    // come up to the root from below after the first. Haaland (1983) starts within 1.5 %.
    let mut x = -1.8 * (wall.powf(1.11) + 6.9 / reynolds).log10();
    let mut last = f64::INFINITY;
    for _ in 0..30 {
        let inside = wall + film * x;
        let step = (x + 2.0 * inside.log10()) / (1.0 + 2.0 / LN_10 * film / inside);
        x -= step;
        // Steps shrink quadratically until they are rounding; a step that shrinks no more is one.
        if step.abs() >= last || step == 0.0 {
            break;
        }
        last = step.abs();
    }
    let pull = 2.0 / LN_10 * film / (wall + film * x);
    FrictionFactor {
        factor: 1.0 / (x * x),
        log_slope: -2.0 * pull / (1.0 + pull),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn slopes_agree_with_differences() {
        for roughness in [0.0, 1e-6, 1e-3, 0.05, 0.2] {
            for reynolds in [10.0, 1999.0, 2300.0, 3000.0, 3900.0, 4100.0, 1e5, 1e8] {
                let at = |re: f64| friction_factor(re, roughness).factor.ln();
                let by_difference = (at(reynolds * 1.000_01) - at(reynolds / 1.000_01)) / (2.0 * 1.000_01_f64.ln());
                let slope = friction_factor(reynolds, roughness).log_slope;
                assert!(
                    (slope - by_difference).abs() < 1e-4,
                    "{roughness} {reynolds}: {slope} {by_difference}"
                );
            }
        }
    }

    #[test]
    fn head_loss_grows_with_flow_through_the_transition() {
        for roughness in [0.0, 1e-5, 1e-3, 0.02, 0.2, 1.0] {
            let mut before = 0.0;
            for step in 0..=4000 {
                let reynolds = 1000.0 + f64::from(step);
                let loss = friction_factor(reynolds, roughness).factor * reynolds * reynolds;
                assert!(loss > before, "roughness {roughness}, Re {reynolds}");
                before = loss;
            }
        }
    }

    #[test]
    fn a_wall_rougher_than_the_bore_still_has_a_factor() {
        for roughness in [1.0, 5.0, f64::MAX] {
            let found = friction_factor(1e5, roughness).factor;
            assert!(found.is_finite() && found > 0.5 && found < 1.0, "{found}");
        }
    }
}
