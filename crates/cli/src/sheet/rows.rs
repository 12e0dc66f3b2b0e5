//! Rows of CSV in memory.

/// Rows with a header.
pub(super) struct Rows {
    writer: csv::Writer<Vec<u8>>,
}

impl Rows {
    pub(super) fn new(header: &[&str]) -> Result<Self, csv::Error> {
        let mut writer = csv::Writer::from_writer(Vec::new());
        writer.write_record(header)?;
        Ok(Self { writer })
    }

    /// Adds a row; it must have a field for every column.
    pub(super) fn add(&mut self, fields: &[String]) -> Result<(), csv::Error> {
        self.writer.write_record(fields)
    }

    pub(super) fn into_text(self) -> Result<String, csv::Error> {
        let bytes = self.writer.into_inner().map_err(|error| csv::Error::from(error.into_error()))?;
        Ok(String::from_utf8(bytes).expect("fields that are Unicode make rows that are Unicode"))
    }
}

/// A number so that it reads back exactly; nothing where it is not known.
pub(super) fn number(value: Option<f64>) -> String {
    value.map_or_else(String::new, |value| format!("{value:?}"))
}
