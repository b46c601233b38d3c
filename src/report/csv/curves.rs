//! Transfer curves and plate curves.

use super::{Sheet, names, number};
use crate::study::result::CurveStudy;

/// Points of the transfer curves: drive and plate re rest, grid to cathode.
pub fn transfer_csv(studies: &[CurveStudy]) -> String {
    let mut sheet = Sheet::new(&names(&[
        "stage",
        "drive_v",
        "grid_to_cathode_v",
        "plate_v",
        "plate_a",
        "grid_a",
        "relative_gain",
    ]));
    for study in studies {
        for p in &study.transfer.points {
            sheet.row(&[
                study.stage.clone(),
                number(p.drive_v),
                number(p.v_gk),
                number(p.plate_v),
                number(p.plate_a),
                number(p.grid_a),
                number(p.relative_gain),
            ]);
        }
    }
    sheet.text()
}

/// Points of the plate curves and load lines, plate volts to the cathode.
///
/// Column `line` is `plate-curve` (then with its grid volts), `direct-load`, `alternating-load` or `operating-point`.
pub fn plate_csv(studies: &[CurveStudy]) -> String {
    let mut sheet = Sheet::new(&names(&[
        "stage",
        "line",
        "grid_to_cathode_v",
        "plate_to_cathode_v",
        "plate_a",
    ]));
    for study in studies {
        let d = &study.diagram;
        let mut line = |line: &str, grid: Option<f64>, points: &[(f64, f64)]| {
            for &(volts, amperes) in points {
                sheet.row(&[
                    study.stage.clone(),
                    line.to_owned(),
                    number(grid),
                    number(volts),
                    number(amperes),
                ]);
            }
        };
        for (grid, points) in &d.curves {
            line("plate-curve", Some(*grid), points);
        }
        line("direct-load", None, &d.direct_line);
        line("alternating-load", None, &d.alternating_line);
        line("operating-point", None, &[d.operating]);
    }
    sheet.text()
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::report::sample;

    #[test]
    fn all_points_of_all_stages_are_there() {
        let studies = [sample::curve(0), sample::curve(1)];
        let text = transfer_csv(&studies);
        assert_eq!(text.lines().count(), 1 + 2 * 161);
        assert!(text.lines().nth(1).unwrap().starts_with("first,-4,"));
        let text = plate_csv(&studies);
        assert_eq!(text.lines().count(), 1 + (9 + 7) * 81 + 2 * (2 + 2 + 1));
        assert!(text.contains("\npower,operating-point,,244.3,0.0412\n"));
    }

    #[test]
    fn a_name_with_a_comma_stays_one_cell() {
        let mut study = sample::curve(0);
        study.stage = "first, left".into();
        let text = transfer_csv(&[study]);
        let mut reader = csv::Reader::from_reader(text.as_bytes());
        let row = reader.records().next().unwrap().unwrap();
        assert_eq!(&row[0], "first, left");
        assert_eq!(row.len(), 7);
    }
}
