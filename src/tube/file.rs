//! Tube files: TOML text in, a [`Tube`] or all of the text's faults out.

use toml::de::DeTable;

use super::entry::{Capacitances, FittedRange, Law, Provenance, Ratings, Span, Tube, TubeKind};
use super::grid::{GridLaw, GridParameters};
use super::pentode::{PentodeLaw, PentodeParameters, SecondSection};
use super::reader::Reader;
use super::triode::{TriodeLaw, TriodeParameters};
use crate::diagnostic::{Code, Diagnostic, Place};
use crate::units::{Amperes, Ohms, Volts, Watts};

/// The version of the tube-file format this program reads.
const FORMAT: f64 = 1.0;

/// Reads a tube file, such as those of the catalog.
///
/// # Errors
/// All faults at once: text that is not TOML, keys unknown or missing, values of the wrong type or out of range, and
/// a law whose plate current would fall with rising plate or grid volts.
pub fn read_tube(text: &str) -> Result<Tube, Vec<Diagnostic>> {
    let (table, errors) = DeTable::parse_recoverable(text);
    if !errors.is_empty() {
        return Err(errors.iter().map(syntax).collect());
    }
    let mut faults = Vec::new();
    let tube = read(table.get_ref(), &mut faults);
    match tube {
        Some(tube) if faults.is_empty() => Ok(tube),
        _ => Err(faults),
    }
}

fn syntax(error: &toml::de::Error) -> Diagnostic {
    Diagnostic {
        code: Code::Syntax,
        path: String::new(),
        place: error.span().map_or(Place::Whole, Place::Text),
        message: format!("not valid TOML: {}", error.message()),
        hint: None,
    }
}

fn read(table: &DeTable<'_>, faults: &mut Vec<Diagnostic>) -> Option<Tube> {
    let mut top = Reader::top(table, faults);
    let format = top.number("format", 0.0..=f64::MAX);
    if format != FORMAT && top.has("format") {
        let span = top.span_of("format").unwrap_or_default();
        top.fault(
            Code::TubeFormat,
            "format",
            span,
            format!("this program reads tube files of format {FORMAT}, found {format}"),
            Some(format!("format = {FORMAT}")),
        );
    }
    let name = top.text("name");
    let aliases = top.texts("aliases").into_iter().map(|(a, _)| a).collect();
    let description = top.text("description");
    let caution = top.optional_text("caution");
    let kind = match top.word("kind", &["triode", "pentode"]) {
        Some(0) => TubeKind::Triode,
        Some(_) => TubeKind::Pentode,
        // Which keys the rest should have hangs on the kind: asking for them would only add noise.
        None => return None,
    };

    let mut group = top.table("law");
    let law = match kind {
        TubeKind::Triode => Law::Triode(triode(&mut group)),
        TubeKind::Pentode => Law::Pentode(pentode(&mut group)),
    };
    let law_origin = group.origin();
    group.finish();

    let mut group = top.table("grid_current");
    let grid_law = grid(&mut group);
    let grid_current_assumed = group.claim("assumed");
    let grid_origin = group.origin();
    group.finish();

    let mut group = top.table("ratings");
    let ratings = ratings(&mut group, kind);
    let ratings_origin = group.origin();
    group.finish();

    let mut group = top.table("capacitances");
    let mut picofarads = |key| group.number(key, 0.0..=1000.0) * 1e-12;
    let capacitances = Capacitances {
        grid_plate: picofarads("grid_plate_pf"),
        grid_cathode: picofarads("grid_cathode_pf"),
        plate_cathode: picofarads("plate_cathode_pf"),
    };
    let capacitances_origin = group.origin();
    group.finish();

    let mut group = top.table("fitted_range");
    let fitted_range = fitted_range(&mut group, kind);
    let range_origin = group.origin();
    group.finish();

    let span = top.span_of("law").unwrap_or_default();
    if top.is_sound()
        && let Some(fault) = misbehavior(&law)
    {
        top.fault(Code::TubeLaw, "law", span, fault, None);
    }
    top.finish();
    Some(Tube {
        name,
        aliases,
        description,
        caution,
        law,
        grid_law,
        grid_current_assumed,
        ratings,
        capacitances,
        fitted_range,
        provenance: Provenance {
            law: law_origin,
            grid_current: grid_origin,
            ratings: ratings_origin,
            capacitances: capacitances_origin,
            fitted_range: range_origin,
        },
    })
}

// Ranges of the laws' parameters are chosen: wide around every tube fitted so far, and narrow enough that the laws stay
// finite and their logarithms defined.

fn triode(group: &mut Reader) -> TriodeLaw {
    TriodeLaw::new(TriodeParameters {
        amplification_factor: group.number("amplification_factor", 1.0..=1000.0),
        current_exponent: group.number("current_exponent", 1.0..=2.5),
        inverse_perveance: group.number("inverse_perveance", 1.0..=1e6),
        cutoff_sharpness: group.number("cutoff_sharpness", 1.0..=1e5),
        softness_floor: group.number("softness_floor", 1.0..=1e6),
        contact_volts: group.number("contact_volts", -10.0..=10.0),
        low_plate_volts: group.number("low_plate_volts", 0.1..=1000.0),
        low_plate_growth: group.number("low_plate_growth", 0.0..=100.0),
    })
}

fn pentode(group: &mut Reader) -> PentodeLaw {
    let mut parameters = PentodeParameters {
        screen_amplification_factor: group.number("screen_amplification_factor", 1.0..=1000.0),
        current_exponent: group.number("current_exponent", 1.0..=2.5),
        inverse_perveance: group.number("inverse_perveance", 1.0..=1e6),
        cutoff_sharpness: group.number("cutoff_sharpness", 1.0..=1e5),
        contact_volts: group.number("contact_volts", -10.0..=10.0),
        plate_penetration: group.number("plate_penetration", 0.0..=1.0),
        division_ratio: group.number("division_ratio", 0.1..=1000.0),
        division_exponent: group.number("division_exponent", 0.01..=2.0),
        limit_current_at_ten_volts: group.number("limit_milliamperes_at_ten_volts", 0.01..=1e5)
            * 1e-3,
        knee_sharpness: group.number("knee_sharpness", 0.3..=30.0),
        returned_share: group.number("returned_share", 0.0..=1.0),
        second_section: None,
    };
    let second = ["second_section_share", "second_section_amplification_ratio"];
    if second.iter().any(|key| group.has(key)) {
        parameters.second_section = Some(SecondSection {
            share: group.number(second[0], 1e-6..=0.999_999),
            amplification_ratio: group.number(second[1], 0.05..=20.0),
        });
    }
    PentodeLaw::new(parameters)
}

fn grid(group: &mut Reader) -> GridLaw {
    GridLaw::new(GridParameters {
        perveance: group.number("perveance", 1e-9..=10.0),
        current_exponent: group.number("current_exponent", 1.0..=2.5),
        plate_exponent: group.number("plate_exponent", 0.0..=2.0),
        onset_volts: group.number("onset_volts", -5.0..=5.0),
        onset_sharpness: group.number("onset_sharpness", 0.1..=100.0),
    })
}

fn ratings(group: &mut Reader, kind: TubeKind) -> Ratings {
    let volts = 1.0..=1e5;
    let watts = 1e-3..=1e5;
    let ohms = 1.0..=1e9;
    let mut ratings = Ratings {
        system: group.text("system"),
        plate_volts: group
            .optional_number("plate_volts", volts.clone())
            .map(Volts),
        screen_volts: None,
        plate_dissipation: group
            .optional_number("plate_watts", watts.clone())
            .map(Watts),
        screen_dissipation: None,
        cathode_current: group
            .optional_number("cathode_milliamperes", 1e-3..=1e6)
            .map(|ma| Amperes(ma * 1e-3)),
        grid_leak_fixed_bias: group
            .optional_number("grid_leak_ohms_fixed_bias", ohms.clone())
            .map(Ohms),
        grid_leak_cathode_bias: group
            .optional_number("grid_leak_ohms_cathode_bias", ohms)
            .map(Ohms),
        heater_cathode_volts: group
            .optional_number("heater_cathode_volts", volts.clone())
            .map(Volts),
        grid_volts_minimum: group
            .optional_number("grid_volts_minimum", -1e5..=0.0)
            .map(Volts),
    };
    if kind == TubeKind::Pentode {
        ratings.screen_volts = group.optional_number("screen_volts", volts).map(Volts);
        ratings.screen_dissipation = group.optional_number("screen_watts", watts).map(Watts);
    }
    ratings
}

fn fitted_range(group: &mut Reader, kind: TubeKind) -> FittedRange {
    let mut volts = |key| {
        let (low, high) = group.pair(key, -1e5..=1e5);
        Span {
            low: Volts(low),
            high: Volts(high),
        }
    };
    let plate_volts = volts("plate_volts");
    let grid_volts = volts("grid_volts");
    let screen_volts = (kind == TubeKind::Pentode).then(|| volts("screen_volts"));
    let (low, high) = group.pair("plate_milliamperes", 0.0..=1e6);
    FittedRange {
        plate_volts,
        screen_volts,
        grid_volts,
        plate_current: Span {
            low: Amperes(low * 1e-3),
            high: Amperes(high * 1e-3),
        },
    }
}

/// What is wrong with a law, tried on a coarse grid of volts: plate current not finite, negative, or falling.
fn misbehavior(law: &Law) -> Option<String> {
    const PLATE: [f64; 10] = [
        0.5, 2.0, 10.0, 30.0, 60.0, 100.0, 200.0, 350.0, 600.0, 1000.0,
    ];
    const SCREEN: [f64; 4] = [20.0, 100.0, 250.0, 500.0];
    let grid = (-20..=10).map(|i: i32| f64::from(i) * f64::from(i.abs()) * 0.2);
    for v_gk in grid {
        for v_pk in PLATE {
            for v_sk in SCREEN {
                let c = match law {
                    Law::Triode(law) => law.currents(v_gk, v_pk),
                    Law::Pentode(law) => law.currents(v_gk, v_sk, v_pk),
                };
                let held = c.ip >= 0.0 && c.is >= 0.0 && c.ip_g >= 0.0 && c.ip_p >= 0.0;
                if !(held && c.ip.is_finite() && c.is.is_finite()) {
                    return Some(format!(
                        "plate and screen current must be zero or more, and plate current must rise with grid and plate volts; \
                         at grid {v_gk} V, screen {v_sk} V, plate {v_pk} V the law gives {:.3e} A and {:.3e} A, \
                         slopes {:.3e} A/V and {:.3e} A/V",
                        c.ip, c.is, c.ip_g, c.ip_p
                    ));
                }
            }
        }
    }
    None
}
