//! One stage's transfer curve and plate diagram.

use super::result::CurveStudy;
use super::{StudyFault, warnings};
use crate::stage::amplifier::Amplifier;
use crate::stage::operating_point::operating_point;
use crate::stage::resolve::Prepared;
use crate::stage::transfer::{plate_diagram, transfer_curve};
use crate::stage::wiring::LoadKind;

/// Curves of stage `k` at the highest gain setting, on the rated load.
///
/// # Errors
/// [`StudyFault::NotSettled`] when the circuit has no rest.
pub fn study(prepared: &Prepared, k: usize) -> Result<CurveStudy, StudyFault> {
    let design = &prepared.design;
    let gain = design
        .control
        .gain
        .map(|_| design.control.settings.iter().copied().fold(0.0, f64::max));
    let amp = Amplifier::solve(
        design,
        &prepared.devices,
        &prepared.iron,
        gain,
        LoadKind::Rated,
    )?;
    let stage = &design.stages[k].name;
    Ok(CurveStudy {
        design: design.name.clone(),
        stage: stage.clone(),
        tube: prepared.devices[k].tube().name.clone(),
        transfer: transfer_curve(&amp, k),
        diagram: plate_diagram(&amp, k),
        warnings: warnings::of_design(prepared, &operating_point(&amp))
            .into_iter()
            .filter(|w| w.place == *stage)
            .collect(),
    })
}
