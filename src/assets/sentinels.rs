//! Fillers: values that stand for "not known". What is one depends on what the column means: 0 or 99 is no diameter, but
//! may be an elevation, a demand or a minor loss coefficient.

/// What a column means.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Meaning {
    Diameter,
    Elevation,
    Head,
    Demand,
    NeededFlow,
    CFactor,
    Roughness,
    LossCoefficient,
    Length,
    Lift,
}

/// Where most of a column's values lie: the 5th, 50th and 95th percentile, in the file's own unit.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Spread {
    low: f64,
    middle: f64,
    high: f64,
}

/// Values that are fillers in every column: nines, their negatives, and the least 16-bit and 32-bit numbers.
const ALWAYS: &[f64] = &[
    9_999.0,
    99_999.0,
    999_999.0,
    9_999_999.0,
    -99.0,
    -999.0,
    -9_999.0,
    -99_999.0,
    -999_999.0,
    -32_768.0,
    -2_147_483_648.0,
];
/// Values that are fillers in some columns, and in others where they lie far from the rest.
const OFTEN: &[f64] = &[0.0, -1.0, -9.0, 99.0, 999.0];

impl Spread {
    /// The spread of values that are no fillers for sure; `None` if there are none.
    pub fn of(values: impl Iterator<Item = f64>) -> Option<Spread> {
        let mut sure: Vec<f64> = values
            .filter(|value| !ALWAYS.contains(value) && !OFTEN.contains(value))
            .collect();
        if sure.is_empty() {
            return None;
        }
        sure.sort_by(f64::total_cmp);
        let at = |share: f64| sure[((sure.len() - 1) as f64 * share).round() as usize];
        Some(Spread {
            low: at(0.05),
            middle: at(0.5),
            high: at(0.95),
        })
    }

    /// Whether a value lies so far from the others that it cannot be one of them: three times their spread, and more
    /// than half of the middle one.
    fn is_far(&self, value: f64) -> bool {
        let slack = 3.0 * (self.high - self.low) + 0.5 * self.middle.abs();
        value < self.low - slack || value > self.high + slack
    }
}

/// Whether a value (in the file's own unit) stands for "not known" in a column of this meaning.
pub(super) fn is_filler(meaning: Meaning, value: f64, others: Option<Spread>) -> bool {
    let far = others.is_none_or(|others| others.is_far(value));
    let always = ALWAYS.contains(&value);
    match meaning {
        Meaning::Diameter => always || OFTEN.contains(&value),
        // 0, 99 and 999 may be ground; below zero too.
        Meaning::Elevation => (always && far) || (OFTEN.contains(&value) && others.is_some() && far),
        Meaning::Head => always || [0.0, -1.0, -9.0].contains(&value) || (value == 999.0 && far),
        // 0 is a draw of nothing; a negative one is a fault to be said, not a filler.
        Meaning::Demand => value > 0.0 && (always || value == 999.0) && far,
        Meaning::NeededFlow => {
            (always && (far || value < 0.0)) || [0.0, -1.0, -9.0].contains(&value) || (value == 999.0 && far)
        }
        Meaning::CFactor => always || [0.0, -1.0, -9.0, 999.0].contains(&value),
        Meaning::Roughness => always || [-1.0, -9.0, 999.0].contains(&value) || (value == 99.0 && far),
        Meaning::LossCoefficient => always || [-1.0, -9.0].contains(&value) || (value == 999.0 && far),
        Meaning::Length => always && (far || value < 0.0) || value == -1.0,
        Meaning::Lift => always || [-1.0, -9.0, 99.0, 999.0].contains(&value),
    }
}

/// Whether a value in SI can be what a column of this meaning holds. The bounds are far outside anything built; they keep a
/// mistyped exponent out of the hydraulics. Diameters, C-factors and roughness have bounds and findings of their own.
pub(super) fn is_possible(meaning: Meaning, si: f64) -> bool {
    let possible = match meaning {
        Meaning::Elevation | Meaning::Head => -1_000.0..=20_000.0,
        Meaning::Demand | Meaning::NeededFlow => -1_000.0..=1_000.0,
        Meaning::LossCoefficient => -1e6..=1e6,
        Meaning::Length => 0.0..=1e6,
        Meaning::Lift => -1_000.0..=1_000.0,
        Meaning::Diameter | Meaning::CFactor | Meaning::Roughness => f64::MIN..=f64::MAX,
    };
    possible.contains(&si)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_filler_is_known_by_what_the_column_means() {
        let ground = Spread::of([80.0, 95.0, 110.0, 140.0].into_iter());
        for value in [0.0, -1.0, 99.0, 999.0, 9999.0] {
            assert!(is_filler(Meaning::Diameter, value, None), "{value}");
        }
        assert!(!is_filler(Meaning::Elevation, 99.0, ground));
        assert!(!is_filler(Meaning::Elevation, 0.0, ground));
        assert!(is_filler(Meaning::Elevation, -9999.0, ground));
        assert!(is_filler(Meaning::Elevation, 9999.0, ground));
        let high_ground = Spread::of([1500.0, 1510.0, 1525.0].into_iter());
        assert!(is_filler(Meaning::Elevation, 0.0, high_ground));
        assert!(!is_filler(Meaning::Demand, 0.0, None));
        assert!(!is_filler(Meaning::Demand, -1.0, None));
        assert!(!is_filler(Meaning::LossCoefficient, 99.0, None));
        assert!(!is_filler(Meaning::Head, 99.0, None));
        assert!(is_filler(Meaning::Head, 0.0, None));
    }
}
