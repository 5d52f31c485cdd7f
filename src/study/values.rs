//! What the keys of a table hold: texts, words of a choice, numbers in SI, columns, marks and places.

use toml::Value;

use super::keys::Takes;
use super::section::{Section, quoted};
use crate::assets::{LeaveOut, NumberOrColumn, SourceAt, UnitColumn};
use crate::finding::Error;
use crate::units::{Quantity, Unit};

impl Section<'_> {
    /// A text.
    pub fn text(&self, name: &str) -> Result<Option<String>, Error> {
        match self.take(name) {
            None => Ok(None),
            Some((_, _, Value::String(text))) if !text.trim().is_empty() => Ok(Some(text.clone())),
            Some((given, _, Value::String(_))) => Err(self.error(
                given,
                format!("{} is empty", self.called(given)),
                "Fill it in, or leave the key out.",
            )),
            Some((given, _, other)) => Err(self.wrong_type(given, other, "a text in double quotes")),
        }
    }

    /// A text that must be given.
    pub fn needed_text(&self, name: &str, example: &str) -> Result<String, Error> {
        self.text(name)?.ok_or_else(|| self.missing(name, example))
    }

    /// Says that a key must be given.
    pub fn missing(&self, name: &str, example: &str) -> Error {
        let what = format!("{} has no `{name}`", self.shown_title());
        self.error("", what, format!("Add it, for example `{example}`."))
    }

    /// One of the words that the key takes.
    pub fn choice(&self, name: &str) -> Result<Option<&'static str>, Error> {
        let Takes::Choice(words) = self.key(name).takes else {
            unreachable!("{name} is a choice")
        };
        let Some((given, _, value)) = self.take(name) else {
            return Ok(None);
        };
        let Value::String(text) = value else {
            return Err(self.wrong_type(given, value, "a text in double quotes"));
        };
        if let Some(word) = words.iter().find(|word| *word == text) {
            return Ok(Some(word));
        }
        let words: Vec<String> = words.iter().map(|word| (*word).to_string()).collect();
        let what = format!("{} cannot be `{text}`", self.called(given));
        Err(self.error(given, what, format!("It takes one of: {}.", quoted(&words))))
    }

    /// A number without a unit, in a range.
    pub fn plain(&self, name: &str, range: std::ops::RangeInclusive<f64>) -> Result<Option<f64>, Error> {
        let Some((given, _, value)) = self.take(name) else {
            return Ok(None);
        };
        let number = self.number_of(given, value)?;
        self.in_range(given, number, "", &range, |value| value)?;
        Ok(Some(number))
    }

    /// A number in SI, from a key that ends in a unit, in a range of SI.
    pub fn number(&self, name: &str, range: std::ops::RangeInclusive<f64>) -> Result<Option<f64>, Error> {
        let Some((given, unit, value)) = self.take(name) else {
            return Ok(None);
        };
        let unit = unit.expect("checked: the key ends in a unit");
        let si = unit.to_si(self.number_of(given, value)?);
        self.in_range(given, si, unit.name, &range, |value| unit.from_si(value))?;
        Ok(Some(si))
    }

    fn in_range(
        &self,
        given: &str,
        si: f64,
        unit: &str,
        range: &std::ops::RangeInclusive<f64>,
        shown: impl Fn(f64) -> f64,
    ) -> Result<(), Error> {
        if range.contains(&si) {
            return Ok(());
        }
        let show = |value: f64| {
            format!("{} {unit}", (shown(value) * 1e4).round() / 1e4)
                .trim_end()
                .to_string()
        };
        let todo = match (range.start().is_finite(), range.end().is_finite()) {
            (true, true) => format!(
                "It must lie between {} and {}.",
                show(*range.start()),
                show(*range.end())
            ),
            (true, false) => format!("It must not be below {}.", show(*range.start())),
            _ => "It must be a finite number.".to_string(),
        };
        Err(self.error(given, format!("{} cannot be {}", self.called(given), show(si)), todo))
    }

    fn number_of(&self, given: &str, value: &Value) -> Result<f64, Error> {
        match value {
            Value::Integer(number) => Ok(*number as f64),
            Value::Float(number) if number.is_finite() => Ok(*number),
            other => Err(self.wrong_type(given, other, "a number without quotes")),
        }
    }

    /// A column of numbers.
    pub fn unit_column(&self, name: &str) -> Result<Option<UnitColumn>, Error> {
        let Takes::UnitColumn(quantity) = self.key(name).takes else {
            unreachable!("{name} is a column with a unit")
        };
        let Some((given, _, value)) = self.take(name) else {
            return Ok(None);
        };
        self.unit_column_of(given, value, quantity, None).map(Some)
    }

    /// A number for every row, in SI, or a column.
    pub fn number_or_column(&self, name: &str) -> Result<Option<NumberOrColumn>, Error> {
        let Takes::NumberOrColumn(quantity) = self.key(name).takes else {
            unreachable!("{name} is a number or a column")
        };
        let Some((given, unit, value)) = self.take(name) else {
            return Ok(None);
        };
        match (value, unit) {
            (Value::Integer(_) | Value::Float(_), Some(unit)) => {
                Ok(Some(NumberOrColumn::Number(unit.to_si(self.number_of(given, value)?))))
            }
            (Value::Integer(_) | Value::Float(_), None) => {
                let what = format!("{} does not end in a unit", self.called(given));
                Err(self.error(
                    given,
                    what,
                    format!("Write one of: {}.", quoted(&self.key(name).spellings())),
                ))
            }
            _ => self
                .unit_column_of(given, value, quantity, unit)
                .map(|column| Some(NumberOrColumn::Column(column))),
        }
    }

    fn unit_column_of(
        &self,
        given: &str,
        value: &Value,
        quantity: Quantity,
        unit: Option<Unit>,
    ) -> Result<UnitColumn, Error> {
        let table = match value {
            Value::String(column) => {
                return Ok(UnitColumn {
                    column: column.clone(),
                    unit,
                });
            }
            Value::Table(table) => table,
            other => {
                return Err(self.wrong_type(
                    given,
                    other,
                    "a column's name, or `{ column = \"...\", unit = \"...\" }`",
                ));
            }
        };
        if let Some(other) = table.keys().find(|key| !["column", "unit"].contains(&key.as_str())) {
            let what = format!("there is no key `{other}` in {}", self.called(given));
            return Err(self.error(given, what, "Keys here: `column` and `unit`."));
        }
        let Some(Value::String(column)) = table.get("column") else {
            let what = format!("{} names no column", self.called(given));
            return Err(self.error(
                given,
                what,
                format!("Write `{given} = {{ column = \"...\", unit = \"...\" }}`."),
            ));
        };
        let unit = match table.get("unit") {
            None => unit,
            Some(Value::String(text)) => Some(self.unit(given, text, quantity)?),
            Some(other) => return Err(self.wrong_type(given, other, "a unit in double quotes")),
        };
        Ok(UnitColumn {
            column: column.clone(),
            unit,
        })
    }

    fn unit(&self, given: &str, text: &str, quantity: Quantity) -> Result<Unit, Error> {
        Unit::parse(text, quantity).ok_or_else(|| {
            let names: Vec<String> = Unit::all(quantity).map(|unit| unit.name.to_string()).collect();
            let what = format!("{} cannot be in `{text}`", self.called(given));
            self.error(given, what, format!("Units that fit: {}.", quoted(&names)))
        })
    }

    /// Names and numbers without a unit, none below zero.
    pub fn plain_by_name(&self, name: &str) -> Result<Vec<(String, f64)>, Error> {
        let Some((given, _, value)) = self.take(name) else {
            return Ok(Vec::new());
        };
        self.by_name(given, value, 0.0)
    }

    /// Names and numbers in SI.
    pub fn number_by_name(&self, name: &str) -> Result<Vec<(String, f64)>, Error> {
        let Some((given, unit, value)) = self.take(name) else {
            return Ok(Vec::new());
        };
        let unit = unit.expect("checked: the key ends in a unit");
        let named = self.by_name(given, value, f64::NEG_INFINITY)?;
        Ok(named
            .into_iter()
            .map(|(name, number)| (name, unit.to_si(number)))
            .collect())
    }

    fn by_name(&self, given: &str, value: &Value, least: f64) -> Result<Vec<(String, f64)>, Error> {
        let Value::Table(table) = value else {
            return Err(self.wrong_type(given, value, "a table such as `{ name = 1.0 }`"));
        };
        let mut named = Vec::new();
        for (name, value) in table {
            let number = self.number_of(given, value)?;
            if number < least {
                let what = format!("`{name}` in {} cannot be {number}", self.called(given));
                return Err(self.error(given, what, format!("It must not be below {least}.")));
            }
            named.push((name.clone(), number));
        }
        Ok(named)
    }

    /// Columns and the values that mark rows.
    pub fn marks(&self, name: &str) -> Result<Vec<LeaveOut>, Error> {
        let Some((given, _, value)) = self.take(name) else {
            return Ok(Vec::new());
        };
        let Value::Table(table) = value else {
            return Err(self.wrong_type(given, value, "a table such as `{ STATUS = [\"ABANDONED\"] }`"));
        };
        let text_of = |value: &Value| match value {
            Value::String(text) => Some(text.clone()),
            Value::Integer(_) | Value::Float(_) | Value::Boolean(_) => Some(value.to_string()),
            _ => None,
        };
        let mut marks = Vec::new();
        for (column, values) in table {
            let values = match values {
                Value::Array(items) => items.iter().map(text_of).collect::<Option<Vec<String>>>(),
                one => text_of(one).map(|one| vec![one]),
            };
            let Some(values) = values else {
                let what = format!("`{column}` in {} does not list values", self.called(given));
                return Err(self.error(given, what, "Write it as `{ STATUS = [\"ABANDONED\", \"REMOVED\"] }`."));
            };
            marks.push(LeaveOut {
                column: column.clone(),
                values,
            });
        }
        Ok(marks)
    }

    /// An id or a point.
    pub fn place(&self, name: &str) -> Result<Option<SourceAt>, Error> {
        let Some((given, _, value)) = self.take(name) else {
            return Ok(None);
        };
        match value {
            Value::String(id) => Ok(Some(SourceAt::Id(id.trim().to_string()))),
            Value::Integer(id) => Ok(Some(SourceAt::Id(id.to_string()))),
            Value::Array(axes) if axes.len() == 2 => Ok(Some(SourceAt::Point([
                self.number_of(given, &axes[0])?,
                self.number_of(given, &axes[1])?,
            ]))),
            other => Err(self.wrong_type(given, other, "an id in double quotes, or a point `[x, y]`")),
        }
    }
}
