//! `tautline try`: recorded days under two sets of alarms, side by side.

use std::{
    fs::File,
    io::{ErrorKind, Write, stdout},
    path::{Path, PathBuf},
    str::FromStr,
    sync::Arc,
};

use clap::Args;
use indicatif::ProgressBar;
use rayon::prelude::*;
use thiserror::Error;

use super::{Failure, inputs, progress};
use crate::{
    alarm::{
        Definition, Kind,
        trial::{Figures, Trial},
    },
    config::Config,
    desk::{CorridorDesk, Desk},
    feed::{Channels, Format, Frame, Reader, Recorded, Snapshot},
    report::trial::{SideBySide, Swept},
};

/// Frames assessed at once.
const BATCH_FRAMES: usize = 256;
/// More would not be read.
const MOST_VALUES: usize = 200;

/// Options of `try`.
#[derive(Debug, Args)]
pub struct Options {
    /// Configuration file with the alarms to try
    #[arg(long, value_name = "FILE")]
    config: PathBuf,
    /// Another configuration file, which differs in its alarms
    #[arg(long, value_name = "FILE", required_unless_present = "sweep")]
    against: Option<PathBuf>,
    /// Try one setpoint at many values: the name of an alarm or what it is on, as in headroom_mw=50:500:50
    #[arg(long, value_name = "ALARM=FROM:TO:STEP")]
    sweep: Option<Sweep>,
    /// Recorded files
    #[arg(value_name = "FILE", required = true)]
    files: Vec<PathBuf>,
}

/// One setpoint at many values.
#[derive(Debug, Clone, PartialEq)]
struct Sweep {
    /// Name of an alarm, or the word of a kind: then it is the first of that kind in each corridor.
    alarm: String,
    values: Vec<f64>,
}

#[derive(Debug, Error, PartialEq, Eq)]
#[error("write ALARM=FROM:TO:STEP, as in headroom_mw=50:500:50, with at most {MOST_VALUES} values")]
struct SweepError;

impl FromStr for Sweep {
    type Err = SweepError;

    fn from_str(text: &str) -> Result<Self, SweepError> {
        let (alarm, range) = text.split_once('=').ok_or(SweepError)?;
        let numbers: Result<Vec<f64>, _> = range.split(':').map(str::parse).collect();
        let [from, to, step] = numbers.map_err(|_| SweepError)?[..] else { return Err(SweepError) };
        let steps = (to - from) / step;
        if alarm.is_empty() || !(0.0..MOST_VALUES as f64).contains(&steps) {
            return Err(SweepError);
        }
        // Few, and the last is not lost to rounding.
        #[allow(clippy::cast_possible_truncation, clippy::cast_sign_loss)]
        let count = (steps + 1e-9) as u32;
        Ok(Self { alarm: alarm.to_owned(), values: (0..=count).map(|n| from + f64::from(n) * step).collect() })
    }
}

/// The alarms of all corridors, under a name.
type Set = (String, Vec<Vec<Definition>>);

/// Runs it.
pub fn run(options: &Options) -> Result<(), Failure> {
    let config = Config::load(&options.config)?;
    let mut sets: Vec<Set> = vec![(name(&options.config), config.alarms.clone())];
    if let Some(against) = &options.against {
        let other = Config::load(against)?;
        same_but_for_alarms(&config, &other)?;
        sets.push((name(against), other.alarms));
    }
    if let Some(sweep) = &options.sweep {
        sets.extend(sweep.sets(&config.alarms)?);
    }
    let mut figures = play(options, &config, &sets)?;
    let mut out = stdout().lock();
    let written = if options.sweep.is_some() {
        write!(out, "{}", Swept(&figures))
    } else {
        let named = |(name, figures): &'_ (String, Figures)| (name.clone(), figures.clone());
        let second = figures.get(1).map(named);
        let first = figures.swap_remove(0);
        let sets = [Some((&*first.0, &first.1)), second.as_ref().map(|(name, figures)| (&**name, figures))];
        write!(out, "{}", SideBySide { sets, zone: config.time_zone })
    };
    match written {
        // Nobody reads on.
        Err(error) if error.kind() == ErrorKind::BrokenPipe => Ok(()),
        written => Ok(written?),
    }
}

fn name(path: &Path) -> String {
    path.file_stem().unwrap_or(path.as_os_str()).to_string_lossy().into_owned()
}

/// Alarms are compared on the same assessments. The thin threshold only sets an alarm.
fn same_but_for_alarms(config: &Config, other: &Config) -> Result<(), Failure> {
    let mut grid = other.grid.clone();
    for (corridor, with) in grid.corridors.iter_mut().zip(&config.grid.corridors) {
        corridor.thin_mw = with.thin_mw;
    }
    let compared = [
        (grid == config.grid, "its corridors"),
        (other.measurement == config.measurement, "[measurement]"),
        (other.feed.max_age_s.to_bits() == config.feed.max_age_s.to_bits(), "[feed] max_age_s"),
        (other.channel_names == config.channel_names, "[channels]"),
        (other.learning == config.learning, "[learning]"),
    ];
    match compared.iter().find(|(same, _)| !same) {
        None => Ok(()),
        Some((_, what)) => Err(format!(
            "the configurations differ in {what}; alarms are compared on the same assessments, so only [[alarm]], \
             [[corridor.alarm]] and thin_mw may differ"
        )
        .into()),
    }
}

impl Sweep {
    /// The alarms at each value.
    fn sets(&self, alarms: &[Vec<Definition>]) -> Result<Vec<Set>, Failure> {
        let is_named = alarms.iter().flatten().any(|alarm| *alarm.name == *self.alarm);
        let is_meant = |alarm: &Definition| *alarm.name == *self.alarm || !is_named && alarm.kind.word() == self.alarm;
        let Some(first) = alarms.iter().flatten().find(|alarm| is_meant(alarm)) else {
            let words: Vec<_> = Kind::ALL.iter().map(|kind| kind.word()).collect();
            return Err(format!("no alarm is {:?} or on it; alarms are on {}", self.alarm, words.join(", ")).into());
        };
        let [low, high] = first.kind.setpoints();
        if let Some(value) = self.values.iter().find(|value| !(low..=high).contains(*value)) {
            return Err(format!("a setpoint of {} is between {low} and {high}, not {value}", first.kind).into());
        }
        let set = |value: &f64| {
            let mut alarms = alarms.to_vec();
            for corridor in &mut alarms {
                if let Some(alarm) = corridor.iter_mut().find(|alarm| is_meant(alarm)) {
                    alarm.setpoint = *value;
                    if *value != 0.0 {
                        alarm.deadband = alarm.deadband.min(value.abs());
                    }
                }
            }
            (format!("{}={value}", self.alarm), alarms)
        };
        Ok(self.values.iter().map(set).collect())
    }
}

/// One corridor under all sets of alarms.
struct Seat {
    desk: CorridorDesk,
    trials: Vec<Trial>,
}

fn play(options: &Options, config: &Config, sets: &[Set]) -> Result<Vec<(String, Figures)>, Failure> {
    let channels = Arc::new(Channels::new(config));
    let progress = progress::bar("");
    let readers = options.files.iter().map(|path| open(path, &channels, &progress)).collect::<Result<Vec<_>, _>>()?;
    let mut recorded = Recorded::new(readers, &channels);
    let mut holder = inputs::holder(config, &channels);
    let corridors = Desk::new(config, &channels).corridors.into_iter().enumerate();
    let mut seats: Vec<Seat> = corridors
        .map(|(index, desk)| {
            let trial = |(_, alarms): &Set| Trial::new(desk.corridor(), &alarms[index]);
            Seat { trials: sets.iter().map(trial).collect(), desk }
        })
        .collect();
    let mut is_empty = true;
    loop {
        let frames: Vec<Frame> = recorded.by_ref().take(BATCH_FRAMES).collect();
        if frames.is_empty() {
            break;
        }
        is_empty = false;
        let snapshots: Vec<Snapshot> = frames.iter().filter_map(|frame| holder.take(frame)).collect();
        seats.par_iter_mut().with_max_len(1).for_each(|seat| seat.take(&snapshots));
    }
    progress.finish_and_clear();
    for input in recorded.monitor().inputs() {
        for finding in input.tally.findings() {
            eprintln!("tautline: {}: {finding}", input.name);
        }
    }
    if is_empty {
        return Err("not a single frame was read".into());
    }
    let mut by_set: Vec<Vec<Trial>> = sets.iter().map(|_| Vec::new()).collect();
    for seat in seats {
        by_set.iter_mut().zip(seat.trials).for_each(|(set, trial)| set.push(trial));
    }
    Ok(sets.iter().map(|(name, _)| name.clone()).zip(by_set.into_iter().map(Figures::of)).collect())
}

impl Seat {
    fn take(&mut self, snapshots: &[Snapshot]) {
        for snapshot in snapshots {
            let assessment = self.desk.assess(snapshot);
            self.trials.iter_mut().for_each(|trial| trial.take(&assessment));
        }
    }
}

fn open(path: &Path, channels: &Arc<Channels>, progress: &ProgressBar) -> Result<Reader, Failure> {
    let failed = |error| format!("cannot open {}: {error}", path.display());
    let file = File::open(path).map_err(failed)?;
    let metadata = file.metadata().map_err(failed)?;
    if metadata.is_dir() {
        return Err(failed(ErrorKind::IsADirectory.into()).into());
    }
    progress.inc_length(metadata.len());
    Ok(Reader::new(&path.to_string_lossy(), progress.wrap_read(file), Format::of(path), channels))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_sweep_has_both_its_ends() {
        let values = |text: &str| text.parse::<Sweep>().map(|sweep| sweep.values);
        assert_eq!(values("headroom_mw=50:200:50"), Ok(vec![50.0, 100.0, 150.0, 200.0]));
        assert_eq!(values("area_margin=0.1:0.3:0.1").map(|values| values.len()), Ok(3));
        assert_eq!(values("a=3:1:-1"), Ok(vec![3.0, 2.0, 1.0]));
        for wrong in ["headroom_mw", "=1:2:1", "a=1:2", "a=1:2:0", "a=2:1:1", "a=0:1e9:1", "a=nan:1:1", "a=0:1:1:1"] {
            assert_eq!(values(wrong), Err(SweepError), "{wrong}");
        }
    }
}
