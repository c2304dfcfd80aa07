//! A serializer that refuses numbers that are not finite. JSON writers turn them into `null` without a word.

use serde::ser::{
    Error, Serialize, SerializeMap, SerializeSeq, SerializeStruct, SerializeStructVariant, SerializeTuple,
    SerializeTupleStruct, SerializeTupleVariant, Serializer,
};

/// Passes everything on to the serializer inside but numbers that are not finite, which are errors.
pub(super) struct Finite<S>(pub S);

/// A value on its way through [`Finite`].
struct Checked<'a, T: ?Sized>(&'a T);

impl<T: Serialize + ?Sized> Serialize for Checked<'_, T> {
    fn serialize<S: Serializer>(&self, serializer: S) -> Result<S::Ok, S::Error> {
        self.0.serialize(Finite(serializer))
    }
}

macro_rules! pass {
    ($($method:ident($type:ty);)*) => {$(
        fn $method(self, value: $type) -> Result<S::Ok, S::Error> {
            self.0.$method(value)
        }
    )*};
}

impl<S: Serializer> Serializer for Finite<S> {
    type Ok = S::Ok;
    type Error = S::Error;
    type SerializeSeq = Finite<S::SerializeSeq>;
    type SerializeTuple = Finite<S::SerializeTuple>;
    type SerializeTupleStruct = Finite<S::SerializeTupleStruct>;
    type SerializeTupleVariant = Finite<S::SerializeTupleVariant>;
    type SerializeMap = Finite<S::SerializeMap>;
    type SerializeStruct = Finite<S::SerializeStruct>;
    type SerializeStructVariant = Finite<S::SerializeStructVariant>;

    pass! {
        serialize_bool(bool);
        serialize_i8(i8);
        serialize_i16(i16);
        serialize_i32(i32);
        serialize_i64(i64);
        serialize_i128(i128);
        serialize_u8(u8);
        serialize_u16(u16);
        serialize_u32(u32);
        serialize_u64(u64);
        serialize_u128(u128);
        serialize_char(char);
        serialize_str(&str);
        serialize_bytes(&[u8]);
        serialize_unit_struct(&'static str);
    }

    fn serialize_f64(self, value: f64) -> Result<S::Ok, S::Error> {
        if value.is_finite() {
            self.0.serialize_f64(value)
        } else {
            Err(S::Error::custom(format_args!("the number {value} in an answer")))
        }
    }

    fn serialize_f32(self, value: f32) -> Result<S::Ok, S::Error> {
        self.serialize_f64(value.into())
    }

    fn serialize_none(self) -> Result<S::Ok, S::Error> {
        self.0.serialize_none()
    }

    fn serialize_unit(self) -> Result<S::Ok, S::Error> {
        self.0.serialize_unit()
    }

    fn serialize_some<T: Serialize + ?Sized>(self, value: &T) -> Result<S::Ok, S::Error> {
        self.0.serialize_some(&Checked(value))
    }

    fn serialize_unit_variant(
        self,
        name: &'static str,
        index: u32,
        variant: &'static str,
    ) -> Result<S::Ok, S::Error> {
        self.0.serialize_unit_variant(name, index, variant)
    }

    fn serialize_newtype_struct<T: Serialize + ?Sized>(
        self,
        name: &'static str,
        value: &T,
    ) -> Result<S::Ok, S::Error> {
        self.0.serialize_newtype_struct(name, &Checked(value))
    }

    fn serialize_newtype_variant<T: Serialize + ?Sized>(
        self,
        name: &'static str,
        index: u32,
        variant: &'static str,
        value: &T,
    ) -> Result<S::Ok, S::Error> {
        self.0.serialize_newtype_variant(name, index, variant, &Checked(value))
    }

    fn serialize_seq(self, length: Option<usize>) -> Result<Self::SerializeSeq, S::Error> {
        self.0.serialize_seq(length).map(Finite)
    }

    fn serialize_tuple(self, length: usize) -> Result<Self::SerializeTuple, S::Error> {
        self.0.serialize_tuple(length).map(Finite)
    }

    fn serialize_tuple_struct(
        self,
        name: &'static str,
        length: usize,
    ) -> Result<Self::SerializeTupleStruct, S::Error> {
        self.0.serialize_tuple_struct(name, length).map(Finite)
    }

    fn serialize_tuple_variant(
        self,
        name: &'static str,
        index: u32,
        variant: &'static str,
        length: usize,
    ) -> Result<Self::SerializeTupleVariant, S::Error> {
        self.0.serialize_tuple_variant(name, index, variant, length).map(Finite)
    }

    fn serialize_map(self, length: Option<usize>) -> Result<Self::SerializeMap, S::Error> {
        self.0.serialize_map(length).map(Finite)
    }

    fn serialize_struct(self, name: &'static str, length: usize) -> Result<Self::SerializeStruct, S::Error> {
        self.0.serialize_struct(name, length).map(Finite)
    }

    fn serialize_struct_variant(
        self,
        name: &'static str,
        index: u32,
        variant: &'static str,
        length: usize,
    ) -> Result<Self::SerializeStructVariant, S::Error> {
        self.0.serialize_struct_variant(name, index, variant, length).map(Finite)
    }
}

macro_rules! pass_items {
    ($($trait:ident $method:ident($($key:ident: $key_type:ty)?);)*) => {$(
        impl<C: $trait> $trait for Finite<C> {
            type Ok = C::Ok;
            type Error = C::Error;

            fn $method<T: Serialize + ?Sized>(&mut self, $($key: $key_type,)? value: &T) -> Result<(), C::Error> {
                self.0.$method($($key,)? &Checked(value))
            }

            fn end(self) -> Result<C::Ok, C::Error> {
                self.0.end()
            }
        }
    )*};
}

pass_items! {
    SerializeSeq serialize_element();
    SerializeTuple serialize_element();
    SerializeTupleStruct serialize_field();
    SerializeTupleVariant serialize_field();
    SerializeStruct serialize_field(key: &'static str);
    SerializeStructVariant serialize_field(key: &'static str);
}

impl<C: SerializeMap> SerializeMap for Finite<C> {
    type Ok = C::Ok;
    type Error = C::Error;

    fn serialize_key<T: Serialize + ?Sized>(&mut self, key: &T) -> Result<(), C::Error> {
        self.0.serialize_key(key)
    }

    fn serialize_value<T: Serialize + ?Sized>(&mut self, value: &T) -> Result<(), C::Error> {
        self.0.serialize_value(&Checked(value))
    }

    fn end(self) -> Result<C::Ok, C::Error> {
        self.0.end()
    }
}
