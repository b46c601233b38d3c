//! Levels and curves as comma-separated values: a header of names, SI base units, missing figures empty.

mod curves;
mod levels;

pub use curves::{plate_csv, transfer_csv};
pub use levels::levels_csv;

/// Writes rows of text under a header.
struct Sheet(csv::Writer<Vec<u8>>);

impl Sheet {
    fn new(header: &[String]) -> Sheet {
        let mut sheet = Sheet(csv::Writer::from_writer(Vec::new()));
        sheet.row(header);
        sheet
    }

    fn row(&mut self, cells: &[String]) {
        self.0
            .write_record(cells)
            .expect("every row of a sheet is as long as its header");
    }

    fn text(self) -> String {
        let bytes = self.0.into_inner().expect("memory does not fail to flush");
        String::from_utf8(bytes).expect("cells are text")
    }
}

/// The shortest text that reads back as the same number; empty when there is none.
fn number(value: impl Into<Option<f64>>) -> String {
    match value.into() {
        Some(x) if x.is_finite() => x.to_string(),
        _ => String::new(),
    }
}

/// Names of a header.
fn names(names: &[&str]) -> Vec<String> {
    names.iter().map(|&n| n.to_owned()).collect()
}
