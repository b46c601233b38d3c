//! Transfer curves in a few lines each.

use super::page::Page;
use crate::report::on_curve::at;
use crate::report::phrase::short;
use crate::study::result::{CurveStudy, TransferCurve};
use crate::units::notation::engineering;

/// Where each stage rests, how much drive each limit takes, and the swing there.
pub fn curve_text(studies: &[CurveStudy], files: &[String], page: &Page) -> String {
    let mut warnings = Vec::new();
    for warning in studies.iter().flat_map(|s| &s.warnings) {
        if !warnings.contains(warning) {
            warnings.push(warning.clone());
        }
    }
    let mut out = page.alerts(&[], &warnings);
    for study in studies {
        let d = &study.diagram;
        out += &page.paragraph(
            &format!(
                "{}, stage {} ({}): rests at {} and {}{}; grid driven through {}.",
                study.design,
                study.stage,
                study.tube,
                engineering(d.operating.0, "V"),
                engineering(d.operating.1, "A"),
                d.screen_volts.map_or(String::new(), |v| format!(
                    ", screen {}",
                    engineering(v, "V")
                )),
                engineering(study.transfer.drive_ohms, "Ω"),
            ),
            0,
        );
        out += &page.table(
            "<>>>>>",
            &[
                "limit",
                "drive",
                "grid to\ncathode",
                "plate\nre rest",
                "plate\ncurrent",
                "gain\nre rest",
            ],
            rows(&study.transfer),
        );
        out.push('\n');
    }
    if !files.is_empty() {
        out += &page.paragraph(&format!("Written: {}", files.join(", ")), 2);
    }
    out
}

fn rows(curve: &TransferCurve) -> Vec<Vec<String>> {
    let mut limits: Vec<_> = curve.limits.iter().collect();
    limits.sort_by(|a, b| a.1.total_cmp(&b.1));
    let row = |(name, drive): &(String, f64)| {
        let mut row = vec![name.replace('-', " "), signed(*drive)];
        match at(&curve.points, *drive) {
            Some(p) => row.extend([
                signed(p.v_gk),
                signed(p.plate_v),
                short(p.plate_a, "A"),
                short(p.relative_gain, ""),
            ]),
            None => row.extend([
                "outside the curve".into(),
                String::new(),
                String::new(),
                String::new(),
            ]),
        }
        row
    };
    limits.into_iter().map(row).collect()
}

fn signed(volts: f64) -> String {
    let text = short(volts, "V");
    if volts > 0.0 {
        format!("+{text}")
    } else {
        text
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::report::sample;

    #[test]
    fn limits_stand_in_order_of_drive_with_the_curve_there() {
        let out = curve_text(&[sample::curve(0)], &["first.svg".into()], &Page::default());
        let order = [
            "\ncutoff",
            "\nrest ",
            "\ngrid conduction",
            "\nplate knee",
            "first.svg",
        ];
        let found: Vec<_> = order.iter().map(|w| out.find(w).expect(w)).collect();
        assert!(found.is_sorted(), "{out}");
        assert!(out.contains("220 kΩ"));
    }
}
