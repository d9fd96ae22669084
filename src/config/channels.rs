//! `[channels]`, and channel names that would mean two things.

use std::{
    collections::{BTreeMap, HashMap, btree_map::Entry},
    mem,
};

use super::{check::GridNames, findings::Findings, section::Section, wording::quoted};
use crate::{feed::Point, grid::Grid};

/// Default channel name to the name in the feed.
pub(super) fn read(mut section: Section<'_>, grid: &Grid, names: &GridNames<'_>) -> BTreeMap<String, String> {
    let findings = section.findings();
    let known = known(grid, names, findings);
    let mut mapped = BTreeMap::new();
    for (channel, in_feed) in section.texts_by_path() {
        if known.contains_key(&channel) {
            match mapped.entry(channel) {
                Entry::Occupied(_) => findings.report(&in_feed.place, "is given twice; keep one"),
                Entry::Vacant(free) => _ = free.insert(in_feed),
            }
        } else {
            let names = known.keys().map(|name| &**name).filter(|name| !name.starts_with('.'));
            let advice = findings.advice(&channel, names);
            findings.report(&in_feed.place, format!("no channel {}; {advice}", quoted(&channel)));
        }
    }
    // A channel that is not mapped keeps its own name in the feed.
    let mut by_feed_name: HashMap<&str, &str> =
        known.keys().filter(|name| !mapped.contains_key(*name)).map(|name| (&**name, &**name)).collect();
    for (channel, in_feed) in &mapped {
        if let Some(other) = by_feed_name.insert(&in_feed.text, channel) {
            let what = format!("{} is the name of {} in the feed already", quoted(&in_feed.text), quoted(other));
            findings.report(&in_feed.place, format!("{what}; one name brings one channel"));
        }
    }
    mapped.into_iter().map(|(channel, in_feed)| (channel, in_feed.text)).collect()
}

/// All channels by their default names, and what each measures.
fn known(grid: &Grid, names: &GridNames<'_>, findings: &Findings) -> BTreeMap<String, Point> {
    let mut known: BTreeMap<String, Point> = BTreeMap::new();
    for corridor in &grid.corridors {
        for point in Point::of(corridor) {
            let name = point.name(corridor);
            let earlier = *known.entry(name.clone()).or_insert(point);
            if mem::discriminant(&earlier) == mem::discriminant(&point) {
                continue;
            }
            // Only the load of a bus named like "<circuit>.from" can meet the flow of that circuit.
            let bus = name.rsplit_once('.').map_or("", |(bus, _)| bus);
            if let Some(place) = names.bus_place(bus) {
                findings.report(
                    place,
                    format!("channel {} would be of this bus and of a circuit; choose another name", quoted(&name)),
                );
            }
        }
    }
    known
}
