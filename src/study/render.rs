//! A design heard and measured at its gain settings.

use std::sync::atomic::{AtomicUsize, Ordering};

use rayon::prelude::*;

use super::bias::{keep_worst, worst_driven};
use super::play::{MOST_LANES, Played, play};
use super::result::{DiFacts, GainFigures, RenderStudy};
use super::{BASE_RATE_HZ, StudyFault, Watch, warnings};
use crate::diagnostic::Code;
use crate::measure::envelope::take_level;
use crate::measure::loudness::loudness;
use crate::render::{Model, listening};
use crate::resample::resample_impulse_response;
use crate::stage::amplifier::Amplifier;
use crate::stage::operating_point::operating_point;
use crate::stage::ratings;
use crate::stage::resolve::Prepared;
use crate::stage::transfer::transfer_curve;
use crate::stage::wiring::LoadKind;
use crate::study::result::Warning;
use crate::trial::alias::{self, ALIAS_TONE_HZ};
use crate::trial::figures::{Figure, Missing};
use crate::trial::{response, tone};

/// A recording in volts at the jack.
#[derive(Clone, Debug)]
pub struct Take {
    pub name: String,
    pub rate: u32,
    /// Volts at the jack, one list per channel.
    pub channels: Vec<Vec<f64>>,
    /// Volts that digital full scale stands for.
    pub full_scale_v: f64,
}

/// An impulse response of a cabinet.
#[derive(Clone, Debug)]
pub struct Cabinet {
    pub name: String,
    pub rate: u32,
    pub samples: Vec<f64>,
}

/// What to render and measure.
#[derive(Clone, Debug)]
pub struct Plan {
    pub settings: Vec<f64>,
    pub test_level_v: f64,
    pub tone_hz: f64,
    pub oversample: usize,
    pub cabinet: Option<Cabinet>,
}

/// The sound of one gain setting, scaled to digital full scale.
#[derive(Clone, Debug)]
pub struct Sound {
    /// At the loudspeaker terminals, one list per channel.
    pub terminals: Vec<Vec<f64>>,
    /// As listened to.
    pub listening: Vec<Vec<f64>>,
}

/// Tones beside the headline one, in hertz: the lowest string's E and an A, where the iron shows.
pub const LOW_TONES_HZ: [f64; 2] = [82.4, 220.0];
/// Peak that the loudest file of a set reaches, in dB re full scale. Chosen: room for what lies between samples.
const HEADROOM_DBFS: f64 = -1.0;
/// A set whose loudest peak lies below this, in volts, is raised no further: silence stays silent. Chosen.
const SILENT_BELOW_V: f64 = 1e-3;
/// How far past onset the alias tone is played: 12 dB.
const ALIAS_DRIVE: f64 = 3.981_071_705_534_972_5;
/// A take that peaks below this, in dB re full scale, or above the next, is warned of. Chosen.
const DI_PEAK_DBFS: (f64, f64) = (-30.0, -1.0);
/// Surfaces cover inputs up to this multiple of the take's peak, for what lies between samples.
const PEAK_MARGIN: f64 = 1.5;

/// Measures every gain setting and plays the take through it.
///
/// Figures stand on the rated resistance at 48 kHz times the oversampling; the sound is played into the
/// design's loudspeaker where it has one, at the take's own rate times the oversampling. One factor scales
/// the whole set, so that level relations between gain settings survive.
///
/// # Errors
/// [`StudyFault`] when the circuit has no rest, a sample is not finite, or on interruption.
pub fn study(
    prepared: &Prepared,
    take: &Take,
    plan: &Plan,
    watch: &Watch,
) -> Result<(RenderStudy, Vec<Sound>), StudyFault> {
    let design = &prepared.design;
    let settings: Vec<Option<f64>> = match design.control.gain {
        Some(_) => plan.settings.iter().map(|s| Some(*s)).collect(),
        None => vec![None],
    };
    let solve = |setting: Option<f64>, load| {
        Amplifier::solve(design, &prepared.devices, &prepared.iron, setting, load)
    };
    (watch.progress)(0.0, "operating point");
    let rated: Vec<Amplifier> = settings
        .iter()
        .map(|s| solve(*s, LoadKind::Rated))
        .collect::<Result<_, _>>()?;
    let point = operating_point(&rated[0]);
    let figure_rate = BASE_RATE_HZ * plan.oversample as f64;

    let tones: Vec<f64> = std::iter::once(plan.tone_hz)
        .chain(
            LOW_TONES_HZ
                .into_iter()
                .filter(|hz| (hz / plan.tone_hz - 1.0).abs() > 0.01),
        )
        .collect();
    let jobs: Vec<(usize, usize)> = (0..settings.len())
        .flat_map(|s| (0..tones.len()).map(move |t| (s, t)))
        .collect();
    let models: Vec<Model> = rated
        .par_iter()
        .map(|amp| {
            Model::new(
                amp,
                figure_rate,
                tone::HIGHEST_LEVEL_V.max(plan.test_level_v),
            )
            .map_err(StudyFault::from)
        })
        .collect::<Result<_, _>>()?;
    let measured = AtomicUsize::new(0);
    let parts = jobs.len() as f64;
    let figures: Vec<_> = jobs
        .par_iter()
        .map(|&(s, t)| {
            watch.check()?;
            let f = tone::run(&rated[s], &models[s], tones[t], plan.test_level_v);
            let done = measured.fetch_add(1, Ordering::Relaxed) + 1;
            (watch.progress)(0.6 * done as f64 / parts, "measuring");
            Ok(f)
        })
        .collect::<Result<_, StudyFault>>()?;

    let sounding = if design.load.loudspeaker.is_some() {
        LoadKind::Loudspeaker
    } else {
        LoadKind::Rated
    };
    let (played, strayed) = play_all(prepared, take, plan, &settings, sounding, watch)?;

    let mut figures = figures.into_iter();
    let mut gains: Vec<GainFigures> = Vec::new();
    for (s, setting) in settings.iter().enumerate() {
        watch.check()?;
        let tones: Vec<_> = figures.by_ref().take(tones.len()).collect();
        let level = match &tones[0].onset {
            Ok(o) => (ALIAS_DRIVE * o.input_v_peak).min(tone::HIGHEST_LEVEL_V),
            Err(_) => plan.test_level_v,
        };
        gains.push(GainFigures {
            setting: *setting,
            wav: None,
            listening_wav: None,
            tones,
            response: response::response(&rated[s]),
            alias: alias::measure(&models[s], ALIAS_TONE_HZ, level, BASE_RATE_HZ),
            loudness_lufs: Err(Missing::NoSignal),
            output_peak_v: peak(&played[s].terminals),
            bias_excursion_v: played[s].excursion.clone(),
        });
    }
    (watch.progress)(0.95, "listening copies");
    let (sounds, scale) = scale_set(played, take, plan)?;
    for (gain, sound) in gains.iter_mut().zip(&sounds) {
        gain.loudness_lufs = loudness_of(&sound.listening, take.rate);
    }

    let mut checks = ratings::at_idle(&rated[0], &point);
    let mut driven = Vec::new();
    for (amp, gain) in rated.iter().zip(&gains) {
        for tone in &gain.tones {
            for check in worst_driven(amp, &tone.levels, gain.setting) {
                keep_worst(&mut driven, check);
            }
        }
    }
    checks.extend(driven);
    let di = di_facts(take);
    let mut found = warnings::of_ratings(&checks);
    found.extend(warnings::of_design(prepared, &point));
    found.extend(warnings::of_figures(prepared, &gains));
    found.extend(di_warnings(take, &di));
    if strayed > 0 {
        found.push(Warning {
            code: Code::SurfaceLeft,
            place: "render".into(),
            message: format!("at {strayed} steps a stage was driven past its solved surface; the sound there is a straight continuation"),
        });
    }
    let transfer = (0..rated[0].devices.len())
        .map(|k| transfer_curve(&rated[0], k))
        .collect();
    (watch.progress)(1.0, "done");
    Ok((
        RenderStudy {
            design: design.name.clone(),
            description: design.description.clone(),
            full_scale_v_peak: take.full_scale_v,
            test_level_v_peak: plan.test_level_v,
            tone_hz: gains[0].tones[0].tone_hz,
            oversample: plan.oversample,
            rate_hz: figure_rate,
            di,
            scale_db: 20.0 * scale.log10(),
            wav_full_scale_v_peak: 1.0 / scale,
            load_ohms: design.load.resistance.0,
            render_load: match sounding {
                LoadKind::Loudspeaker => "loudspeaker".into(),
                LoadKind::Rated => "resistance".into(),
            },
            listening: match &plan.cabinet {
                Some(c) => format!("impulse response {}", c.name),
                None => format!(
                    "plain band-limit, {:.0} Hz to {:.0} Hz",
                    listening::LISTENING_BAND_HZ.0,
                    listening::LISTENING_BAND_HZ.1
                ),
            },
            point,
            ratings: checks,
            gain_settings: gains,
            transfer,
            warnings: found,
        },
        sounds,
    ))
}

struct SettingPlayed {
    terminals: Vec<Vec<f64>>,
    excursion: Vec<(f64, f64)>,
}

/// Plays every channel through every setting; groups of lanes and channels side by side in threads.
fn play_all(
    prepared: &Prepared,
    take: &Take,
    plan: &Plan,
    settings: &[Option<f64>],
    load: LoadKind,
    watch: &Watch,
) -> Result<(Vec<SettingPlayed>, u64), StudyFault> {
    let rate = f64::from(take.rate) * plan.oversample as f64;
    let top = take
        .channels
        .iter()
        .map(|c| peak(std::slice::from_ref(c)))
        .fold(0.0, f64::max);
    let models: Vec<Model> = settings
        .par_iter()
        .map(|s| {
            let amp = Amplifier::solve(
                &prepared.design,
                &prepared.devices,
                &prepared.iron,
                *s,
                load,
            )?;
            Ok(Model::new(&amp, rate, PEAK_MARGIN * top)?)
        })
        .collect::<Result<_, StudyFault>>()?;
    let groups: Vec<&[Model]> = models.chunks(MOST_LANES).collect();
    let jobs: Vec<(usize, usize)> = (0..take.channels.len())
        .flat_map(|c| (0..groups.len()).map(move |g| (c, g)))
        .collect();
    let frames = AtomicUsize::new(0);
    let all = (take.channels[0].len() * jobs.len()).max(1) as f64;
    let done = |n: usize| {
        let so_far = frames.fetch_add(n, Ordering::Relaxed) + n;
        (watch.progress)(0.6 + 0.3 * so_far as f64 / all, "rendering");
    };
    let played: Vec<Vec<Played>> = jobs
        .par_iter()
        .map(|&(c, g)| {
            let lanes: Vec<&Model> = groups[g].iter().collect();
            play(&lanes, &take.channels[c], plan.oversample, watch, &done)
        })
        .collect::<Result<_, _>>()?;
    let stages = prepared.devices.len();
    let mut out: Vec<SettingPlayed> = settings
        .iter()
        .map(|_| SettingPlayed {
            terminals: Vec::new(),
            excursion: vec![(0.0, 0.0); stages],
        })
        .collect();
    let mut strayed = 0;
    for ((_, g), lanes) in jobs.iter().zip(played) {
        strayed += lanes.first().map_or(0, |l| l.strayed);
        for (l, lane) in lanes.into_iter().enumerate() {
            let slot = &mut out[g * MOST_LANES + l];
            for (all, own) in slot.excursion.iter_mut().zip(&lane.excursion) {
                *all = (all.0.min(own.0), all.1.max(own.1));
            }
            slot.terminals.push(lane.output);
        }
    }
    Ok((out, strayed))
}

fn peak(channels: &[Vec<f64>]) -> f64 {
    channels.iter().flatten().fold(0.0, |m, x| m.max(x.abs()))
}

/// Makes the listening copies and brings the whole set under full scale by one factor.
fn scale_set(
    played: Vec<SettingPlayed>,
    take: &Take,
    plan: &Plan,
) -> Result<(Vec<Sound>, f64), StudyFault> {
    let rate = f64::from(take.rate);
    let response = match &plan.cabinet {
        Some(c) => Some(resample_impulse_response(&c.samples, c.rate, take.rate)?),
        None => None,
    };
    let mut sounds: Vec<Sound> = played
        .into_par_iter()
        .map(|p| {
            let listening = p
                .terminals
                .iter()
                .map(|x| match &response {
                    Some(h) => listening::convolve(x, h),
                    None => listening::band_limit(x, rate),
                })
                .collect();
            Sound {
                terminals: p.terminals,
                listening,
            }
        })
        .collect();
    let top = sounds
        .iter()
        .map(|s| peak(&s.terminals).max(peak(&s.listening)))
        .fold(0.0, f64::max);
    let scale = 10f64.powf(HEADROOM_DBFS / 20.0) / top.max(SILENT_BELOW_V);
    for sound in &mut sounds {
        for x in sound
            .terminals
            .iter_mut()
            .chain(&mut sound.listening)
            .flatten()
        {
            *x *= scale;
        }
    }
    Ok((sounds, scale))
}

fn loudness_of(channels: &[Vec<f64>], rate: u32) -> Figure<f64> {
    let slices: Vec<&[f64]> = channels.iter().map(Vec::as_slice).collect();
    match loudness(&slices, rate) {
        Ok(l) => l.integrated_lufs.map_err(|_| Missing::NoSignal),
        Err(_) => Err(Missing::NoSignal),
    }
}

fn di_facts(take: &Take) -> DiFacts {
    let all: Vec<f64> = take.channels.iter().flatten().copied().collect();
    let (peak_v, rms_v) = take_level(&all).map_or((0.0, 0.0), |l| (l.peak_volts, l.rms_volts));
    DiFacts {
        name: take.name.clone(),
        rate_hz: take.rate,
        frames: take.channels[0].len(),
        channels: take.channels.len(),
        peak_v,
        rms_v,
    }
}

fn di_warnings(take: &Take, di: &DiFacts) -> Vec<Warning> {
    let mut found = Vec::new();
    let mut warn = |message: String| {
        found.push(Warning {
            code: Code::DiLevel,
            place: take.name.clone(),
            message,
        });
    };
    if di.peak_v == 0.0 {
        warn("the recording is silent".into());
        return found;
    }
    let dbfs = 20.0 * (di.peak_v / take.full_scale_v).log10();
    if dbfs < DI_PEAK_DBFS.0 {
        warn(format!(
            "the recording peaks at {dbfs:.1} dBFS, {:.1} mV at the jack: check --full-scale or use --di-peak",
            1e3 * di.peak_v
        ));
    }
    if dbfs > DI_PEAK_DBFS.1 {
        warn(format!(
            "the recording peaks at {dbfs:.1} dBFS: it may have clipped while it was taken"
        ));
    }
    found
}
