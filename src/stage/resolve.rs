//! Names become tubes, labels become iron; what cannot is said with its place.

use std::sync::Arc;

use super::iron::{self, Iron};
use crate::design::{Connection, Design, Places};
use crate::diagnostic::{Code, Diagnostic};
use crate::tube::{Catalog, Device, Tube, TubeKind};

/// A design with its tubes and its iron, ready to be solved.
#[derive(Clone, Debug)]
pub struct Prepared {
    pub design: Design,
    pub devices: Vec<Device>,
    pub iron: Iron,
}

/// Finds every tube of a design and derives its iron.
///
/// `own(name)` gives tubes that the builder keeps in files of his own; other names are the catalog's.
///
/// # Errors
/// All faults at once: tubes nobody knows (with the nearest name), screens missing or without effect,
/// connections a tube cannot have, a transformer label that contradicts itself.
pub fn prepare(
    design: &Design,
    places: &Places,
    catalog: &Catalog,
    own: &dyn Fn(&str) -> Option<Arc<Tube>>,
) -> Result<Prepared, Vec<Diagnostic>> {
    let mut faults = Vec::new();
    let mut fault = |code: Code, path: String, message: String, hint: Option<String>| {
        let place = places.of(&path);
        faults.push(Diagnostic {
            code,
            path,
            place,
            message,
            hint,
        });
    };
    let mut devices = Vec::new();
    for stage in &design.stages {
        let base = format!("stage.{}", stage.name);
        let Some(tube) = own(&stage.tube).or_else(|| catalog.find(&stage.tube)) else {
            let hint = catalog
                .nearest(&stage.tube)
                .map(|n| format!("the nearest in the catalog is `{n}`"))
                .unwrap_or_else(|| format!("the catalog has {}", catalog.names().join(", ")));
            fault(
                Code::UnknownTube,
                format!("{base}.tube"),
                format!("no tube `{}` is known", stage.tube),
                Some(format!(
                    "{hint}; a tube file of your own is named by a path ending in .toml"
                )),
            );
            continue;
        };
        let is_pentode = tube.kind() == TubeKind::Pentode;
        let triode_connected = stage.connection == Some(Connection::Triode);
        if !is_pentode && stage.connection == Some(Connection::Pentode) {
            fault(
                Code::ConflictingKeys,
                format!("{base}.connection"),
                format!("{} is a triode and has no pentode connection", tube.name),
                Some("leave `connection` out, or write \"triode\"".into()),
            );
        }
        if is_pentode && !triode_connected && stage.screen.is_none() {
            fault(
                Code::ScreenMissing,
                base.clone(),
                format!("{} has a screen, and nothing feeds it", tube.name),
                Some("add [stage.screen] with a rail, or connection = \"triode\"".into()),
            );
        }
        if stage.screen.is_some() && (!is_pentode || triode_connected) {
            let why = if is_pentode {
                "is connected as a triode"
            } else {
                "is a triode"
            };
            fault(
                Code::ScreenWithoutEffect,
                format!("{base}.screen"),
                format!("{} {why}: a screen supply has no effect", tube.name),
                Some("leave [stage.screen] out".into()),
            );
        }
        devices.push(Device::new(&tube, triode_connected, stage.parallel));
    }
    let iron = match iron::from_label(&design.transformer) {
        Ok(iron) => Some(iron),
        Err(e) => {
            fault(
                Code::LabelContradiction,
                "transformer".into(),
                e.to_string(),
                Some("check the corner, the capacitance and the copper of the label".into()),
            );
            None
        }
    };
    match iron {
        Some(iron) if faults.is_empty() => Ok(Prepared {
            design: design.clone(),
            devices,
            iron,
        }),
        _ => Err(faults),
    }
}
