//! The operating point as a builder checks it.

use super::page::{EXCEEDED, Page};
use crate::report::phrase::{self, decibels, percent, short};
use crate::report::safety;
use crate::stage::operating_point::{OperatingPoint, StagePoint};
use crate::stage::ratings::{Condition, RatingCheck};
use crate::study::result::BiasStudy;
use crate::units::notation::engineering;

/// Resistors below have no line of their own: nothing there can burn.
const LEAST_WATTS: f64 = 1e-6;
/// Direct volts below are written as none: far under what a meter shows, and where a solution's rounding begins.
const LEAST_VOLTS: f64 = 1e-6;

/// Exceeded ratings, supply, stages, parts, ratings, transformer, cautions.
pub fn bias_text(study: &BiasStudy, page: &Page) -> String {
    let p = &study.point;
    let mut out = page.alerts(&study.ratings, &study.warnings);
    out += &page.paragraph(&format!("{}: {}", study.design, study.description), 0);
    for (heading, body) in [
        ("Supply", supply(p, page)),
        ("Stages at rest", stages(p, page)),
        ("Resistors", resistors(p, page)),
        ("Capacitors", capacitors(p, page)),
        ("Ratings", ratings(&study.ratings, page)),
        ("Output transformer", transformer(p, page)),
    ] {
        out += &format!("\n{heading}\n{body}");
    }
    out.push('\n');
    for caution in safety::SAFETY {
        out += &page.paragraph(caution, 0);
    }
    out
}

fn supply(p: &OperatingPoint, page: &Page) -> String {
    let s = &p.supply;
    let mut rows = vec![vec![
        "source".to_owned(),
        volts(s.volts),
        volts(s.cold_volts),
        engineering(s.amperes, "A"),
        engineering(s.resistance, "Ω"),
    ]];
    for r in &p.rails {
        rows.push(vec![
            r.name.clone(),
            volts(r.volts),
            volts(r.cold_volts),
            engineering(r.amperes, "A"),
            String::new(),
        ]);
    }
    page.table(
        "<>>>>",
        &[
            "rail",
            "running",
            "cold start",
            "current",
            "source resistance",
        ],
        rows,
    )
}

fn stages(p: &OperatingPoint, page: &Page) -> String {
    let electrodes = |s: &StagePoint| {
        vec![
            s.name.clone(),
            tube(s),
            volts(s.plate_volts),
            s.screen_volts.map_or(String::new(), volts),
            volts(s.grid_volts),
            volts(s.cathode_volts),
            volts(s.v_gk),
            engineering(s.plate_amperes, "A"),
            s.screen_amperes
                .map_or(String::new(), |a| engineering(a, "A")),
            short(s.plate_watts, "W"),
            s.screen_watts.map_or(String::new(), |w| short(w, "W")),
        ]
    };
    let slopes = |s: &StagePoint| {
        vec![
            s.name.clone(),
            short(1e3 * s.gm, "mA/V"),
            s.rp.map_or("infinite".into(), |r| short(r, "Ω")),
            s.mu.map_or("infinite".into(), |m| short(m, "")),
            short(s.ac_load, "Ω"),
            format!(
                "{} ({})",
                short(s.gain, ""),
                decibels(20.0 * s.gain.abs().log10())
            ),
            if s.fixed_bias { "fixed" } else { "cathode" }.into(),
            short(s.grid_circuit_ohms, "Ω"),
        ]
    };
    let mut out = page.table(
        "<<>>>>>>>>>",
        &[
            "stage",
            "tube",
            "plate",
            "screen",
            "grid",
            "cathode",
            "grid to\ncathode",
            "plate\ncurrent",
            "screen\ncurrent",
            "plate\nwatts",
            "screen\nwatts",
        ],
        p.stages.iter().map(electrodes).collect(),
    );
    out.push('\n');
    out += &page.table(
        "<>>>>>>>",
        &[
            "stage",
            "gm",
            "rp",
            "mu",
            "AC load",
            "gain\nat 1 kHz",
            "bias",
            "grid\ncircuit",
        ],
        p.stages.iter().map(slopes).collect(),
    );
    out
}

fn volts(value: f64) -> String {
    engineering(
        if value.abs() < LEAST_VOLTS {
            0.0
        } else {
            value
        },
        "V",
    )
}

fn tube(s: &StagePoint) -> String {
    let mut name = s.tube.clone();
    if s.parallel > 1 {
        name = format!("{} x {name}", s.parallel);
    }
    if s.triode_connected {
        name += ", triode";
    }
    name
}

fn resistors(p: &OperatingPoint, page: &Page) -> String {
    let (mut warm, idle): (Vec<_>, Vec<_>) = p
        .resistors
        .iter()
        .partition(|r| r.watts.is_nan() || r.watts.abs() >= LEAST_WATTS);
    warm.sort_by(|a, b| b.watts.total_cmp(&a.watts));
    let rows = warm.into_iter().map(|r| {
        vec![
            r.name.clone(),
            engineering(r.ohms, "Ω"),
            volts(r.volts.abs()),
            short(r.watts, "W"),
        ]
    });
    let mut out = page.table(
        "<>>>",
        &["resistor", "value", "across it", "dissipation"],
        rows.collect(),
    );
    if !idle.is_empty() {
        let names: Vec<_> = idle.iter().map(|r| r.name.as_str()).collect();
        let least = short(LEAST_WATTS, "W");
        out += &page.paragraph(&format!("Under {least}: {}", names.join(", ")), 2);
    }
    out
}

fn capacitors(p: &OperatingPoint, page: &Page) -> String {
    let rows = p.capacitors.iter().map(|c| {
        vec![
            c.name.clone(),
            engineering(c.farads, "F"),
            volts(c.volts),
            volts(c.cold_volts),
        ]
    });
    page.table(
        "<>>>",
        &["capacitor", "value", "running", "cold start"],
        rows.collect(),
    )
}

fn ratings(checks: &[RatingCheck], page: &Page) -> String {
    let row = |c: &RatingCheck| {
        let unit = c.kind.unit();
        let mut notes = Vec::new();
        if c.exceeded {
            notes.push(EXCEEDED);
        } else if c.condition == Condition::ColdStart && c.value > c.limit {
            notes.push("above the running limit");
        }
        if c.limit_from_memory {
            notes.push("limit from memory");
        }
        vec![
            c.stage.clone(),
            c.tube.clone(),
            phrase::rating(c.kind).into(),
            short(c.value, unit),
            short(c.limit, unit),
            percent(c.margin_percent),
            phrase::condition(c.condition),
            notes.join(", "),
        ]
    };
    let mut out = page.table(
        "<<<>>>~~",
        &[
            "stage", "tube", "rating", "value", "limit", "margin", "when", "",
        ],
        checks.iter().map(row).collect(),
    );
    if checks.iter().any(|c| c.condition == Condition::ColdStart) {
        out += &page.paragraph(
            "Each section of a parallel stage for itself. At cold start no tube draws current yet; it is held against the \
             running limit, since sheets seldom print another.",
            0,
        );
    }
    out
}

fn transformer(p: &OperatingPoint, page: &Page) -> String {
    let t = &p.transformer;
    let direct = engineering(t.direct_amperes, "A");
    let direct = match t.direct_rated {
        Some(rated) => format!("{direct} of {} rated", engineering(rated, "A")),
        None => format!("{direct}, rating not given"),
    };
    let mut rows: Vec<Vec<String>> = [
        ("turns ratio", short(t.turns_ratio, "")),
        ("load seen by the plate", engineering(t.reflected_load, "Ω")),
        ("primary inductance", short(t.primary_inductance, "H")),
        ("leakage inductance", short(t.leakage_inductance, "H")),
        ("shunt capacitance", short(t.shunt_capacitance, "F")),
        ("primary copper", engineering(t.primary_resistance, "Ω")),
        (
            "secondary copper (itself)",
            engineering(t.secondary_resistance, "Ω"),
        ),
        ("core loss", engineering(t.core_loss, "Ω")),
        ("direct current", direct),
    ]
    .map(|(name, value)| vec![name.to_owned(), value])
    .to_vec();
    if let (Some(pentode), Some(matched)) = (t.inductance_if_pentode, t.inductance_if_matched) {
        rows.insert(
            3,
            vec![
                "  the label's low corner, read both ways".into(),
                format!(
                    "{} if taken from a generator like the primary, {} if from a pentode",
                    short(matched, "H"),
                    short(pentode, "H")
                ),
            ],
        );
    }
    let mut out = page.table("<~", &["referred to the primary", ""], rows);
    for assumption in &t.assumptions {
        out += &page.paragraph(&format!("Assumed: {assumption}"), 9);
    }
    out
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::report::sample;
    use crate::report::terminal::Paint;

    #[test]
    fn an_exceeded_rating_is_shouted_at_the_top_and_in_the_table() {
        let out = bias_text(&sample::bias(), &Page::default());
        assert!(out.starts_with("!! RATING EXCEEDED"), "{out}");
        assert_eq!(out.matches(EXCEEDED).count(), 2, "{out}");
        let colored = Page {
            paint: Paint::on(),
            ..Page::default()
        };
        let out = bias_text(&sample::bias(), &colored);
        assert!(out.matches("\u{1b}[1;31m").count() >= 2);
    }

    #[test]
    fn nothing_is_shouted_when_nothing_is_exceeded() {
        let mut study = sample::bias();
        study.ratings.truncate(3);
        study.warnings.clear();
        assert!(!bias_text(&study, &Page::default()).contains('!'));
    }

    #[test]
    fn resistors_are_sorted_by_watts() {
        let out = bias_text(&sample::bias(), &Page::default());
        let place = |name: &str| out.find(name).expect(name);
        assert!(place("stage.power.cathode.resistor") < place("stage.first.plate.resistor"));
        assert!(place("stage.first.plate.resistor") < place("stage.first.cathode.resistor"));
    }

    #[test]
    fn rounding_is_not_shown_as_volts_or_watts() {
        let mut study = sample::bias();
        study.point.stages[0].grid_volts = -1.5e-30;
        study.point.resistors[0].volts = 1e-12;
        study.point.resistors[0].watts = 1e-29;
        let out = bias_text(&study, &Page::default());
        assert!(!out.contains("e-"), "{out}");
        assert!(
            out.contains("Under 1 µW: stage.first.plate.resistor"),
            "{out}"
        );
    }

    #[test]
    fn both_readings_of_the_label_and_all_cautions_are_there() {
        let out = bias_text(&sample::bias(), &Page::default());
        let flat = out.split_whitespace().collect::<Vec<_>>().join(" ");
        assert!(flat.contains("6.1 H") && flat.contains("11.8 H"), "{out}");
        assert!(flat.contains("Assumed: primary copper 200 Ω"));
        for caution in safety::SAFETY {
            assert!(flat.contains(caution), "{caution}");
        }
    }

    #[test]
    fn it_fits_narrow_and_wide_terminals() {
        for width in [80, 100, 140] {
            let page = Page {
                width,
                ..Page::default()
            };
            let out = bias_text(&sample::bias(), &page);
            let longest = out.lines().map(|l| l.chars().count()).max();
            assert!(longest <= Some(width), "{longest:?}\n{out}");
        }
    }
}
