//! Names: what a user calls a feature. The only way from a reference back to the user's id.

use std::collections::HashMap;

use crate::finding::FeatureRef;

/// What a layer's features are.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum Role {
    /// Mains.
    Main,
    /// Node points.
    Node,
    /// Hydrants.
    Hydrant,
    /// Customers.
    Customer,
    /// Valves.
    Valve,
}

impl Role {
    /// Some of them, counted: `1 main`, `2 mains`.
    pub(super) fn counted(self, count: usize) -> String {
        format!("{count} {}{}", self.word(), if count == 1 { "" } else { "s" })
    }

    /// One of them, as it is called in a sentence.
    pub fn word(self) -> &'static str {
        match self {
            Role::Main => "main",
            Role::Node => "node",
            Role::Hydrant => "hydrant",
            Role::Customer => "customer",
            Role::Valve => "valve",
        }
    }
}

/// The user's ids of one layer.
#[derive(Clone, Debug, PartialEq)]
struct LayerNames {
    role: Role,
    /// The id of each row, where it has one; empty when the study names no id column.
    ids: Vec<Option<Box<str>>>,
}

/// The user's ids of every feature that was read.
#[derive(Clone, Debug, PartialEq, Default)]
pub struct Names {
    layers: HashMap<u16, LayerNames>,
}

impl Names {
    /// Adds a layer's ids.
    pub(super) fn add(&mut self, layer: u16, role: Role, ids: Vec<Option<Box<str>>>) {
        self.layers.insert(layer, LayerNames { role, ids });
    }

    /// What a feature is and the user's id: `main 1047`; without an id its row, counted from 1: `main at row 12`.
    pub fn of(&self, feature: FeatureRef) -> String {
        let word = self.role(feature.layer).map_or("feature", Role::word);
        match self.id(feature) {
            Some(id) => format!("{word} {id}"),
            None => format!("{word} at row {}", u64::from(feature.row) + 1),
        }
    }

    /// The user's id alone, if the feature has one.
    pub fn id(&self, feature: FeatureRef) -> Option<&str> {
        self.layers
            .get(&feature.layer)?
            .ids
            .get(feature.row as usize)?
            .as_deref()
    }

    /// Whether the study names an id column for a layer.
    pub(super) fn has_ids(&self, layer: u16) -> bool {
        self.layers.get(&layer).is_some_and(|names| !names.ids.is_empty())
    }

    /// What the features of a layer are.
    pub fn role(&self, layer: u16) -> Option<Role> {
        self.layers.get(&layer).map(|names| names.role)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_feature_without_an_id_is_named_by_its_row() {
        let mut names = Names::default();
        names.add(3, Role::Hydrant, vec![Some("H7".into()), None]);
        let name = |row| names.of(FeatureRef { layer: 3, row });
        assert_eq!(name(0), "hydrant H7");
        assert_eq!(name(1), "hydrant at row 2");
        assert_eq!(names.of(FeatureRef { layer: 9, row: 0 }), "feature at row 1");
    }
}
