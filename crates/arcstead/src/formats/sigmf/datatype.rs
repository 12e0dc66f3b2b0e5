//! The datatypes of SigMF: bytes of a sample to numbers.

/// A number format as it lies in the file.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Number {
    F32,
    F64,
    I8,
    I16,
    I32,
    U8,
    U16,
    U32,
}

/// A value of `core:datatype`.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) struct Datatype {
    pub(super) complex: bool,
    pub(super) number: Number,
    pub(super) big_endian: bool,
}

impl Datatype {
    /// Reads `rf32_le`, `ci16_be`, `ru8` and the like; none for what the standard does not know.
    pub(super) fn parse(text: &str) -> Option<Self> {
        let complex = match text.as_bytes().first()? {
            b'r' => false,
            b'c' => true,
            _ => return None,
        };
        // The first byte is an ASCII letter, so the cut is between letters.
        let (number, order) = text[1..].split_once('_').map_or((&text[1..], None), |(a, b)| (a, Some(b)));
        let number = match number {
            "f32" => Number::F32,
            "f64" => Number::F64,
            "i8" => Number::I8,
            "i16" => Number::I16,
            "i32" => Number::I32,
            "u8" => Number::U8,
            "u16" => Number::U16,
            "u32" => Number::U32,
            _ => return None,
        };
        let big_endian = match (number.bytes(), order) {
            (1, None) | (2.., Some("le")) => false,
            (2.., Some("be")) => true,
            _ => return None,
        };
        Some(Self { complex, number, big_endian })
    }

    /// Bytes of one sample of one channel: both parts of a complex one.
    pub(super) fn bytes(self) -> usize {
        self.number.bytes() * if self.complex { 2 } else { 1 }
    }

    /// Turns the bytes of whole numbers into numbers and hands them to `take`, in the order of the file.
    pub(super) fn decode(self, bytes: &[u8], take: impl FnMut(f64)) {
        fn each<const N: usize>(bytes: &[u8], number: impl Fn([u8; N]) -> f64, take: impl FnMut(f64)) {
            bytes.as_chunks::<N>().0.iter().map(|bytes| number(*bytes)).for_each(take);
        }
        match (self.number, self.big_endian) {
            (Number::I8, _) => each(bytes, |b| f64::from(i8::from_le_bytes(b)), take),
            (Number::U8, _) => each(bytes, |[b]| f64::from(b) - 128.0, take),
            (Number::I16, false) => each(bytes, |b| f64::from(i16::from_le_bytes(b)), take),
            (Number::I16, true) => each(bytes, |b| f64::from(i16::from_be_bytes(b)), take),
            (Number::U16, false) => each(bytes, |b| f64::from(u16::from_le_bytes(b)) - 32_768.0, take),
            (Number::U16, true) => each(bytes, |b| f64::from(u16::from_be_bytes(b)) - 32_768.0, take),
            (Number::I32, false) => each(bytes, |b| f64::from(i32::from_le_bytes(b)), take),
            (Number::I32, true) => each(bytes, |b| f64::from(i32::from_be_bytes(b)), take),
            (Number::U32, false) => each(bytes, |b| f64::from(u32::from_le_bytes(b)) - 2_147_483_648.0, take),
            (Number::U32, true) => each(bytes, |b| f64::from(u32::from_be_bytes(b)) - 2_147_483_648.0, take),
            (Number::F32, false) => each(bytes, |b| f64::from(f32::from_le_bytes(b)), take),
            (Number::F32, true) => each(bytes, |b| f64::from(f32::from_be_bytes(b)), take),
            (Number::F64, false) => each(bytes, f64::from_le_bytes, take),
            (Number::F64, true) => each(bytes, f64::from_be_bytes, take),
        }
    }
}

impl Number {
    fn bytes(self) -> usize {
        match self {
            Self::I8 | Self::U8 => 1,
            Self::I16 | Self::U16 => 2,
            Self::I32 | Self::U32 | Self::F32 => 4,
            Self::F64 => 8,
        }
    }

    /// Whether it counts.
    pub(super) fn is_integer(self) -> bool {
        !matches!(self, Self::F32 | Self::F64)
    }

    /// Lowest and highest count (the mid-scale offset of unsigned ones removed) where the recorder certainly
    /// uses them: with 8 bits. Ten to fourteen bits lie in wider integers too, at either end of them, and
    /// clip long before the integer does.
    pub(super) fn range(self) -> Option<(f64, f64)> {
        matches!(self, Self::I8 | Self::U8).then_some((-128.0, 127.0))
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_names_of_the_standard_and_no_others() {
        let parts = ["f32", "f64", "i32", "i16", "u32", "u16"];
        for kind in ["r", "c"] {
            for part in parts {
                for order in ["_le", "_be"] {
                    let datatype = Datatype::parse(&format!("{kind}{part}{order}")).unwrap();
                    assert_eq!((datatype.complex, datatype.big_endian), (kind == "c", order == "_be"));
                }
                assert_eq!(Datatype::parse(&format!("{kind}{part}")), None, "{part} without byte order");
            }
            for part in ["i8", "u8"] {
                assert!(Datatype::parse(&format!("{kind}{part}")).is_some());
                assert_eq!(Datatype::parse(&format!("{kind}{part}_le")), None);
            }
        }
        for text in
            ["", "r", "f32_le", "rf16_le", "ri64_le", "xf32_le", "rf32_me", "rf32_", "µf32_le", "ri12_le"]
        {
            assert_eq!(Datatype::parse(text), None, "{text}");
        }
    }

    #[test]
    fn bytes_are_numbers_as_the_machine_formats_say() {
        // Two's complement and IEEE 754 written out by hand.
        let cases: [(&str, &[u8], &[f64]); 15] = [
            ("ri8", &[0x80, 0xff, 0x7f], &[-128.0, -1.0, 127.0]),
            ("ru8", &[0x00, 0x80, 0xff], &[-128.0, 0.0, 127.0]),
            ("ri16_le", &[0xfe, 0xff, 0x01, 0x02], &[-2.0, 513.0]),
            ("ri16_be", &[0xff, 0xfe, 0x02, 0x01], &[-2.0, 513.0]),
            ("ru16_le", &[0x00, 0x80, 0x01, 0x00], &[0.0, -32_767.0]),
            ("ru16_be", &[0x80, 0x00, 0xff, 0xff], &[0.0, 32_767.0]),
            ("ri32_le", &[0x01, 0x00, 0x00, 0x80], &[-2_147_483_647.0]),
            ("ri32_be", &[0x00, 0x01, 0x00, 0x00], &[65_536.0]),
            ("ru32_le", &[0x00, 0x00, 0x00, 0x80], &[0.0]),
            ("ru32_be", &[0xff, 0xff, 0xff, 0xff], &[2_147_483_647.0]),
            ("rf32_le", &[0x00, 0x00, 0x80, 0xbf], &[-1.0]),
            ("rf32_be", &[0x40, 0x20, 0x00, 0x00], &[2.5]),
            ("rf64_le", &[0, 0, 0, 0, 0, 0, 0xf0, 0x3f], &[1.0]),
            ("rf64_be", &[0xc0, 0x04, 0, 0, 0, 0, 0, 0], &[-2.5]),
            ("ci8", &[1, 2, 3, 4], &[1.0, 2.0, 3.0, 4.0]),
        ];
        for (name, bytes, expected) in cases {
            let mut found = Vec::new();
            Datatype::parse(name).unwrap().decode(bytes, |number| found.push(number));
            assert_eq!(found, expected, "{name}");
        }
    }
}
