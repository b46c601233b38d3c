//! How a value becomes an entry of an object: a figure that does not exist is null with its reason beside it.

use serde::Serialize;
use serde::ser::{SerializeMap, SerializeSeq, Serializer};

/// A value, or the kebab-case word that says why there is none.
pub type Nullable<T> = Result<T, &'static str>;

/// Reason of a number that is infinite or not a number.
pub const NOT_FINITE: &str = "not-finite";

/// Writes itself as one or more entries of an object.
pub trait Entry {
    fn put<M: SerializeMap>(&self, key: &str, object: &mut M) -> Result<(), M::Error>;
}

fn put_reason<M: SerializeMap>(
    key: &str,
    reason: &'static str,
    object: &mut M,
) -> Result<(), M::Error> {
    object.serialize_entry(key, &None::<f64>)?;
    object.serialize_entry(&format!("{key}_reason"), reason)
}

impl<T: Entry> Entry for Nullable<T> {
    fn put<M: SerializeMap>(&self, key: &str, object: &mut M) -> Result<(), M::Error> {
        match self {
            Ok(value) => value.put(key, object),
            Err(reason) => put_reason(key, reason, object),
        }
    }
}

impl Entry for f64 {
    fn put<M: SerializeMap>(&self, key: &str, object: &mut M) -> Result<(), M::Error> {
        if self.is_finite() {
            object.serialize_entry(key, self)
        } else {
            put_reason(key, NOT_FINITE, object)
        }
    }
}

macro_rules! plain_entries {
    ($($type:ty),*) => {$(
        impl Entry for $type {
            fn put<M: SerializeMap>(&self, key: &str, object: &mut M) -> Result<(), M::Error> {
                object.serialize_entry(key, self)
            }
        }
    )*};
}

plain_entries!(bool, u32, usize, String, &'static str);

/// A list of things that are no bare numbers: those have reasons of their own inside.
impl<T: Item> Entry for Vec<T> {
    fn put<M: SerializeMap>(&self, key: &str, object: &mut M) -> Result<(), M::Error> {
        object.serialize_entry(key, self)
    }
}

/// What may stand in a list.
pub trait Item: Serialize {}

impl Item for String {}
impl Item for &'static str {}

/// Figures of H2 to H10; a missing one is null, and a list of reasons then stands beside them
/// under the key with `_reasons`.
#[derive(Clone, Debug, PartialEq)]
pub struct NineFigures(pub [Nullable<f64>; 9]);

impl Entry for NineFigures {
    fn put<M: SerializeMap>(&self, key: &str, object: &mut M) -> Result<(), M::Error> {
        let checked = self.0.map(|f| {
            f.and_then(|x| {
                if x.is_finite() {
                    Ok(x)
                } else {
                    Err(NOT_FINITE)
                }
            })
        });
        object.serialize_entry(key, &Nulls(checked.map(Result::ok)))?;
        if checked.iter().any(Result::is_err) {
            object.serialize_entry(&format!("{key}_reasons"), &Nulls(checked.map(Result::err)))?;
        }
        Ok(())
    }
}

struct Nulls<T>([Option<T>; 9]);

impl<T: Serialize> Serialize for Nulls<T> {
    fn serialize<S: Serializer>(&self, serializer: S) -> Result<S::Ok, S::Error> {
        let mut list = serializer.serialize_seq(Some(9))?;
        for item in &self.0 {
            list.serialize_element(item)?;
        }
        list.end()
    }
}

/// Entries that stand in the object around them instead of in one of their own.
#[derive(Clone, Debug)]
pub struct Inline<T>(pub T);

/// Writes all its entries into an object.
pub trait Entries {
    fn put_all<M: SerializeMap>(&self, object: &mut M) -> Result<(), M::Error>;
}

impl<T: Entries> Entry for Inline<T> {
    fn put<M: SerializeMap>(&self, _key: &str, object: &mut M) -> Result<(), M::Error> {
        self.0.put_all(object)
    }
}

/// Declares structs that serialize as objects with their fields in order, by the rules of [`Entry`].
macro_rules! objects {
    ($($(#[$doc:meta])* $name:ident { $($(#[$field_doc:meta])* $field:ident: $type:ty,)* })*) => {$(
        $(#[$doc])*
        #[derive(Clone, Debug)]
        pub struct $name {
            $($(#[$field_doc])* pub $field: $type,)*
        }

        impl $crate::report::json::entry::Entries for $name {
            fn put_all<M: serde::ser::SerializeMap>(&self, object: &mut M) -> Result<(), M::Error> {
                use $crate::report::json::entry::Entry;
                $(self.$field.put(stringify!($field), object)?;)*
                Ok(())
            }
        }

        impl serde::Serialize for $name {
            fn serialize<S: serde::Serializer>(&self, serializer: S) -> Result<S::Ok, S::Error> {
                use serde::ser::SerializeMap;
                use $crate::report::json::entry::Entries;
                let mut object = serializer.serialize_map(None)?;
                self.put_all(&mut object)?;
                object.end()
            }
        }

        impl $crate::report::json::entry::Entry for $name {
            fn put<M: serde::ser::SerializeMap>(&self, key: &str, object: &mut M) -> Result<(), M::Error> {
                object.serialize_entry(key, self)
            }
        }

        impl $crate::report::json::entry::Item for $name {}
    )*};
}

pub(super) use objects;

#[cfg(test)]
mod tests {
    use super::*;

    objects! {
        Inner { a: f64, }
        Outer { x: f64, y: Nullable<f64>, z: Nullable<Inner>, inner: Inline<Inner>, nine: NineFigures, }
    }

    fn outer(x: f64, nine: NineFigures) -> String {
        let outer = Outer {
            x,
            y: Err("not-reached"),
            z: Ok(Inner {
                a: f64::NEG_INFINITY,
            }),
            inner: Inline(Inner { a: 2.0 }),
            nine,
        };
        serde_json::to_string(&outer).unwrap()
    }

    #[test]
    fn a_missing_figure_is_null_with_its_reason_beside_it() {
        let text = outer(1.5, NineFigures([Ok(1.0); 9]));
        let expected = r#"{"x":1.5,"y":null,"y_reason":"not-reached","z":{"a":null,"a_reason":"not-finite"},"a":2.0,"nine":[1.0,1.0,1.0,1.0,1.0,1.0,1.0,1.0,1.0]}"#;
        assert_eq!(text, expected);
    }

    #[test]
    fn no_number_that_is_none_gets_through() {
        let mut nine = [Ok(1.0); 9];
        nine[3] = Ok(f64::NAN);
        nine[8] = Err("above-band");
        let text = outer(f64::NAN, NineFigures(nine));
        assert!(text.contains(r#""x":null,"x_reason":"not-finite""#));
        assert!(text.contains(
            r#""nine":[1.0,1.0,1.0,null,1.0,1.0,1.0,1.0,null],"nine_reasons":[null,null,null,"not-finite",null,null,null,null,"above-band"]"#
        ));
    }
}
