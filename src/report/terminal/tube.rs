//! The catalog, and one tube with where its figures come from.

use super::page::Page;
use crate::report::phrase::short;
use crate::report::tube_words::{self, Group};
use crate::tube::{Origin, Tube};
use crate::units::notation::{engineering, significant};

/// One line for each tube.
pub fn tubes_text<'a>(tubes: impl IntoIterator<Item = &'a Tube>, page: &Page) -> String {
    let row = |t: &Tube| {
        vec![
            t.name.clone(),
            t.aliases.join(", "),
            tube_words::kind(t.kind()).into(),
            t.ratings
                .plate_dissipation
                .map_or("not known".into(), |w| short(w.0, "W")),
            t.provenance.law.confidence.words().into(),
            if t.grid_current_assumed {
                "assumed"
            } else {
                "from data"
            }
            .into(),
            t.description.clone(),
        ]
    };
    page.table(
        "<<<><<~",
        &[
            "tube",
            "also",
            "type",
            "plate",
            "law",
            "grid current",
            "what it is",
        ],
        tubes.into_iter().map(row).collect(),
    )
}

/// Parameters, ratings, capacitances, fitted range; each group with its source and how far to trust it.
pub fn tube_text(tube: &Tube, page: &Page) -> String {
    let p = &tube.provenance;
    let aliases = if tube.aliases.is_empty() {
        String::new()
    } else {
        format!(" (also {})", tube.aliases.join(", "))
    };
    let mut out = page.paragraph(
        &format!(
            "{}{aliases}: {}, {}. Figures are for one section.",
            tube.name,
            tube_words::kind(tube.kind()),
            tube.description
        ),
        0,
    );
    if let Some(caution) = &tube.caution {
        out += &page.paragraph(&format!("Caution: {caution}"), 9);
    }
    out += &group(
        "Current law",
        parameters(tube_words::law(tube)),
        &p.law,
        page,
    );
    let assumed = if tube.grid_current_assumed {
        "Grid current (assumed: no data of this type)"
    } else {
        "Grid current"
    };
    let grid = parameters(tube_words::grid_current(tube));
    out += &group(assumed, grid, &p.grid_current, page);
    let ratings = tube_words::ratings(tube)
        .into_iter()
        .map(|(name, limit, unit)| {
            let limit = limit.map_or("not known: nothing is checked".into(), |x| {
                engineering(x, unit)
            });
            vec![words(name), limit]
        });
    let heading = format!("Ratings ({})", tube.ratings.system);
    out += &group(&heading, ratings.collect(), &p.ratings, page);
    let capacitances = parameters(tube_words::capacitances(tube));
    out += &group("Capacitances", capacitances, &p.capacitances, page);
    let range = tube_words::fitted_range(tube)
        .into_iter()
        .map(|(name, span, unit)| {
            vec![
                words(name),
                format!(
                    "{} to {}",
                    engineering(span.low, unit),
                    engineering(span.high, unit)
                ),
            ]
        });
    let heading = "Fitted range (outside it the law is a guess)";
    out += &group(heading, range.collect(), &p.fitted_range, page);
    out
}

fn words(name: &str) -> String {
    name.replace('-', " ")
}

fn parameters(group: Group) -> Vec<Vec<String>> {
    group
        .into_iter()
        .map(|(name, value, unit)| {
            let value = match unit {
                "V" | "A" | "F" => engineering(value, unit),
                _ => format!("{} {unit}", significant(value))
                    .trim_end()
                    .to_owned(),
            };
            vec![words(name), value]
        })
        .collect()
}

fn group(heading: &str, rows: Vec<Vec<String>>, origin: &Origin, page: &Page) -> String {
    let mut out = format!("\n{heading}\n");
    out += &page.table("<~", &["", ""], rows);
    out += &page.paragraph(
        &format!("Source ({}): {}", origin.confidence.words(), origin.source),
        2,
    );
    if !origin.from_memory.is_empty() {
        out += &page.paragraph(
            &format!("From memory: {}", origin.from_memory.join(", ")),
            2,
        );
    }
    out
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::tube::Catalog;

    #[test]
    fn the_catalog_has_a_line_for_each_tube() {
        let catalog = Catalog::shipped();
        let out = tubes_text(catalog.tubes().iter().map(AsRef::as_ref), &Page::default());
        for name in catalog.names() {
            assert!(out.contains(name), "{out}");
        }
    }

    #[test]
    fn every_shipped_tube_shows_its_sources() {
        for tube in Catalog::shipped().tubes() {
            let out = tube_text(tube, &Page::default());
            let flat = out.split_whitespace().collect::<Vec<_>>().join(" ");
            let p = &tube.provenance;
            for origin in [
                &p.law,
                &p.grid_current,
                &p.ratings,
                &p.capacitances,
                &p.fitted_range,
            ] {
                let source = origin
                    .source
                    .split_whitespace()
                    .collect::<Vec<_>>()
                    .join(" ");
                assert!(flat.contains(&source), "{}\n{out}", tube.name);
            }
            assert!(flat.contains("Fitted range"));
            assert_eq!(
                flat.contains("no data of this type"),
                tube.grid_current_assumed
            );
        }
    }
}
