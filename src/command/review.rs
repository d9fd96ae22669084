//! `tautline review`: recorded days on paper.

use std::{
    collections::BTreeMap,
    io, iter,
    num::NonZeroUsize,
    path::{Path, PathBuf},
    sync::Arc,
};

use chrono::NaiveDate;
use clap::Args;

use super::{
    Failure,
    assess::Sources,
    papers::Papers,
    progress,
    tables::{Tables, make},
};
use crate::{
    config::Config,
    desk::Alternative,
    report::{change, review::Paper},
    review::{Done, FileNote, Job, Part, PartError, Review, Reviewed, Run, Stretch, Task, Terms},
};

/// Options of `review`.
#[derive(Debug, Args)]
pub struct Options {
    /// Configuration file
    #[arg(long, value_name = "FILE", required_unless_present = "merge")]
    config: Option<PathBuf>,
    /// Recorded files, in any order
    #[arg(required_unless_present = "merge", value_name = "FILES")]
    files: Vec<PathBuf>,
    /// Put reviewed days together that --parts has kept: files, or folders of them
    #[arg(long, value_name = "PARTS", num_args = 1.., conflicts_with_all = ["files", "config", "parts", "share", "carry", "sources", "with", "without"])]
    merge: Vec<PathBuf>,
    /// Compare with what would have been: "close SV3", "open SV1", "insert SV2-SC", "bypass SV2-SC", or "transfer
    /// Skarn-Velm -200" (MW, + is more in the direction of the transfer); any number of times
    #[arg(long, value_name = "CHANGE")]
    with: Vec<String>,
    /// Compare with what would have been had an outage not been reckoned with; any number of times
    #[arg(long, value_name = "OUTAGE")]
    without: Vec<String>,
    /// Keep each reviewed day in this folder, and go on from what is there
    #[arg(long, value_name = "DIR")]
    parts: Option<PathBuf>,
    /// Review only a share of the days, as one of several jobs: 3/16 is the third of sixteen
    #[arg(long, value_name = "K/N", requires = "parts", conflicts_with = "carry", value_parser = share)]
    share: Option<Job>,
    /// Let a day that has no recorded start go on from the day before it
    #[arg(long)]
    carry: bool,
    /// What stands behind the terminals [default: as the configuration says, else learned]
    #[arg(long, value_enum)]
    sources: Option<Sources>,
    /// Threads to assess on [default: one a processor]
    #[arg(long, value_name = "N")]
    threads: Option<NonZeroUsize>,
    /// Write one row for each corridor and frame, as a Parquet file for each day in this folder
    #[arg(long, value_name = "DIR", conflicts_with = "merge")]
    parquet: Option<PathBuf>,
    #[command(flatten)]
    papers: Papers,
}

fn share(text: &str) -> Result<Job, String> {
    let numbers = text.split_once('/').and_then(|(number, of)| Some((number.parse().ok()?, of.parse().ok()?)));
    match numbers {
        Some((number, of)) if (1..=of).contains(&number) => Ok(Job { number, of }),
        _ => Err("write K/N with K from 1 to N, as in 3/16".into()),
    }
}

/// Runs it.
pub fn run(options: &Options) -> Result<(), Failure> {
    options.papers.check()?;
    let (review, config, terms) = if options.merge.is_empty() { review(options)? } else { merge(&options.merge)? };
    if let Some(Job { number, of }) = options.share.filter(|_| review.days.is_empty()) {
        // One of more jobs than there are days has done what it should.
        eprintln!("tautline: there are too few days for {of} shares: none falls to share {number}");
        return Ok(());
    }
    let paper = Paper { review: &review, grid: &config.grid, zone: config.time_zone, changes: &terms.changes };
    options.papers.write(&paper)
}

/// Reviews recordings as they are, all at once.
pub(super) fn straight(config: &Config, stretches: &[Stretch]) -> Result<Review, Failure> {
    let task = Task::new(config.clone(), "".into(), change::lines);
    let mut review = Review::new(config.feed.max_age());
    let run = Run {
        task: &task,
        stretches,
        threads: None,
        carry: false,
        output: &config.grid.corridors.len(),
        known: &|_, _| None,
        follow: &|file| Box::new(file),
    };
    let barren = run.go(|done: Done| -> Result<(), Failure> {
        review.add(done.reviewed.day);
        Ok(())
    })?;
    say(&barren, &review)?;
    Ok(review)
}

/// Says which files did not bring a frame; fails when none did.
fn say(barren: &[FileNote], review: &Review) -> Result<(), Failure> {
    let lines = barren.iter().map(|file| {
        let what = iter::once("not a single frame").chain(file.findings.iter().map(String::as_str));
        format!("{}: {}", file.name, what.collect::<Vec<_>>().join("; "))
    });
    let lines: Vec<_> = lines.collect();
    if review.days.is_empty() && !lines.is_empty() {
        return Err(lines.join("\n").into());
    }
    for line in lines {
        eprintln!("tautline: {line}");
    }
    Ok(())
}

fn review(options: &Options) -> Result<(Review, Config, Terms), Failure> {
    let path = options.config.as_deref().unwrap_or(Path::new(""));
    let (mut config, text) = Config::read(path)?;
    Sources::choose(options.sources, &mut config);
    let terms = Terms {
        program: env!("CARGO_PKG_VERSION").into(),
        configuration: text.into(),
        changes: options.changes(),
        learning: options.sources.map(|sources| sources == Sources::Learned),
        carried: options.carry,
    };
    let alternatives = Alternative::parse(&options.with, &options.without, &config.grid)?;
    let stretches = options.stretches()?;
    let task = Task { alternatives, ..Task::new(config, terms.configuration.clone(), change::lines) };
    if let Some(folder) = &options.parts {
        make(folder)?;
        options.share.map_or(Ok(()), |job| job.begin(folder)).map_err(|error| part_failed(folder, error))?;
    }
    let tables = Tables::new(options.parquet.as_deref(), &task, &terms)?;
    let progress = progress::bar("");
    progress.inc_length(stretches.iter().map(Stretch::bytes).sum());
    let known = |stretch: &Stretch, date: NaiveDate| {
        known(options.parts.as_deref()?, &terms, stretch, date).filter(|_| tables.has(stretch, date))
    };
    let run = Run {
        task: &task,
        stretches: &stretches,
        threads: options.threads,
        carry: options.carry,
        output: &tables,
        known: &known,
        follow: &progress::following(&progress),
    };
    let mut review = Review::new(task.config.feed.max_age());
    let barren = run.go(|done: Done| -> Result<(), Failure> {
        let mut reviewed = done.reviewed;
        if let Some(folder) = options.parts.as_deref().filter(|_| !done.was_known) {
            let part = Part::new(terms.clone(), stretches[done.stretch].keys(), reviewed);
            part.save(folder)?;
            reviewed = part.reviewed();
        }
        review.add(reviewed.day);
        Ok(())
    })?;
    progress.finish_and_clear();
    say(&barren, &review)?;
    if let Some((job, folder)) = options.share.zip(options.parts.as_deref()) {
        job.end(folder).map_err(|error| part_failed(folder, error))?;
    }
    Ok((review, Arc::unwrap_or_clone(task.config), terms))
}

fn part_failed(folder: &Path, source: io::Error) -> PartError {
    PartError::File { path: folder.to_owned(), source }
}

/// A day that was reviewed before, from the same files and under the same terms.
fn known(folder: &Path, terms: &Terms, stretch: &Stretch, date: NaiveDate) -> Option<Reviewed> {
    let part = Part::load(&Part::path(folder, date)).ok()?;
    (part.terms == *terms && part.archives == stretch.keys()).then(|| part.reviewed())
}

impl Options {
    /// What was asked for, in the order of the command's help.
    fn changes(&self) -> Vec<String> {
        let with = self.with.iter().map(|change| format!("with {change}"));
        with.chain(self.without.iter().map(|outage| format!("without {outage}"))).collect()
    }

    /// The files in stretches, or this job's share of them.
    fn stretches(&self) -> Result<Vec<Stretch>, Failure> {
        let progress = progress::bar("looking through ");
        let follow = progress::following(&progress);
        let stretches = Stretch::all(&self.files, &follow, |bytes| progress.inc_length(bytes))?;
        progress.finish_and_clear();
        let Some(Job { number, of }) = self.share else { return Ok(stretches) };
        Ok(stretches.into_iter().skip(number - 1).step_by(of).collect())
    }
}

/// Puts together what was reviewed before, exactly as one run would have.
fn merge(paths: &[PathBuf]) -> Result<(Review, Config, Terms), Failure> {
    let mut parts = BTreeMap::new();
    let mut terms: Option<(PathBuf, Terms)> = None;
    for path in Part::find(paths)? {
        let part = Part::load(&path)?;
        match &terms {
            None => terms = Some((path.clone(), part.terms)),
            Some((one, first)) => {
                if let Some(what) = first.difference(&part.terms) {
                    return Err(PartError::Terms { one: one.clone(), other: path, what }.into());
                }
            }
        }
        let date = part.day.date;
        if let Some((one, archives)) = parts.insert(date, (path.clone(), part.archives.clone()))
            && archives != part.archives
        {
            return Err(PartError::Twice { date, one, other: path }.into());
        }
    }
    let Some((path, terms)) = terms else { return Err("nothing to merge".into()) };
    let mut config = Config::parse(&terms.configuration, &format!("the configuration in {}", path.display()))?;
    if let Some(learning) = terms.learning {
        config.learning.enabled = learning;
    }
    let mut review = Review::new(config.feed.max_age());
    for (path, _) in parts.into_values() {
        review.add(Part::load(&path)?.day);
    }
    for folder in paths.iter().filter(|path| path.is_dir()) {
        for Job { number, of } in Job::unfinished(folder).map_err(|error| part_failed(folder, error))? {
            let text = format!("job {number} of {of} is not done: its days in {} are missing", folder.display());
            eprintln!("tautline: {text}");
            review.findings.extend(review.days.first().map(|day| (day.date, text)));
        }
    }
    Ok((review, config, terms))
}
