//! The catalog and one tube.

use super::entry::{Nullable, objects};
use super::{SCHEMA, written};
use crate::report::tube_words::{self, Group};
use crate::tube::{Origin, Span, Tube};

objects! {
    Tubes {
        schema: u32,
        kind: &'static str,
        tubes: Vec<TubeLine>,
    }
    TubeLine {
        name: String,
        aliases: Vec<String>,
        tube_type: &'static str,
        description: String,
        caution: Nullable<String>,
        grid_current_assumed: bool,
    }
    OneTube {
        schema: u32,
        kind: &'static str,
        name: String,
        aliases: Vec<String>,
        tube_type: &'static str,
        description: String,
        caution: Nullable<String>,
        law: Vec<Parameter>,
        law_origin: OriginEntry,
        grid_current: Vec<Parameter>,
        grid_current_assumed: bool,
        grid_current_origin: OriginEntry,
        rating_system: String,
        ratings: Vec<Limit>,
        ratings_origin: OriginEntry,
        capacitances: Vec<Parameter>,
        capacitances_origin: OriginEntry,
        fitted_range: Vec<Range>,
        fitted_range_origin: OriginEntry,
    }
    Parameter {
        name: &'static str,
        value: f64,
        unit: Nullable<&'static str>,
    }
    Limit {
        name: &'static str,
        limit: Nullable<f64>,
        unit: &'static str,
    }
    Range {
        name: &'static str,
        low: f64,
        high: f64,
        unit: &'static str,
    }
    OriginEntry {
        source: String,
        confidence: &'static str,
        from_memory: Vec<String>,
    }
}

/// The catalog, as JSON.
pub fn tubes_document<'a>(tubes: impl IntoIterator<Item = &'a Tube>) -> String {
    written(&Tubes {
        schema: SCHEMA,
        kind: "tubes",
        tubes: tubes
            .into_iter()
            .map(|t| TubeLine {
                name: t.name.clone(),
                aliases: t.aliases.clone(),
                tube_type: tube_words::kind(t.kind()),
                description: t.description.clone(),
                caution: caution(t),
                grid_current_assumed: t.grid_current_assumed,
            })
            .collect(),
    })
}

/// One tube, as JSON.
pub fn tube_document(tube: &Tube) -> String {
    let p = &tube.provenance;
    written(&OneTube {
        schema: SCHEMA,
        kind: "tube",
        name: tube.name.clone(),
        aliases: tube.aliases.clone(),
        tube_type: tube_words::kind(tube.kind()),
        description: tube.description.clone(),
        caution: caution(tube),
        law: parameters(tube_words::law(tube)),
        law_origin: origin(&p.law),
        grid_current: parameters(tube_words::grid_current(tube)),
        grid_current_assumed: tube.grid_current_assumed,
        grid_current_origin: origin(&p.grid_current),
        rating_system: tube.ratings.system.clone(),
        ratings: tube_words::ratings(tube)
            .into_iter()
            .map(|(name, limit, unit)| Limit {
                name,
                limit: limit.ok_or("not-known"),
                unit,
            })
            .collect(),
        ratings_origin: origin(&p.ratings),
        capacitances: parameters(tube_words::capacitances(tube)),
        capacitances_origin: origin(&p.capacitances),
        fitted_range: tube_words::fitted_range(tube)
            .into_iter()
            .map(|(name, Span { low, high }, unit)| Range {
                name,
                low,
                high,
                unit,
            })
            .collect(),
        fitted_range_origin: origin(&p.fitted_range),
    })
}

fn caution(tube: &Tube) -> Nullable<String> {
    tube.caution.clone().ok_or("none")
}

fn parameters(group: Group) -> Vec<Parameter> {
    group
        .into_iter()
        .map(|(name, value, unit)| Parameter {
            name,
            value,
            unit: if unit.is_empty() {
                Err("no-unit")
            } else {
                Ok(unit)
            },
        })
        .collect()
}

fn origin(origin: &Origin) -> OriginEntry {
    OriginEntry {
        source: origin.source.clone(),
        confidence: origin.confidence.words(),
        from_memory: origin.from_memory.clone(),
    }
}
