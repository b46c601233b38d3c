//! What a tube's entry holds, as names, values and units.

use crate::tube::{Law, Span, Tube, TubeKind};

/// Name, value, unit symbol (empty: a plain number).
pub type Group = Vec<(&'static str, f64, &'static str)>;

pub fn kind(kind: TubeKind) -> &'static str {
    match kind {
        TubeKind::Triode => "triode",
        TubeKind::Pentode => "pentode",
    }
}

/// Parameters of the current law.
pub fn law(tube: &Tube) -> Group {
    match &tube.law {
        Law::Triode(law) => {
            let p = law.parameters();
            vec![
                ("amplification-factor", p.amplification_factor, ""),
                ("current-exponent", p.current_exponent, ""),
                ("inverse-perveance", p.inverse_perveance, "V^x/A"),
                ("cutoff-sharpness", p.cutoff_sharpness, ""),
                ("softness-floor", p.softness_floor, "V²"),
                ("contact-volts", p.contact_volts, "V"),
                ("low-plate-volts", p.low_plate_volts, "V"),
                ("low-plate-growth", p.low_plate_growth, "V/V"),
            ]
        }
        Law::Pentode(law) => {
            let p = law.parameters();
            let mut group = vec![
                (
                    "screen-amplification-factor",
                    p.screen_amplification_factor,
                    "",
                ),
                ("current-exponent", p.current_exponent, ""),
                ("inverse-perveance", p.inverse_perveance, "V^x/A"),
                ("cutoff-sharpness", p.cutoff_sharpness, ""),
                ("contact-volts", p.contact_volts, "V"),
                ("plate-penetration", p.plate_penetration, ""),
                ("division-ratio", p.division_ratio, ""),
                ("division-exponent", p.division_exponent, ""),
                (
                    "limit-current-at-ten-volts",
                    p.limit_current_at_ten_volts,
                    "A",
                ),
                ("knee-sharpness", p.knee_sharpness, ""),
                ("returned-share", p.returned_share, ""),
            ];
            if let Some(second) = &p.second_section {
                group.push(("second-section-share", second.share, ""));
                group.push((
                    "second-section-amplification-ratio",
                    second.amplification_ratio,
                    "",
                ));
            }
            group
        }
    }
}

/// Parameters of the grid-current law.
pub fn grid_current(tube: &Tube) -> Group {
    let p = tube.grid_law.parameters();
    vec![
        ("perveance", p.perveance, "A/V^x"),
        ("current-exponent", p.current_exponent, ""),
        ("plate-exponent", p.plate_exponent, ""),
        ("onset-volts", p.onset_volts, "V"),
        ("onset-sharpness", p.onset_sharpness, "1/V"),
    ]
}

/// Every rating, known or not.
pub fn ratings(tube: &Tube) -> Vec<(&'static str, Option<f64>, &'static str)> {
    let r = &tube.ratings;
    let mut all = vec![
        ("plate-volts", r.plate_volts.map(|v| v.0), "V"),
        ("plate-dissipation", r.plate_dissipation.map(|w| w.0), "W"),
    ];
    if tube.kind() == TubeKind::Pentode {
        all.push(("screen-volts", r.screen_volts.map(|v| v.0), "V"));
        all.push(("screen-dissipation", r.screen_dissipation.map(|w| w.0), "W"));
    }
    all.extend([
        ("cathode-current", r.cathode_current.map(|a| a.0), "A"),
        (
            "grid-leak-fixed-bias",
            r.grid_leak_fixed_bias.map(|o| o.0),
            "Ω",
        ),
        (
            "grid-leak-cathode-bias",
            r.grid_leak_cathode_bias.map(|o| o.0),
            "Ω",
        ),
        (
            "heater-cathode-volts",
            r.heater_cathode_volts.map(|v| v.0),
            "V",
        ),
        ("grid-volts-minimum", r.grid_volts_minimum.map(|v| v.0), "V"),
    ]);
    all
}

/// Of one section, without socket.
pub fn capacitances(tube: &Tube) -> Group {
    let c = &tube.capacitances;
    vec![
        ("grid-plate", c.grid_plate, "F"),
        ("grid-cathode", c.grid_cathode, "F"),
        ("plate-cathode", c.plate_cathode, "F"),
    ]
}

/// Where the data lay, to the cathode.
pub fn fitted_range(tube: &Tube) -> Vec<(&'static str, Span<f64>, &'static str)> {
    let f = &tube.fitted_range;
    let volts = |s: &Span<crate::units::Volts>| Span {
        low: s.low.0,
        high: s.high.0,
    };
    let mut all = vec![("plate-volts", volts(&f.plate_volts), "V")];
    if let Some(screen) = &f.screen_volts {
        all.push(("screen-volts", volts(screen), "V"));
    }
    all.push(("grid-volts", volts(&f.grid_volts), "V"));
    all.push((
        "plate-current",
        Span {
            low: f.plate_current.low.0,
            high: f.plate_current.high.0,
        },
        "A",
    ));
    all
}
