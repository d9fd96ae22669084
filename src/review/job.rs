//! Several jobs that share out days leave word in the folder of their parts: so that none is missed when these are merged.

use std::{
    fs::{self, File},
    io,
    path::{Path, PathBuf},
};

/// One of several jobs.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Job {
    /// From 1.
    pub number: usize,
    /// Of so many.
    pub of: usize,
}

const BEGUN: &str = "begun";
const DONE: &str = "done";

impl Job {
    fn path(self, folder: &Path, word: &str) -> PathBuf {
        folder.join(format!("job-{}-of-{}.{word}", self.number, self.of))
    }

    /// Says that it has begun.
    pub fn begin(self, folder: &Path) -> io::Result<()> {
        let _again = fs::remove_file(self.path(folder, DONE));
        File::create(self.path(folder, BEGUN)).map(drop)
    }

    /// Says that it is done.
    pub fn end(self, folder: &Path) -> io::Result<()> {
        fs::rename(self.path(folder, BEGUN), self.path(folder, DONE))
    }

    fn read(name: &str) -> Option<Self> {
        let name = name.strip_suffix(DONE).or_else(|| name.strip_suffix(BEGUN))?;
        let (number, of) = name.strip_prefix("job-")?.strip_suffix('.')?.split_once("-of-")?;
        Some(Self { number: number.parse().ok()?, of: of.parse().ok()? })
    }

    /// Those that have not left word in a folder that they are done, where others of as many have left word.
    pub fn unfinished(folder: &Path) -> io::Result<Vec<Self>> {
        let mut of: Vec<usize> = Vec::new();
        for entry in fs::read_dir(folder)? {
            let job = entry?.file_name().to_str().and_then(Self::read);
            of.extend(job.map(|job| job.of).filter(|count| *count <= MOST_JOBS));
        }
        of.sort_unstable();
        of.dedup();
        let all = of.into_iter().flat_map(|of| (1..=of).map(move |number| Self { number, of }));
        Ok(all.filter(|job| !job.path(folder, DONE).exists()).collect())
    }
}

/// More make no sense, and might come from a file that is none of ours.
const MOST_JOBS: usize = 100_000;
