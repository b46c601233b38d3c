//! `forehear new`

use std::path::Path;

use serde::Serialize;

use super::args::New;
use super::console::Console;
use super::fault::{Failure, Stop};
use super::interrupt::begin_writing;
use super::output::write_new;
use super::source;
use forehear::design;
use forehear::report::json::SCHEMA;

#[derive(Serialize)]
struct Document<'a> {
    schema: u32,
    kind: &'static str,
    file: &'a str,
    /// The design it was made from.
    from: &'a str,
}

pub fn run(args: &New, console: Console) -> Result<(), Stop> {
    let source = source::design_text(args.from.as_deref())?;
    design::read(&source.text, &[])
        .map_err(|faults| Failure::in_text(&source.name, Some(source.text.clone()), faults))?;
    begin_writing()?;
    write_new(Path::new(&args.file), &design::template(&source.text))?;
    let file = args.file.display().to_string();
    let document = Document {
        schema: SCHEMA,
        kind: "new",
        file: &file,
        from: &source.name,
    };
    console.answer(
        || {
            let text = serde_json::to_string_pretty(&document).expect("texts and a number");
            format!("{text}\n")
        },
        |_| {
            format!(
                "{file} written, from {}. Next: forehear bias {file}\n",
                source.name
            )
        },
    )
}
