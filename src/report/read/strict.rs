//! Structs read as the format has them: every key must be there.
//!
//! Derived readers take a missing key for `null` where a value may be null. In this
//! format a null stands in the file, so a missing key means that something was cut out.

use serde::de::value::StrDeserializer;
use serde::de::{DeserializeSeed, Deserializer, Error, IntoDeserializer, MapAccess, SeqAccess, Visitor};
use std::fmt;

/// Reads from the inner deserializer; each struct on the way, in options and lists too,
/// must have all its keys.
pub(super) struct Strict<D>(pub(super) D);

/// Hands every call on unchanged but for those that may lead to a struct.
macro_rules! pass_on {
    ($($method:ident)*) => {
        $(fn $method<V: Visitor<'de>>(self, visitor: V) -> Result<V::Value, D::Error> {
            self.0.$method(visitor)
        })*
    };
}

impl<'de, D: Deserializer<'de>> Deserializer<'de> for Strict<D> {
    type Error = D::Error;

    pass_on! {
        deserialize_any deserialize_bool deserialize_i8 deserialize_i16 deserialize_i32 deserialize_i64
        deserialize_u8 deserialize_u16 deserialize_u32 deserialize_u64 deserialize_f32 deserialize_f64
        deserialize_char deserialize_str deserialize_string deserialize_bytes deserialize_byte_buf
        deserialize_unit deserialize_map deserialize_identifier deserialize_ignored_any
    }

    fn deserialize_option<V: Visitor<'de>>(self, visitor: V) -> Result<V::Value, D::Error> {
        self.0.deserialize_option(Within(visitor))
    }

    fn deserialize_seq<V: Visitor<'de>>(self, visitor: V) -> Result<V::Value, D::Error> {
        self.0.deserialize_seq(Within(visitor))
    }

    fn deserialize_tuple<V: Visitor<'de>>(self, length: usize, visitor: V) -> Result<V::Value, D::Error> {
        self.0.deserialize_tuple(length, visitor)
    }

    fn deserialize_struct<V: Visitor<'de>>(
        self,
        name: &'static str,
        fields: &'static [&'static str],
        visitor: V,
    ) -> Result<V::Value, D::Error> {
        self.0.deserialize_struct(name, fields, StructVisitor { inner: visitor, fields })
    }

    fn deserialize_enum<V: Visitor<'de>>(
        self,
        name: &'static str,
        variants: &'static [&'static str],
        visitor: V,
    ) -> Result<V::Value, D::Error> {
        self.0.deserialize_enum(name, variants, visitor)
    }

    fn deserialize_unit_struct<V: Visitor<'de>>(self, name: &'static str, visitor: V) -> Result<V::Value, D::Error> {
        self.0.deserialize_unit_struct(name, visitor)
    }

    fn deserialize_newtype_struct<V: Visitor<'de>>(self, name: &'static str, visitor: V) -> Result<V::Value, D::Error> {
        self.0.deserialize_newtype_struct(name, visitor)
    }

    fn deserialize_tuple_struct<V: Visitor<'de>>(
        self,
        name: &'static str,
        length: usize,
        visitor: V,
    ) -> Result<V::Value, D::Error> {
        self.0.deserialize_tuple_struct(name, length, visitor)
    }
}

/// What is within an option or a list is read as strictly.
struct Within<V>(V);

impl<'de, V: Visitor<'de>> Visitor<'de> for Within<V> {
    type Value = V::Value;

    fn expecting(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        self.0.expecting(f)
    }

    fn visit_none<E: Error>(self) -> Result<V::Value, E> {
        self.0.visit_none()
    }

    fn visit_unit<E: Error>(self) -> Result<V::Value, E> {
        self.0.visit_unit()
    }

    fn visit_some<D: Deserializer<'de>>(self, deserializer: D) -> Result<V::Value, D::Error> {
        self.0.visit_some(Strict(deserializer))
    }

    fn visit_seq<A: SeqAccess<'de>>(self, items: A) -> Result<V::Value, A::Error> {
        self.0.visit_seq(Within(items))
    }
}

impl<'de, A: SeqAccess<'de>> SeqAccess<'de> for Within<A> {
    type Error = A::Error;

    fn next_element_seed<T: DeserializeSeed<'de>>(&mut self, seed: T) -> Result<Option<T::Value>, A::Error> {
        self.0.next_element_seed(StrictSeed(seed))
    }

    fn size_hint(&self) -> Option<usize> {
        self.0.size_hint()
    }
}

/// Reads what the inner seed reads, strictly.
pub(super) struct StrictSeed<T>(pub(super) T);

impl<'de, T: DeserializeSeed<'de>> DeserializeSeed<'de> for StrictSeed<T> {
    type Value = T::Value;

    fn deserialize<D: Deserializer<'de>>(self, deserializer: D) -> Result<T::Value, D::Error> {
        self.0.deserialize(Strict(deserializer))
    }
}

struct StructVisitor<V> {
    inner: V,
    fields: &'static [&'static str],
}

impl<'de, V: Visitor<'de>> Visitor<'de> for StructVisitor<V> {
    type Value = V::Value;

    fn expecting(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        self.inner.expecting(f)
    }

    fn visit_map<A: MapAccess<'de>>(self, pairs: A) -> Result<V::Value, A::Error> {
        let seen = vec![false; self.fields.len()];
        self.inner.visit_map(Keys { pairs, fields: self.fields, seen })
    }
    // Not `visit_seq`: derived readers take a list for a struct, the format does not.
}

/// The keys of a struct, counted off.
struct Keys<A> {
    pairs: A,
    fields: &'static [&'static str],
    seen: Vec<bool>,
}

impl<'de, A: MapAccess<'de>> MapAccess<'de> for Keys<A> {
    type Error = A::Error;

    fn next_key_seed<K: DeserializeSeed<'de>>(&mut self, seed: K) -> Result<Option<K::Value>, A::Error> {
        let key = Key { seed, fields: self.fields, seen: &mut self.seen };
        let found = self.pairs.next_key_seed(key)?;
        if found.is_none()
            && let Some((field, _)) = self.fields.iter().zip(&self.seen).find(|(_, seen)| !**seen)
        {
            return Err(A::Error::missing_field(field));
        }
        Ok(found)
    }

    fn next_value_seed<T: DeserializeSeed<'de>>(&mut self, seed: T) -> Result<T::Value, A::Error> {
        self.pairs.next_value_seed(StrictSeed(seed))
    }
}

struct Key<'s, K> {
    seed: K,
    fields: &'static [&'static str],
    seen: &'s mut [bool],
}

impl<'de, K: DeserializeSeed<'de>> DeserializeSeed<'de> for Key<'_, K> {
    type Value = K::Value;

    fn deserialize<D: Deserializer<'de>>(self, deserializer: D) -> Result<K::Value, D::Error> {
        deserializer.deserialize_str(self)
    }
}

impl<'de, K: DeserializeSeed<'de>> Visitor<'de> for Key<'_, K> {
    type Value = K::Value;

    fn expecting(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str("a key")
    }

    fn visit_str<E: Error>(self, key: &str) -> Result<K::Value, E> {
        if let Some(place) = self.fields.iter().position(|field| *field == key) {
            self.seen[place] = true;
        }
        let key: StrDeserializer<'_, E> = key.into_deserializer();
        self.seed.deserialize(key)
    }
}
