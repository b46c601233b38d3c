//! Every tone at every level of every gain setting.

use super::{Sheet, names, number};
use crate::stage::operating_point::StagePoint;
use crate::study::result::RenderStudy;
use crate::trial::figures::{LevelFigures, StageLevel};

/// One row for each gain setting, tone and input level.
///
/// Levels at the jack, output at the loudspeaker terminals into the rated resistance. Harmonics 2 and 3 of
/// each stage are signed percent of the fundamental at its plate.
pub fn levels_csv(study: &RenderStudy) -> String {
    let mut header = names(&[
        "gain_setting",
        "nominal_hz",
        "tone_hz",
        "input_v_peak",
        "output_v_rms",
        "output_w",
        "gain_db",
        "thd_percent",
        "thd_total_percent",
    ]);
    header.extend((2..=10).map(|n| format!("h{n}_dbc")));
    header.push("settled".into());
    for stage in &study.point.stages {
        for column in STAGE_COLUMNS {
            header.push(format!("{}_{column}", stage.name));
        }
    }
    let mut sheet = Sheet::new(&header);
    for gain in &study.gain_settings {
        for tone in &gain.tones {
            for level in &tone.levels {
                let mut row = vec![
                    number(gain.setting),
                    number(tone.nominal_hz),
                    number(tone.tone_hz),
                ];
                row.extend(cells(level, &study.point.stages));
                sheet.row(&row);
            }
        }
    }
    sheet.text()
}

const STAGE_COLUMNS: [&str; 6] = [
    "bias_shift_v",
    "h2_percent",
    "h3_percent",
    "plate_v_peak",
    "plate_w",
    "screen_w",
];

fn cells(level: &LevelFigures, stages: &[StagePoint]) -> Vec<String> {
    let harmonics = level.harmonics.as_ref().ok();
    let mut row = vec![
        number(level.input_v_peak),
        number(level.output_v_rms),
        number(level.output_w),
        number(level.gain_db.ok()),
        number(harmonics.map(|h| h.thd_percent)),
        number(harmonics.map(|h| h.thd_total_percent)),
    ];
    row.extend((2..=10).map(|n| number(harmonics.and_then(|h| h.dbc(n)))));
    row.push(level.settled.to_string());
    for (k, stage) in stages.iter().enumerate() {
        let of = |read: fn(&StageLevel) -> Option<f64>| number(level.stages.get(k).and_then(read));
        row.extend([
            of(|s| Some(s.bias_shift_v)),
            of(|s| s.h2_percent.ok()),
            of(|s| s.h3_percent.ok()),
            of(|s| Some(s.plate_v_peak)),
            of(|s| Some(s.plate_watts)),
            match stage.screen_watts {
                Some(_) => of(|s| Some(s.screen_watts)),
                None => String::new(),
            },
        ]);
    }
    row
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::report::sample;

    fn read(study: &RenderStudy) -> (Vec<String>, Vec<Vec<String>>) {
        let text = levels_csv(study);
        let mut reader = csv::Reader::from_reader(text.as_bytes());
        let header = reader.headers().unwrap().iter().map(Into::into).collect();
        let rows = reader
            .records()
            .map(|r| r.unwrap().iter().map(Into::into).collect())
            .collect();
        (header, rows)
    }

    #[test]
    fn there_is_a_row_for_every_gain_setting_tone_and_level() {
        let study = sample::render();
        let (header, rows) = read(&study);
        assert_eq!(rows.len(), 3 * 3 * 25);
        assert_eq!(header.len(), 9 + 9 + 1 + 2 * 6);
        let column = |name: &str| header.iter().position(|h| h == name).unwrap();
        let level = &study.gain_settings[1].tones[2].levels[7];
        let row = &rows[25 * (3 + 2) + 7];
        let cell = |name: &str| row[column(name)].parse::<f64>().unwrap();
        let harmonics = level.harmonics.as_ref().unwrap();
        assert_eq!(cell("gain_setting"), 5.0);
        assert_eq!(cell("nominal_hz"), 220.0);
        assert_eq!(cell("input_v_peak"), level.input_v_peak);
        assert_eq!(cell("thd_percent"), harmonics.thd_percent);
        assert_eq!(cell("h10_dbc"), harmonics.dbc(10).unwrap());
        assert_eq!(cell("power_screen_w"), level.stages[1].screen_watts);
        assert_eq!(row[column("settled")], "true");
    }

    #[test]
    fn missing_figures_are_empty_cells() {
        let (header, rows) = read(&sample::render_without_figures());
        let column = |name: &str| header.iter().position(|h| h == name).unwrap();
        for name in [
            "gain_setting",
            "gain_db",
            "thd_percent",
            "h2_dbc",
            "h10_dbc",
            "first_h2_percent",
        ] {
            assert!(
                rows.iter().all(|row| row[column(name)].is_empty()),
                "{name}"
            );
        }
        assert_eq!(rows[0][column("settled")], "false");
        assert!(!rows[0][column("power_plate_w")].is_empty());
        assert!(
            rows[0][column("first_screen_w")].is_empty(),
            "a triode has no screen"
        );
    }
}
