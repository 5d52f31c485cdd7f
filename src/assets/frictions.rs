//! Friction of mains: C-factor or roughness height, from the map's own column or from material and age.

use super::columns::{Slot, Wanted};
use super::desk::Desk;
use super::materials::Material;
use super::selection::by_word;
use super::sentinels::Meaning;
use super::settings::{AssetSettings, FrictionLaw, MainsColumns};
use super::{Basis, Friction, Role, Valued};
use crate::finding::{Code, Error, FeatureRef, Finding, Sentence, Severity};
use crate::units::{M_PER_MM, Quantity};

/// C-factors met in practice: from heavy tuberculation to new plastic (the published tables end at 60 and 150; the margins are
/// common practice, no source).
const C_FACTORS: std::ops::RangeInclusive<f64> = 20.0..=165.0;
/// Largest roughness height met in practice, m: heavy tuberculation (handbooks, from memory), doubled.
const ROUGHEST_M: f64 = 30.0 * M_PER_MM;

impl Desk<'_> {
    /// Friction of every main: from the map's own column, else from material and age, else the study's default.
    pub fn frictions(
        &mut self,
        wanted: &MainsColumns,
        settings: &AssetSettings,
        material: &[Option<String>],
        year: &[Option<i32>],
        taking_part: &[bool],
    ) -> Result<Vec<Valued<Friction>>, Error> {
        let own = self.own_frictions(wanted, settings.law, taking_part)?;
        let mut unknown = Vec::new();
        let frictions = (0..taking_part.len()).map(|row| {
            if let Some(friction) = own.get(row).copied().flatten() {
                return Valued {
                    value: friction,
                    basis: Basis::Map,
                };
            }
            let text = material.get(row).and_then(Option::as_deref);
            let known = text.and_then(Material::parse);
            if let (Some(text), None, true) = (text, known, taking_part[row]) {
                unknown.push((
                    text.to_string(),
                    FeatureRef {
                        layer: wanted.common.layer,
                        row: row as u32,
                    },
                ));
            }
            let age_years = year[row].map(|year| f64::from(settings.age_in_year - year));
            friction_of(known, age_years, settings)
        });
        let frictions = frictions.collect();
        for (word, features) in by_word(unknown) {
            let said = format!(
                "the material `{word}` of {} is not in the table of materials",
                Role::Main.counted(features.len())
            );
            self.report_together(Code::MaterialUnknown, Severity::Note, &features, said.into());
        }
        Ok(frictions)
    }

    /// C-factor or roughness from the map's own column, where it is possible.
    fn own_frictions(
        &mut self,
        wanted: &MainsColumns,
        law: FrictionLaw,
        taking_part: &[bool],
    ) -> Result<Vec<Option<Friction>>, Error> {
        let layer = wanted.common.layer;
        let Some((slots, name)) = self.friction_column(wanted, law, taking_part)? else {
            return Ok(Vec::new());
        };
        let (mut impossible, mut fillers) = (Vec::new(), Vec::new());
        let own = slots.iter().enumerate().map(|(row, slot)| {
            let feature = FeatureRef { layer, row: row as u32 };
            let own = slot.value().and_then(|value| possible(law, value));
            match slot {
                Slot::Value(value) if own.is_none() && taking_part[row] => {
                    let message = Sentence::new()
                        .feature(feature)
                        .text(format!(" has {value} in `{name}`"));
                    impossible.push(Finding::new(Code::FrictionValueImpossible, message).on(feature));
                }
                // A filler in the shape of a number looks like a value to whoever reads the map.
                Slot::Empty(text) if text.parse::<f64>().is_ok() && taking_part[row] => {
                    fillers.push((text.clone(), feature));
                }
                _ => {}
            }
            own
        });
        let own = own.collect();
        self.report(impossible, |count| {
            format!("{count} mains have an impossible value in `{name}`").into()
        });
        self.say_friction_fillers(name, fillers);
        Ok(own)
    }

    /// The column that holds what the law asks for, if the study names one.
    fn friction_column<'w>(
        &mut self,
        wanted: &'w MainsColumns,
        law: FrictionLaw,
        taking_part: &[bool],
    ) -> Result<Option<(Vec<Slot>, &'w str)>, Error> {
        let layer = wanted.common.layer;
        Ok(match (law, &wanted.c_factor, &wanted.roughness) {
            (FrictionLaw::HazenWilliams, Some(name), _) => {
                let slots = self.read_plain(layer, "c_factor", name, Meaning::CFactor, taking_part)?;
                Some((slots, name))
            }
            (FrictionLaw::DarcyWeisbach, _, Some(column)) => {
                let asked = Wanted {
                    layer,
                    key: "roughness",
                    column,
                    quantity: Quantity::Roughness,
                    meaning: Meaning::Roughness,
                    taking_part,
                };
                Some((self.read_numbers(&asked, |_| None)?.slots, &column.column))
            }
            _ => None,
        })
    }

    fn say_friction_fillers(&mut self, name: &str, fillers: Vec<(String, FeatureRef)>) {
        for (filler, features) in by_word(fillers) {
            let said = format!(
                "`{name}` of {} is {filler}, a filler",
                Role::Main.counted(features.len())
            );
            self.report_together(Code::FrictionValueImpossible, Severity::Warning, &features, said.into());
        }
    }
}

/// A value of the column as friction, where it is met in practice.
fn possible(law: FrictionLaw, value: f64) -> Option<Friction> {
    match law {
        FrictionLaw::HazenWilliams => C_FACTORS.contains(&value).then_some(Friction::CFactor(value)),
        FrictionLaw::DarcyWeisbach => (0.0..=ROUGHEST_M)
            .contains(&value)
            .then_some(Friction::RoughnessM(value)),
    }
}

fn friction_of(material: Option<Material>, age_years: Option<f64>, settings: &AssetSettings) -> Valued<Friction> {
    match (settings.law, material) {
        (FrictionLaw::HazenWilliams, Some(material)) => Valued {
            value: Friction::CFactor(material.c_factor(age_years)),
            basis: Basis::Assumed,
        },
        (FrictionLaw::DarcyWeisbach, Some(material)) => Valued {
            value: Friction::RoughnessM(material.roughness_m(age_years)),
            basis: Basis::Assumed,
        },
        (FrictionLaw::HazenWilliams, None) => {
            let Valued { value, basis } = settings.default_c_factor;
            Valued {
                value: Friction::CFactor(value),
                basis,
            }
        }
        (FrictionLaw::DarcyWeisbach, None) => {
            let Valued { value, basis } = settings.default_roughness_m;
            Valued {
                value: Friction::RoughnessM(value),
                basis,
            }
        }
    }
}
