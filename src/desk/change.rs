//! Changes as one writes them: `close SV3`, `transfer Skarn-Velm -200`.

use std::sync::Arc;

use thiserror::Error;

use crate::{
    config::wording::{advice, quoted},
    grid::{BankIndex, Corridor, Grid},
    network::Topology,
};

/// All that is wrong with changes, one sentence each, free of control characters.
#[derive(Debug, Clone, PartialEq, Eq, Error)]
#[error("{}", .0.join("\n"))]
pub struct ChangeErrors(pub Vec<String>);

/// What is to be otherwise in one corridor.
#[derive(Debug, Clone, PartialEq, Default)]
pub(super) struct Change {
    /// Circuits, and whether they are closed.
    closed: Vec<(usize, bool)>,
    /// Banks, and whether they are inserted.
    inserted: Vec<(BankIndex, bool)>,
    /// More transfer in its present direction, MW.
    pub shift_mw: f64,
    /// Outages not to reckon with.
    pub without: Vec<Arc<str>>,
}

impl Change {
    pub fn topology(&self, now: &Topology) -> Topology {
        let mut topology = now.clone();
        for (circuit, closed) in &self.closed {
            topology.closed[*circuit] = *closed;
        }
        for (BankIndex { circuit, bank }, inserted) in &self.inserted {
            topology.inserted[*circuit][*bank] = *inserted;
        }
        topology
    }
}

/// A change for each corridor of the grid.
pub(super) fn parse(with: &[String], without: &[String], grid: &Grid) -> Result<Vec<Change>, ChangeErrors> {
    let mut changes = vec![Change::default(); grid.corridors.len()];
    let mut errors = Vec::new();
    for text in with {
        if let Err(error) = take_with(text, grid, &mut changes) {
            errors.push(format!("--with {}: {error}", quoted(text)));
        }
    }
    for text in without {
        if let Err(error) = take_without(text, grid, &mut changes) {
            errors.push(format!("--without {}: {error}", quoted(text)));
        }
    }
    if errors.is_empty() { Ok(changes) } else { Err(ChangeErrors(errors)) }
}

fn take_with(text: &str, grid: &Grid, changes: &mut [Change]) -> Result<(), String> {
    let (verb, rest) = text.trim().split_once(char::is_whitespace).unwrap_or((text.trim(), ""));
    let rest = rest.trim();
    match verb {
        "close" | "open" => {
            let (corridor, circuit) = find("circuit", rest, circuits(grid))?;
            set(&mut changes[corridor].closed, circuit, verb == "close")
        }
        "insert" | "bypass" => {
            let (corridor, bank) = find("series capacitor", rest, banks(grid))?;
            set(&mut changes[corridor].inserted, bank, verb == "insert")
        }
        "transfer" => {
            let (name, mw) = rest.rsplit_once(char::is_whitespace).unwrap_or((rest, ""));
            let mw = mw.parse().ok().filter(|mw: &f64| mw.is_finite());
            let mw = mw.ok_or("ends without a number of MW; write one, as in \"transfer Skarn-Velm -200\"")?;
            let (corridor, _) = find("corridor", name.trim_end(), corridors(grid))?;
            changes[corridor].shift_mw += mw;
            Ok(())
        }
        _ => Err(format!("begins with no change; {}", advice(verb, ["close", "open", "insert", "bypass", "transfer"]))),
    }
}

fn take_without(text: &str, grid: &Grid, changes: &mut [Change]) -> Result<(), String> {
    let text = text.trim();
    let all = || corridors(grid).flat_map(|(of, index, corridor)| outages(corridor).map(move |name| (of, index, name)));
    let is_meant = |(corridor, _, name): &(&Arc<str>, usize, &Arc<str>)| {
        let of_corridor = text.strip_prefix(&***corridor).and_then(|rest| rest.strip_prefix(": "));
        [Some(text), of_corridor].contains(&Some(&***name))
    };
    let meant: Vec<_> = all().filter(is_meant).collect();
    match meant[..] {
        [] => Err(format!("there is no such outage; {}", advice(text, all().map(|(.., name)| &**name)))),
        [(_, corridor, name)] => {
            changes[corridor].without.push(name.clone());
            Ok(())
        }
        [(corridor, ..), ..] => {
            let example = quoted(&format!("{corridor}: {text}"));
            Err(format!("several corridors have an outage of this name; say which, as in {example}"))
        }
    }
}

/// Sets a status, once.
fn set<T: PartialEq>(statuses: &mut Vec<(T, bool)>, of: T, status: bool) -> Result<(), String> {
    match statuses.iter().find(|(other, _)| *other == of) {
        Some((_, earlier)) if *earlier != status => Err("contradicts an earlier change; leave one of them out".into()),
        Some(_) => Ok(()),
        None => {
            statuses.push((of, status));
            Ok(())
        }
    }
}

/// The corridor and what is there of this name: circuits, banks and corridors have theirs once in a grid.
fn find<'a, T: Copy>(
    kind: &str,
    name: &str,
    all: impl Iterator<Item = (&'a Arc<str>, usize, T)>,
) -> Result<(usize, T), String> {
    let all: Vec<_> = all.collect();
    let found = all.iter().find(|(other, ..)| ***other == *name);
    found.map(|(_, corridor, found)| (*corridor, *found)).ok_or_else(|| {
        let advice = advice(name, all.iter().map(|(name, ..)| &***name));
        let said =
            if name.is_empty() { format!("names no {kind}") } else { format!("there is no {kind} {}", quoted(name)) };
        format!("{said}; {advice}")
    })
}

fn corridors(grid: &Grid) -> impl Iterator<Item = (&Arc<str>, usize, &Corridor)> {
    grid.corridors.iter().enumerate().map(|(index, corridor)| (&corridor.name, index, corridor))
}

fn circuits(grid: &Grid) -> impl Iterator<Item = (&Arc<str>, usize, usize)> {
    corridors(grid).flat_map(|(_, index, corridor)| {
        corridor.circuits.iter().enumerate().map(move |(circuit, c)| (&c.name, index, circuit))
    })
}

fn banks(grid: &Grid) -> impl Iterator<Item = (&Arc<str>, usize, BankIndex)> {
    corridors(grid).flat_map(|(_, index, corridor)| corridor.banks().map(move |(bank, b)| (&b.name, index, bank)))
}

fn outages(corridor: &Corridor) -> impl Iterator<Item = &Arc<str>> {
    let circuits = corridor.circuits.iter().map(|circuit| &circuit.name);
    circuits
        .chain(corridor.banks().map(|(_, bank)| &bank.name))
        .chain(corridor.outages.iter().map(|outage| &outage.name))
}
