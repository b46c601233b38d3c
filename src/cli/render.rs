//! `forehear render`

use std::io;

use super::args::Render;
use super::bias::stop;
use super::console::{Console, Progress};
use super::fault::{Failure, Stop};
use super::interrupt::{STOP, begin_writing, check_stop};
use super::output::Output;
use super::plan::{LEVELS_FILE, REPORT_FILE, RenderPlan, encoding};
use forehear::diagnostic::Code;
use forehear::report::csv::levels_csv;
use forehear::report::json::render_document;
use forehear::report::svg::{distortion_svg, harmonics_svg, response_svg, transfer_svg};
use forehear::report::terminal::{WrittenSet, render_text};
use forehear::study::render::{Sound, study};
use forehear::study::result::RenderStudy;
use forehear::study::{StudyFault, Watch};
use forehear::wav::{self, WriteFault};

/// Draws what a render found.
type Draw = fn(&RenderStudy) -> String;

/// Pictures of a set.
const PICTURES: [(&str, Draw); 4] = [
    ("transfer.svg", |study| {
        transfer_svg(&study.design, &study.transfer)
    }),
    ("thd.svg", distortion_svg),
    ("harmonics.svg", harmonics_svg),
    ("response.svg", response_svg),
];

pub fn run(args: &Render, console: Console) -> Result<(), Stop> {
    let plan = RenderPlan::new(args)?;
    let files = file_names(&plan);
    let mut output = Output::open(&plan.folder, plan.existing, &files)?;
    let progress = console.progress();
    let (mut result, sounds) = render(&plan, &progress)?;
    for (gain, (terminals, listening)) in result.gain_settings.iter_mut().zip(&plan.sounds) {
        gain.wav = Some(terminals.clone());
        gain.listening_wav = Some(listening.clone());
    }
    result.warnings.extend(plan.odd.iter().cloned());

    begin_writing()?;
    progress.show(1.0, "writing");
    write_sounds(&mut output, &plan, &sounds)?;
    output.add_text(LEVELS_FILE, &levels_csv(&result))?;
    for (name, draw) in PICTURES {
        output.add_text(name, &draw(&result))?;
    }
    let report = render_document(&result, &files);
    output.add_text(REPORT_FILE, &report)?;
    let folder = output.folder().display().to_string();
    output.commit()?;
    drop(progress);

    console.alarm(&result.warnings);
    if console.json() {
        console.note(&format!("Written to {folder}"));
    }
    let set = WrittenSet {
        directory: &folder,
        files: &files,
    };
    console.answer(|| report, |page| render_text(&result, Some(&set), page))
}

/// Everything the set will hold, in the order of writing.
fn file_names(plan: &RenderPlan) -> Vec<String> {
    let mut names: Vec<String> = plan
        .sounds
        .iter()
        .flat_map(|(terminals, listening)| [terminals.clone(), listening.clone()])
        .collect();
    names.push(LEVELS_FILE.to_owned());
    names.extend(PICTURES.iter().map(|(name, _)| (*name).to_owned()));
    names.push(REPORT_FILE.to_owned());
    names
}

fn render(plan: &RenderPlan, progress: &Progress) -> Result<(RenderStudy, Vec<Sound>), Stop> {
    let watch = Watch {
        progress: &|share, what| progress.show(share, what),
        stop: &STOP,
    };
    let mut pool = rayon::ThreadPoolBuilder::new();
    if let Some(jobs) = plan.jobs {
        pool = pool.num_threads(jobs);
    }
    let pool = pool.build().map_err(|e| {
        Failure::of(
            "--jobs",
            Code::NotComputed,
            format!("no threads to work with: {e}"),
            None,
        )
    })?;
    let done = pool
        .install(|| study(&plan.design.prepared, &plan.take, &plan.study, &watch))
        .map_err(|fault| match fault {
            // Only the impulse response is brought to another rate.
            StudyFault::Resample(fault) => Failure::of(
                plan.study
                    .cabinet
                    .as_ref()
                    .map_or(&plan.design.name, |c| &c.name),
                Code::NotComputed,
                fault.to_string(),
                None,
            )
            .into(),
            other => stop(&plan.design.name, &other),
        })?;
    check_stop()?;
    Ok(done)
}

fn write_sounds(output: &mut Output, plan: &RenderPlan, sounds: &[Sound]) -> Result<(), Stop> {
    let mut n = 0;
    for (sound, (terminals, listening)) in sounds.iter().zip(&plan.sounds) {
        for (name, channels) in [(terminals, &sound.terminals), (listening, &sound.listening)] {
            let encoding = encoding(plan.format, n);
            n += 1;
            let written = output.add(name, |file| {
                wav::write(file, plan.take.rate, channels, encoding).map_err(|fault| match fault {
                    WriteFault::Io(cause) => cause,
                    other => io::Error::other(other),
                })
            })?;
            assert_eq!(
                written.clipped, 0,
                "a set scaled below full scale fits its files"
            );
        }
    }
    Ok(())
}
