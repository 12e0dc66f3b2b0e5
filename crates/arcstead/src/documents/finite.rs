//! Refusing numbers that JSON cannot say, by name, before a document is written.

use std::fmt::{self, Write as _};

use serde::ser::{self, Impossible, Serialize, Serializer};
use thiserror::Error;

/// A number of a document is NaN or infinite.
#[derive(Debug, Clone, PartialEq, Error)]
#[error("`{field}` is {found}; every number in a document must be finite")]
pub struct NotFinite {
    /// The way to it, such as `sources[0].position_m[2]`.
    pub field: String,
    /// What it is.
    pub found: f64,
}

/// Visits every number of `value` and refuses the first that is not finite.
pub(super) fn check<T: Serialize + ?Sized>(value: &T) -> Result<(), NotFinite> {
    let mut way = Way::default();
    match value.serialize(Visitor { way: &mut way }) {
        Err(Stop(Some(refused))) => Err(refused),
        // A value that cannot be serialised at all is told by the writer that meets it next.
        Ok(()) | Err(Stop(None)) => Ok(()),
    }
}

/// The way from the document to the value being visited.
#[derive(Default)]
struct Way {
    text: String,
}

impl Way {
    /// Visits a value that lies one step further.
    fn step<T: Serialize + ?Sized>(&mut self, step: fmt::Arguments<'_>, value: &T) -> Result<(), Stop> {
        let length = self.text.len();
        self.text.write_fmt(step).map_err(|_| Stop(None))?;
        value.serialize(Visitor { way: self })?;
        self.text.truncate(length);
        Ok(())
    }

    fn field<T: Serialize + ?Sized>(&mut self, name: &str, value: &T) -> Result<(), Stop> {
        let dot = if self.text.is_empty() { "" } else { "." };
        self.step(format_args!("{dot}{name}"), value)
    }
}

/// Ends a visit: a number was refused, or the value cannot be serialised.
#[derive(Debug)]
struct Stop(Option<NotFinite>);

impl fmt::Display for Stop {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str("the visit ended early")
    }
}

impl std::error::Error for Stop {}

impl ser::Error for Stop {
    fn custom<T: fmt::Display>(_: T) -> Self {
        Self(None)
    }
}

struct Visitor<'w> {
    way: &'w mut Way,
}

impl<'w> Visitor<'w> {
    fn list(self) -> List<'w> {
        List { way: self.way, index: 0, key: String::new() }
    }
}

/// The inside of a list or a table.
struct List<'w> {
    way: &'w mut Way,
    index: usize,
    key: String,
}

impl List<'_> {
    fn element<T: Serialize + ?Sized>(&mut self, value: &T) -> Result<(), Stop> {
        let index = self.index;
        self.index += 1;
        self.way.step(format_args!("[{index}]"), value)
    }
}

macro_rules! nothing_to_check {
    ($($method:ident: $type:ty),* $(,)?) => {
        $(fn $method(self, _: $type) -> Result<(), Stop> { Ok(()) })*
    };
}

impl<'w> Serializer for Visitor<'w> {
    type Ok = ();
    type Error = Stop;
    type SerializeSeq = List<'w>;
    type SerializeTuple = List<'w>;
    type SerializeTupleStruct = List<'w>;
    type SerializeTupleVariant = Impossible<(), Stop>;
    type SerializeMap = List<'w>;
    type SerializeStruct = List<'w>;
    type SerializeStructVariant = Impossible<(), Stop>;

    nothing_to_check! {
        serialize_bool: bool, serialize_i8: i8, serialize_i16: i16, serialize_i32: i32, serialize_i64: i64,
        serialize_u8: u8, serialize_u16: u16, serialize_u32: u32, serialize_u64: u64, serialize_char: char,
        serialize_str: &str, serialize_bytes: &[u8],
    }

    fn serialize_f32(self, value: f32) -> Result<(), Stop> {
        self.serialize_f64(f64::from(value))
    }

    fn serialize_f64(self, value: f64) -> Result<(), Stop> {
        if value.is_finite() {
            Ok(())
        } else {
            Err(Stop(Some(NotFinite { field: self.way.text.clone(), found: value })))
        }
    }

    fn serialize_none(self) -> Result<(), Stop> {
        Ok(())
    }

    fn serialize_some<T: Serialize + ?Sized>(self, value: &T) -> Result<(), Stop> {
        value.serialize(self)
    }

    fn serialize_unit(self) -> Result<(), Stop> {
        Ok(())
    }

    fn serialize_unit_struct(self, _: &'static str) -> Result<(), Stop> {
        Ok(())
    }

    fn serialize_unit_variant(self, _: &'static str, _: u32, _: &'static str) -> Result<(), Stop> {
        Ok(())
    }

    fn serialize_newtype_struct<T: Serialize + ?Sized>(self, _: &'static str, value: &T) -> Result<(), Stop> {
        value.serialize(self)
    }

    fn serialize_newtype_variant<T: Serialize + ?Sized>(
        self,
        _: &'static str,
        _: u32,
        variant: &'static str,
        value: &T,
    ) -> Result<(), Stop> {
        self.way.field(variant, value)
    }

    fn serialize_seq(self, _: Option<usize>) -> Result<List<'w>, Stop> {
        Ok(self.list())
    }

    fn serialize_tuple(self, _: usize) -> Result<List<'w>, Stop> {
        Ok(self.list())
    }

    fn serialize_tuple_struct(self, _: &'static str, _: usize) -> Result<List<'w>, Stop> {
        Ok(self.list())
    }

    fn serialize_tuple_variant(
        self,
        _: &'static str,
        _: u32,
        _: &'static str,
        _: usize,
    ) -> Result<Self::SerializeTupleVariant, Stop> {
        Err(Stop(None))
    }

    fn serialize_map(self, _: Option<usize>) -> Result<List<'w>, Stop> {
        Ok(self.list())
    }

    fn serialize_struct(self, _: &'static str, _: usize) -> Result<List<'w>, Stop> {
        Ok(self.list())
    }

    fn serialize_struct_variant(
        self,
        _: &'static str,
        _: u32,
        _: &'static str,
        _: usize,
    ) -> Result<Self::SerializeStructVariant, Stop> {
        Err(Stop(None))
    }
}

impl ser::SerializeSeq for List<'_> {
    type Ok = ();
    type Error = Stop;

    fn serialize_element<T: Serialize + ?Sized>(&mut self, value: &T) -> Result<(), Stop> {
        self.element(value)
    }

    fn end(self) -> Result<(), Stop> {
        Ok(())
    }
}

impl ser::SerializeTuple for List<'_> {
    type Ok = ();
    type Error = Stop;

    fn serialize_element<T: Serialize + ?Sized>(&mut self, value: &T) -> Result<(), Stop> {
        self.element(value)
    }

    fn end(self) -> Result<(), Stop> {
        Ok(())
    }
}

impl ser::SerializeTupleStruct for List<'_> {
    type Ok = ();
    type Error = Stop;

    fn serialize_field<T: Serialize + ?Sized>(&mut self, value: &T) -> Result<(), Stop> {
        self.element(value)
    }

    fn end(self) -> Result<(), Stop> {
        Ok(())
    }
}

impl ser::SerializeMap for List<'_> {
    type Ok = ();
    type Error = Stop;

    fn serialize_key<T: Serialize + ?Sized>(&mut self, key: &T) -> Result<(), Stop> {
        self.key = match serde_json::to_value(key) {
            Ok(serde_json::Value::String(name)) => name,
            Ok(other) => other.to_string(),
            Err(_) => return Err(Stop(None)),
        };
        Ok(())
    }

    fn serialize_value<T: Serialize + ?Sized>(&mut self, value: &T) -> Result<(), Stop> {
        let key = std::mem::take(&mut self.key);
        self.way.field(&key, value)
    }

    fn end(self) -> Result<(), Stop> {
        Ok(())
    }
}

impl ser::SerializeStruct for List<'_> {
    type Ok = ();
    type Error = Stop;

    fn serialize_field<T: Serialize + ?Sized>(&mut self, name: &'static str, value: &T) -> Result<(), Stop> {
        self.way.field(name, value)
    }

    fn end(self) -> Result<(), Stop> {
        Ok(())
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use std::collections::BTreeMap;

    #[test]
    fn the_way_to_the_number_is_told() {
        let place = BTreeMap::from([("at_m", vec![Some((1.0, 2.0)), None, Some((3.0, f64::INFINITY))])]);
        let refused = check(&BTreeMap::from([("a", BTreeMap::new()), ("b", place)])).unwrap_err();
        assert_eq!(refused, NotFinite { field: "b.at_m[2][1]".into(), found: f64::INFINITY });
        assert_eq!(refused.to_string(), "`b.at_m[2][1]` is inf; every number in a document must be finite");
    }

    #[test]
    fn finite_numbers_and_nothing_pass() {
        assert_eq!(check(&(1.0, None::<f64>, "NaN", [f64::MAX, f64::MIN_POSITIVE], -0.0_f32)), Ok(()));
        assert!(check(&f32::NAN).is_err());
    }
}
