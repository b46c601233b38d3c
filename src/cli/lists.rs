//! `forehear tubes`, `forehear designs`, `forehear keys`

use super::args::{Keys, Tubes};
use super::console::Console;
use super::fault::{Failure, Stop};
use super::source;
use forehear::design::{self, Key, Kind, Need};
use forehear::diagnostic::{Code, nearest};
use forehear::report::json::{designs_document, keys_document, tube_document, tubes_document};
use forehear::report::listing::{DesignRow, KeyRow};
use forehear::report::terminal::{designs_text, keys_text, tube_text, tubes_text};
use forehear::tube::Catalog;

pub fn tubes(args: &Tubes, console: Console) -> Result<(), Stop> {
    let catalog = Catalog::shipped();
    let Some(name) = &args.tube else {
        let all = || catalog.tubes().iter().map(|t| &**t);
        return console.answer(|| tubes_document(all()), |page| tubes_text(all(), page));
    };
    let Some(tube) = source::tube(name)? else {
        let hint = match catalog.nearest(name) {
            Some(near) => format!("the nearest in the catalog is `{near}`"),
            None => format!("the catalog has {}", catalog.names().join(", ")),
        };
        return Err(Failure::of(
            name,
            Code::UnknownTube,
            format!("no tube `{name}` is known"),
            Some(format!(
                "{hint}; a tube file of your own is named by a path ending in .toml"
            )),
        )
        .into());
    };
    console.answer(|| tube_document(&tube), |page| tube_text(&tube, page))
}

pub fn designs(console: Console) -> Result<(), Stop> {
    let row = |(n, (word, text)): (usize, &(&str, &str))| {
        let design = design::read(text, &[])
            .expect("shipped designs are valid")
            .design;
        DesignRow {
            word: (*word).to_owned(),
            name: design.name,
            description: design.description,
            is_default: n == 0,
        }
    };
    let rows: Vec<DesignRow> = design::shipped().iter().enumerate().map(row).collect();
    console.answer(|| designs_document(&rows), |page| designs_text(&rows, page))
}

pub fn keys(args: &Keys, console: Console) -> Result<(), Stop> {
    let path = args.path.as_deref().unwrap_or_default();
    let found = design::keys::keys_under(path);
    if found.is_empty() {
        let plain: Vec<String> = design::keys()
            .iter()
            .map(|k| k.path.replace(".*", ""))
            .collect();
        let hint = match nearest(path, plain.iter().map(String::as_str)) {
            Some(near) => format!("did you mean `{near}`?"),
            None => "`forehear keys` lists them all".to_owned(),
        };
        return Err(Failure::of(
            path,
            Code::UnknownKey,
            format!("a design file has no key `{path}`"),
            Some(hint),
        )
        .into());
    }
    let rows: Vec<KeyRow> = found.into_iter().map(row).collect();
    console.answer(|| keys_document(&rows), |page| keys_text(&rows, page))
}

fn row(key: &Key) -> KeyRow {
    let unit = match key.kind {
        Kind::Quantity(unit) | Kind::Quantities(unit) if !unit.symbol().is_empty() => {
            Some(unit.symbol().to_owned())
        }
        _ => None,
    };
    KeyRow {
        path: key.path.to_owned(),
        kind: key.kind_text(),
        unit,
        need: match key.need {
            Need::Required => "required".to_owned(),
            Need::Optional => "optional".to_owned(),
            Need::Depends(on) => on.to_owned(),
        },
        default: key.default.map(str::to_owned),
        range: key.range_text(),
        words: match key.kind {
            Kind::Word(words) => words.iter().map(|&w| w.to_owned()).collect(),
            _ => Vec::new(),
        },
        help: key.help.to_owned(),
        example: key.example_line(),
    }
}
