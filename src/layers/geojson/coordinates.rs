//! Geometries: coordinates of any nesting, read before or after the `type` that says what they mean.

use std::borrow::Cow;
use std::fmt;

use serde::de::{DeserializeSeed, Deserializer, Error as _, IgnoredAny, MapAccess, SeqAccess, Visitor};

use crate::layers::packed::{Kind, Packed};

/// A member's name or a text, borrowed where it has no escapes.
pub(super) struct Text;

impl<'de> DeserializeSeed<'de> for Text {
    type Value = Cow<'de, str>;

    fn deserialize<D: Deserializer<'de>>(self, input: D) -> Result<Self::Value, D::Error> {
        input.deserialize_str(self)
    }
}

impl<'de> Visitor<'de> for Text {
    type Value = Cow<'de, str>;

    fn expecting(&self, out: &mut fmt::Formatter) -> fmt::Result {
        out.write_str("a text")
    }

    fn visit_borrowed_str<E>(self, text: &'de str) -> Result<Self::Value, E> {
        Ok(Cow::Borrowed(text))
    }

    fn visit_str<E>(self, text: &str) -> Result<Self::Value, E> {
        Ok(Cow::Owned(text.to_string()))
    }
}

/// Reads one geometry into the open row of the store, and says what it is.
pub(super) struct Geometry<'a> {
    pub packed: &'a mut Packed,
    /// Number of the feature, from 1, for messages.
    pub feature: usize,
}

impl<'de> DeserializeSeed<'de> for Geometry<'_> {
    type Value = Kind;

    fn deserialize<D: Deserializer<'de>>(self, input: D) -> Result<Kind, D::Error> {
        input.deserialize_any(self)
    }
}

impl<'de> Visitor<'de> for Geometry<'_> {
    type Value = Kind;

    fn expecting(&self, out: &mut fmt::Formatter) -> fmt::Result {
        write!(out, "a geometry or null in feature {}", self.feature)
    }

    fn visit_unit<E>(self) -> Result<Kind, E> {
        Ok(Kind::Missing)
    }

    fn visit_map<A: MapAccess<'de>>(self, mut members: A) -> Result<Kind, A::Error> {
        let mut kind: Option<Cow<str>> = None;
        let mut found = Nesting::default();
        while let Some(name) = members.next_key_seed(Text)? {
            match &*name {
                "type" => kind = Some(members.next_value_seed(Text)?),
                "coordinates" => {
                    self.packed.clear_open();
                    found = Nesting::default();
                    members.next_value_seed(Array {
                        packed: &mut *self.packed,
                        found: &mut found,
                        depth: 0,
                        feature: self.feature,
                    })?;
                }
                _ => {
                    members.next_value::<IgnoredAny>()?;
                }
            }
        }
        let Some(kind) = kind else {
            return Err(A::Error::custom(format!(
                "feature {}: its geometry has no type",
                self.feature
            )));
        };
        found
            .settle(&kind, self.packed)
            .map_err(|what| A::Error::custom(format!("feature {}: {what}", self.feature)))
    }
}

/// How deep the positions were found.
#[derive(Default)]
struct Nesting {
    positions_at: Option<usize>,
}

impl Nesting {
    /// Holds the nesting against the type.
    fn settle(&self, kind: &str, packed: &mut Packed) -> Result<Kind, String> {
        let (wanted, kind) = match kind {
            "Point" => (0, Kind::Points),
            "MultiPoint" => (1, Kind::Points),
            "LineString" => (1, Kind::Lines),
            "MultiLineString" => (2, Kind::Lines),
            "Polygon" => (2, Kind::Other("Polygon")),
            "MultiPolygon" => (3, Kind::Other("MultiPolygon")),
            "GeometryCollection" => return Ok(Kind::Other("GeometryCollection")),
            other => return Err(format!("`{other}` is no geometry type of GeoJSON")),
        };
        match self.positions_at {
            Some(depth) if depth != wanted => {
                Err(format!("its coordinates are nested {depth} deep instead of {wanted}"))
            }
            None => {
                packed.clear_open();
                Ok(Kind::Missing)
            }
            Some(_) => Ok(kind),
        }
    }
}

/// What an element of a coordinates array was.
enum Element {
    Number(f64),
    Position,
    List,
    Empty,
    /// Null, text or anything else where a number should stand.
    NotANumber,
}

/// One array of coordinates, or an element of one.
struct Array<'a> {
    packed: &'a mut Packed,
    found: &'a mut Nesting,
    depth: usize,
    feature: usize,
}

impl<'de> DeserializeSeed<'de> for Array<'_> {
    type Value = Element;

    fn deserialize<D: Deserializer<'de>>(self, input: D) -> Result<Element, D::Error> {
        input.deserialize_any(self)
    }
}

impl<'de> Visitor<'de> for Array<'_> {
    type Value = Element;

    fn expecting(&self, out: &mut fmt::Formatter) -> fmt::Result {
        write!(out, "coordinates in feature {}", self.feature)
    }

    fn visit_f64<E>(self, number: f64) -> Result<Element, E> {
        Ok(Element::Number(number))
    }

    fn visit_i64<E>(self, number: i64) -> Result<Element, E> {
        Ok(Element::Number(number as f64))
    }

    fn visit_u64<E>(self, number: u64) -> Result<Element, E> {
        Ok(Element::Number(number as f64))
    }

    fn visit_unit<E>(self) -> Result<Element, E> {
        Ok(Element::NotANumber)
    }

    fn visit_bool<E>(self, _: bool) -> Result<Element, E> {
        Ok(Element::NotANumber)
    }

    fn visit_str<E>(self, _: &str) -> Result<Element, E> {
        Ok(Element::NotANumber)
    }

    fn visit_map<A: MapAccess<'de>>(self, mut members: A) -> Result<Element, A::Error> {
        while members.next_entry::<IgnoredAny, IgnoredAny>()?.is_some() {}
        Ok(Element::NotANumber)
    }

    fn visit_seq<A: SeqAccess<'de>>(self, mut elements: A) -> Result<Element, A::Error> {
        let mut position = [f64::NAN; 3];
        let (mut numbers, mut positions, mut lists, mut empties) = (0, 0, 0, 0);
        loop {
            let first_vertex = self.packed.open_vertices();
            let element = elements.next_element_seed(Array {
                packed: &mut *self.packed,
                found: &mut *self.found,
                depth: self.depth + 1,
                feature: self.feature,
            })?;
            match element {
                None => break,
                Some(Element::Number(value)) => {
                    if numbers < 3 {
                        position[numbers] = value;
                    }
                    numbers += 1;
                }
                Some(Element::NotANumber) => numbers += 1,
                Some(Element::Position) => {
                    if positions == 0 {
                        self.packed.start_part_at(first_vertex);
                    }
                    positions += 1;
                }
                Some(Element::List) => lists += 1,
                Some(Element::Empty) => empties += 1,
            }
        }
        let mixed = (numbers > 0) as u8 + (positions > 0) as u8 + (lists > 0) as u8 > 1 || numbers > 0 && empties > 0;
        if numbers == 0 && positions == 0 && lists == 0 {
            return Ok(Element::Empty);
        }
        if mixed || numbers > 0 && *self.found.positions_at.get_or_insert(self.depth) != self.depth {
            return Err(A::Error::custom(format!(
                "feature {}: numbers and arrays are mixed in its coordinates",
                self.feature
            )));
        }
        if numbers > 0 {
            self.packed.push([position[0], position[1]], position[2]);
            return Ok(Element::Position);
        }
        // An empty array among positions is a position without numbers.
        if positions > 0 && empties > 0 {
            self.packed.push([f64::NAN; 2], f64::NAN);
        }
        Ok(Element::List)
    }
}
