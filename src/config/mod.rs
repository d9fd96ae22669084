//! TOML to a [`Grid`] and settings; all errors at once, each with file, line and key.
//!
//! To add a key: one line where its table is read, with its limits and its default.

mod alarm;
mod channels;
mod check;
mod corridor;
pub(crate) mod document;
mod error;
pub(crate) mod file;
pub(crate) mod findings;
pub(crate) mod given;
mod journal;
pub(crate) mod limits;
mod names;
mod recording;
mod screen;
pub(crate) mod section;
pub(crate) mod wording;

use std::{collections::BTreeMap, path::Path, time::Duration};

use chrono::TimeDelta;
use chrono_tz::{TZ_VARIANTS, Tz};

pub use error::{ConfigError, ConfigErrors};
pub use journal::JournalSettings;
pub use recording::RecordingSettings;
pub use screen::ScreenSettings;

use crate::{alarm::Definition, grid::Grid};
use check::GridNames;
use findings::Findings;
use limits::{NOT_NEGATIVE, POSITIVE};
use section::Section;
use wording::quoted;

/// More would not be watched by one person.
const MOST_CORRIDORS: usize = 1000;
/// A day, the longest time any setting may reach back, s.
const DAY_S: f64 = 86_400.0;

/// Everything a configuration file says.
#[derive(Debug, Clone, PartialEq)]
pub struct Config {
    /// The corridors.
    pub grid: Grid,
    /// Zone for display; records are always UTC.
    pub time_zone: Tz,
    /// Standard deviations of the measurements.
    pub measurement: MeasurementSettings,
    /// Inputs and how long a value lasts.
    pub feed: FeedSettings,
    /// Default channel name to the name it has in the feed.
    pub channel_names: BTreeMap<String, String>,
    /// How the sources are learned.
    pub learning: LearningSettings,
    /// The alarms of each corridor, in the order of the corridors (`[[alarm]]`, `[[corridor.alarm]]`).
    pub alarms: Vec<Vec<Definition>>,
    /// Where the journal is kept.
    pub journal: JournalSettings,
    /// Whether and how frames are recorded.
    pub recording: RecordingSettings,
    /// How the screen calls for attention.
    pub screen: ScreenSettings,
    /// Where `watch` keeps what it learned, from this file's folder (`[learning] state_file`).
    pub state_file: Option<String>,
}

/// Measurement classes (`[measurement]`): common metering practice by default.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct MeasurementSettings {
    /// Standard deviation of a voltage, % of nominal (`kv_sigma_pct`).
    pub kv_sigma_pct: f64,
    /// Standard deviation of an angle, degrees (`angle_sigma_deg`).
    pub angle_sigma_deg: f64,
    /// Standard deviation of MW and Mvar, % of the circuit's thermal MVA or surge impedance loading (`power_sigma_pct`).
    pub power_sigma_pct: f64,
}

impl Default for MeasurementSettings {
    fn default() -> Self {
        Self { kv_sigma_pct: 0.15, angle_sigma_deg: 0.1, power_sigma_pct: 0.3 }
    }
}

/// Where frames come from (`[feed]`).
#[derive(Debug, Clone, PartialEq)]
pub struct FeedSettings {
    /// Inputs to open when the command line names none (`inputs`).
    pub inputs: Vec<String>,
    /// How long a value stands when no newer one comes, s (`max_age_s`).
    pub max_age_s: f64,
    /// How long live inputs wait for one another's frames, s (`hold_s`).
    pub hold_s: f64,
    /// How far ahead of the clock and of the frame before it a frame of live inputs may be, s (`max_ahead_s`).
    pub max_ahead_s: f64,
}

/// A time in seconds; the longest there is where it does not fit.
fn seconds(seconds: f64) -> TimeDelta {
    let time = Duration::try_from_secs_f64(seconds).ok().and_then(|time| TimeDelta::from_std(time).ok());
    time.unwrap_or(TimeDelta::MAX)
}

impl FeedSettings {
    /// [`Self::max_age_s`].
    pub fn max_age(&self) -> TimeDelta {
        seconds(self.max_age_s)
    }

    /// [`Self::max_ahead_s`].
    pub fn max_ahead(&self) -> TimeDelta {
        seconds(self.max_ahead_s)
    }
}

impl Default for FeedSettings {
    fn default() -> Self {
        Self { inputs: Vec::new(), max_age_s: 10.0, hold_s: 0.2, max_ahead_s: 3600.0 }
    }
}

/// How the sources are learned from steps (`[learning]`).
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct LearningSettings {
    /// Whether they are learned at all (`enabled`).
    pub enabled: bool,
    /// Length of the means before and after a step, s (`window_s`).
    pub window_s: f64,
    /// Time between the two, in which swings settle, s (`gap_s`).
    pub gap_s: f64,
    /// A step is a change of more than this many times the background (`step_threshold`).
    pub step_threshold: f64,
    /// How far back the background is taken from, s (`background_s`).
    pub background_s: f64,
    /// How fast what was learned becomes doubtful, ohm per root of a day (`aging_ohm_per_sqrt_day`).
    pub aging_ohm_per_sqrt_day: f64,
}

impl Default for LearningSettings {
    fn default() -> Self {
        Self {
            enabled: true,
            window_s: 10.0,
            gap_s: 6.0,
            step_threshold: 5.0,
            background_s: 1800.0,
            aging_ohm_per_sqrt_day: 1.0,
        }
    }
}

impl Config {
    /// Reads a configuration file.
    pub fn load(path: &Path) -> Result<Self, ConfigErrors> {
        Ok(Self::read(path)?.0)
    }

    /// The same, with its text.
    pub fn read(path: &Path) -> Result<(Self, String), ConfigErrors> {
        let name = path.display().to_string();
        let text = file::read(path).map_err(|error| ConfigErrors::one(&name, error))?;
        Ok((Self::parse(&text, &name)?, text))
    }

    /// Reads a configuration from its text; `file_name` is what the errors call it.
    pub fn parse(text: &str, file_name: &str) -> Result<Self, ConfigErrors> {
        let document = document::parse(text).map_err(|error| ConfigErrors::one(file_name, error))?;
        let findings = Findings::new(document.raw());
        let config = read(Section::root(&findings, document.as_table()));
        findings.verdict(config, file_name)
    }
}

fn read(mut root: Section<'_>) -> Config {
    let mut general = root.required_section("grid", "give [grid] with frequency_hz");
    let frequency_hz = general.required_number("frequency_hz", POSITIVE.up_to(1000.0));
    let time_zone = time_zone(&mut general);

    let mut names = GridNames::new(root.findings());
    let corridors = root.required_sections("corridor", MOST_CORRIDORS);
    let (alarms, corridors) = corridors
        .into_iter()
        .map(|mut section| (section.sections("alarm", alarm::MOST_ALARMS), corridor::read(section, &mut names)))
        .unzip();
    let grid = Grid { frequency_hz, corridors };
    let mut learned = root.section("learning");
    let state_file = learned.text("state_file").filter(|name| !name.is_empty());
    Config {
        time_zone,
        measurement: measurement(root.section("measurement")),
        feed: feed(root.section("feed")),
        channel_names: channels::read(root.section("channels"), &grid, &names),
        alarms: alarm::all(&mut root, &grid, alarms),
        journal: journal::read(root.section("journal")),
        recording: recording::read(root.section("recording")),
        screen: screen::read(root.section("screen")),
        learning: learning(learned),
        state_file,
        grid,
    }
}

fn time_zone(section: &mut Section<'_>) -> Tz {
    let Some(name) = section.text("time_zone").filter(|name| !name.is_empty()) else { return Tz::UTC };
    name.parse().unwrap_or_else(|_| {
        let advice = section.findings().advice(&name, TZ_VARIANTS.iter().map(|zone| zone.name()));
        section.wrong("time_zone", format!("no IANA time zone {}; {advice}", quoted(&name)));
        Tz::UTC
    })
}

fn measurement(mut section: Section<'_>) -> MeasurementSettings {
    let default = MeasurementSettings::default();
    let sigma = POSITIVE.up_to(100.0);
    MeasurementSettings {
        kv_sigma_pct: section.number("kv_sigma_pct", sigma).unwrap_or(default.kv_sigma_pct),
        angle_sigma_deg: section.number("angle_sigma_deg", sigma).unwrap_or(default.angle_sigma_deg),
        power_sigma_pct: section.number("power_sigma_pct", sigma).unwrap_or(default.power_sigma_pct),
    }
}

fn feed(mut section: Section<'_>) -> FeedSettings {
    let default = FeedSettings::default();
    let inputs = section.texts("inputs");
    FeedSettings {
        inputs: inputs.map_or(default.inputs, |inputs| inputs.into_iter().map(|input| input.text).collect()),
        max_age_s: section.number("max_age_s", POSITIVE.up_to(DAY_S)).unwrap_or(default.max_age_s),
        hold_s: section.number("hold_s", NOT_NEGATIVE.up_to(DAY_S)).unwrap_or(default.hold_s),
        max_ahead_s: section.number("max_ahead_s", POSITIVE).unwrap_or(default.max_ahead_s),
    }
}

fn learning(mut section: Section<'_>) -> LearningSettings {
    let default = LearningSettings::default();
    let time = POSITIVE.up_to(DAY_S);
    let settings = LearningSettings {
        enabled: section.flag("enabled").unwrap_or(default.enabled),
        window_s: section.number("window_s", time).unwrap_or(default.window_s),
        gap_s: section.number("gap_s", NOT_NEGATIVE.up_to(DAY_S)).unwrap_or(default.gap_s),
        step_threshold: section.number("step_threshold", POSITIVE).unwrap_or(default.step_threshold),
        background_s: section.number("background_s", time).unwrap_or(default.background_s),
        aging_ohm_per_sqrt_day: section
            .number("aging_ohm_per_sqrt_day", NOT_NEGATIVE)
            .unwrap_or(default.aging_ohm_per_sqrt_day),
    };
    if settings.background_s < settings.window_s {
        section
            .wrong("background_s", format!("is below window_s ({}); the background takes longer", settings.window_s));
    }
    settings
}
