//! Transfer curves and plate diagrams.

use super::entry::{Nullable, objects};
use super::point::{WarningEntry, warnings};
use super::{SCHEMA, written};
use crate::study::result::{CurveStudy, PlateDiagram};

objects! {
    Curves {
        schema: u32,
        kind: &'static str,
        design: String,
        warnings: Vec<WarningEntry>,
        stages: Vec<StageCurve>,
        files: Vec<String>,
    }
    StageCurve {
        stage: String,
        tube: String,
        drive_ohms: f64,
        limits: Vec<Limit>,
        transfer: Vec<Transfer>,
        plate_diagram: Diagram,
    }
    Limit {
        limit: String,
        drive_v: f64,
    }
    /// Drive and plate re rest, grid to cathode.
    Transfer {
        drive_v: f64,
        grid_to_cathode_v: f64,
        plate_v: f64,
        plate_a: f64,
        grid_a: f64,
        relative_gain: f64,
    }
    /// Plate volts to the cathode.
    Diagram {
        operating: PlatePoint,
        screen_to_cathode_v: Nullable<f64>,
        dissipation_limit_w: Nullable<f64>,
        plate_limit_v: Nullable<f64>,
        direct_load_line: Vec<PlatePoint>,
        alternating_load_line: Vec<PlatePoint>,
        plate_curves: Vec<PlateCurve>,
    }
    PlateCurve {
        grid_to_cathode_v: f64,
        points: Vec<PlatePoint>,
    }
    PlatePoint {
        plate_v: f64,
        plate_a: f64,
    }
}

/// What `forehear curve` found, one entry a stage, as JSON.
pub fn curve_document(studies: &[CurveStudy], files: &[String]) -> String {
    let mut all = Vec::new();
    for warning in studies.iter().flat_map(|s| &s.warnings) {
        if !all.contains(warning) {
            all.push(warning.clone());
        }
    }
    written(&Curves {
        schema: SCHEMA,
        kind: "curve",
        design: studies
            .first()
            .map_or_else(String::new, |s| s.design.clone()),
        warnings: warnings(&all),
        stages: studies.iter().map(stage).collect(),
        files: files.to_vec(),
    })
}

fn stage(study: &CurveStudy) -> StageCurve {
    let t = &study.transfer;
    StageCurve {
        stage: study.stage.clone(),
        tube: study.tube.clone(),
        drive_ohms: t.drive_ohms,
        limits: t
            .limits
            .iter()
            .map(|(limit, drive_v)| Limit {
                limit: limit.clone(),
                drive_v: *drive_v,
            })
            .collect(),
        transfer: t
            .points
            .iter()
            .map(|p| Transfer {
                drive_v: p.drive_v,
                grid_to_cathode_v: p.v_gk,
                plate_v: p.plate_v,
                plate_a: p.plate_a,
                grid_a: p.grid_a,
                relative_gain: p.relative_gain,
            })
            .collect(),
        plate_diagram: diagram(&study.diagram),
    }
}

fn diagram(d: &PlateDiagram) -> Diagram {
    Diagram {
        operating: plate_point(&d.operating),
        screen_to_cathode_v: d.screen_volts.ok_or("no-screen"),
        dissipation_limit_w: d.dissipation_w.ok_or("not-known"),
        plate_limit_v: d.plate_volts_limit.ok_or("not-known"),
        direct_load_line: d.direct_line.iter().map(plate_point).collect(),
        alternating_load_line: d.alternating_line.iter().map(plate_point).collect(),
        plate_curves: d
            .curves
            .iter()
            .map(|(grid, points)| PlateCurve {
                grid_to_cathode_v: *grid,
                points: points.iter().map(plate_point).collect(),
            })
            .collect(),
    }
}

fn plate_point(&(plate_v, plate_a): &(f64, f64)) -> PlatePoint {
    PlatePoint { plate_v, plate_a }
}
