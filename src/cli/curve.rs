//! `forehear curve`

use super::args::Curve;
use super::bias::stop;
use super::console::Console;
use super::fault::{Failure, Stop};
use super::interrupt::{begin_writing, check_stop};
use super::output::{Existing, Output};
use super::source::{self, Loaded};
use forehear::diagnostic::{Code, nearest};
use forehear::report::csv::{plate_csv, transfer_csv};
use forehear::report::json::curve_document;
use forehear::report::svg::{plate_svg, transfer_svg};
use forehear::report::terminal::curve_text;
use forehear::study::curve;
use forehear::study::result::CurveStudy;

pub fn run(args: &Curve, console: Console) -> Result<(), Stop> {
    let design = source::load(&args.design)?;
    let mut studies = Vec::new();
    for k in stages(&design, args.stage.as_deref())? {
        check_stop()?;
        studies
            .push(curve::study(&design.prepared, k).map_err(|fault| stop(&design.name, &fault))?);
    }
    check_stop()?;
    let mut written = Vec::new();
    if let Some(folder) = &args.out {
        let files = files(&design.stem, &studies);
        let names: Vec<String> = files.iter().map(|(name, _)| name.clone()).collect();
        let mut output = Output::open(folder, Existing::Refuse, &names)?;
        begin_writing()?;
        for (name, text) in &files {
            output.add_text(name, text)?;
        }
        output.commit()?;
        written = names
            .iter()
            .map(|name| folder.join(name).display().to_string())
            .collect();
    }
    console.answer(
        || curve_document(&studies, &written),
        |page| curve_text(&studies, &written, page),
    )
}

/// Numbers of the stages asked for.
fn stages(design: &Loaded, wanted: Option<&str>) -> Result<Vec<usize>, Failure> {
    let stages = &design.prepared.design.stages;
    let Some(wanted) = wanted else {
        return Ok((0..stages.len()).collect());
    };
    match stages.iter().position(|s| s.name == wanted) {
        Some(k) => Ok(vec![k]),
        None => {
            let names = stages.iter().map(|s| s.name.as_str());
            let hint = match nearest(wanted, names.clone()) {
                Some(near) => format!("did you mean `{near}`?"),
                None => format!("its stages are {}", names.collect::<Vec<_>>().join(", ")),
            };
            Err(Failure::of(
                "--stage",
                Code::UnknownName,
                format!("the design {} has no stage `{wanted}`", design.name),
                Some(hint),
            ))
        }
    }
}

/// Names and contents of the files: the sheets hold all stages, each stage has two pictures.
fn files(stem: &str, studies: &[CurveStudy]) -> Vec<(String, String)> {
    let mut files = vec![
        (format!("{stem}-transfer.csv"), transfer_csv(studies)),
        (format!("{stem}-plate-curves.csv"), plate_csv(studies)),
    ];
    for study in studies {
        let stage = &study.stage;
        let transfer = transfer_svg(&study.design, std::slice::from_ref(&study.transfer));
        files.push((format!("{stem}-{stage}-transfer.svg"), transfer));
        files.push((format!("{stem}-{stage}-plate-curves.svg"), plate_svg(study)));
    }
    files
}
