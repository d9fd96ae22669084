//! What is shown of two moments of a corridor, line by line.

use std::sync::Arc;

use super::{
    Theme, figures, outages,
    row::{headroom, set_by},
};
use crate::{
    alarm::{Board, CorridorBoard, State as Standing},
    desk::{Assessment, Criterion, OutageRecord, SourceRecord, SwitchKind},
    screen::state::Held,
};

/// One thing at two moments.
#[derive(Debug, Clone, PartialEq)]
pub struct Difference {
    /// Which thing.
    pub what: String,
    /// How it was, and how it is now.
    pub values: [String; 2],
    /// How much more it is; empty where there is no number for that.
    pub change: String,
}

impl Difference {
    /// Whether it reads otherwise now.
    pub fn differs(&self) -> bool {
        self.values[0] != self.values[1]
    }

    fn words(what: impl Into<String>, values: [String; 2]) -> Self {
        Self { what: what.into(), values, change: String::new() }
    }

    /// Numbers with what is said besides each; the change is that of the numbers as they are shown.
    fn numbers(what: impl Into<String>, values: &[(Option<f64>, String); 2], decimals: usize) -> Self {
        let scale = 10f64.powi(i32::try_from(decimals).unwrap_or(0));
        let shown = [0, 1].map(|side| values[side].0.map(|value: f64| (value * scale).round_ties_even() / scale));
        let change = match shown {
            [Some(one), Some(other)] if one.to_bits() != other.to_bits() => {
                let sign = if other > one { "+" } else { "" };
                format!("{sign}{}", figures::number(Some(other - one), decimals))
            }
            _ => String::new(),
        };
        let text = |side: usize| format!("{}{}", figures::number(shown[side], decimals), values[side].1);
        Self { what: what.into(), values: [text(0), text(1)], change }
    }

    fn plain(what: impl Into<String>, values: [Option<f64>; 2], decimals: usize) -> Self {
        Self::numbers(what, &values.map(|value| (value, String::new())), decimals)
    }
}

/// Everything about one corridor at two moments, what matters most first.
pub fn differences(held: &Held, now: &Held, corridor: &str, theme: Theme) -> Option<Vec<Difference>> {
    let pair = [held.assessment(corridor)?.as_ref(), now.assessment(corridor)?.as_ref()];
    let number =
        |what: &str, of: fn(&Assessment) -> Option<f64>, decimals| Difference::plain(what, pair.map(of), decimals);
    let mut all = vec![
        Difference::words("state", pair.map(|a| theme.word(a.state))),
        Difference {
            values: pair.map(headroom),
            ..Difference::plain("headroom, MW", pair.map(|a| a.headroom_mw.map(f64::floor)), 0)
        },
        Difference::words("set by", pair.map(|a| set_by(a, 40))),
        number("transfer, MW", |a| a.transfer_mw, 0),
        Difference::words("exporter", pair.map(|a| a.exporter.as_deref().unwrap_or(figures::NONE).into())),
    ];
    all.extend(switches(pair));
    all.extend(alarms([&held.board, &now.board], corridor));
    all.push(number("angle between the buses", |a| a.bus_angle_deg, 1));
    all.push(number("between the sources", |a| a.internal_angle_deg, 1));
    all.push(number("in the first swing", |a| a.swing_angle_deg, 1));
    all.extend(each_outage(pair));
    all.extend(sources(pair));
    all.push(Difference::words("set aside", pair.map(|a| listed(&a.fit.suspects))));
    all.push(Difference::words("missing", pair.map(|a| listed(&a.fit.missing))));
    Some(all)
}

fn listed(names: &[Arc<str>]) -> String {
    match names {
        [] => "none".into(),
        [one] => one.to_string(),
        [one, rest @ ..] => format!("{one} and {} more", rest.len()),
    }
}

/// All that any of both has, in the order of the first.
fn union<T: PartialEq + Clone>(one: impl Iterator<Item = T>, other: impl Iterator<Item = T>) -> Vec<T> {
    let mut all: Vec<_> = one.collect();
    for item in other {
        if !all.contains(&item) {
            all.push(item);
        }
    }
    all
}

fn switches(pair: [&Assessment; 2]) -> impl Iterator<Item = Difference> {
    let [one, other] = pair.map(|a| a.switches.iter().map(|switch| (switch.name.clone(), switch.kind)));
    union(one, other).into_iter().map(move |(name, kind)| {
        let words = match kind {
            SwitchKind::Circuit => ["OPEN", "closed"],
            SwitchKind::Bank => ["BYPASSED", "inserted"],
        };
        let stands = |a: &Assessment| {
            let found = a.switches.iter().find(|switch| switch.name == name && switch.kind == kind);
            found.map_or(figures::NONE, |switch| words[usize::from(switch.on)]).to_owned()
        };
        Difference::words(name.to_string(), pair.map(stands))
    })
}

fn alarms(boards: [&Board; 2], corridor: &str) -> Vec<Difference> {
    let [was, is] = boards.map(|board| {
        let boards = board.corridors.iter().filter(|board| **board.corridor() == *corridor);
        let alarms = boards.flat_map(CorridorBoard::alarms);
        alarms.map(|alarm| (alarm.definition.name.clone(), alarm.standing.state)).collect::<Vec<_>>()
    });
    let names = union(was.iter().map(|(name, _)| name), is.iter().map(|(name, _)| name));
    let rows = names.into_iter().map(|name| {
        let state =
            |list: &[(Arc<str>, Standing)]| list.iter().find(|(other, _)| other == name).map(|(_, state)| *state);
        (name, [state(&was), state(&is)])
    });
    let normal = [None, Some(Standing::Normal)];
    let rows = rows.filter(|(_, states)| states.iter().any(|state| !normal.contains(state)));
    let word = |state: Option<Standing>| state.map_or(figures::NONE, Standing::word).to_owned();
    rows.map(|(name, states)| Difference::words(format!("alarm: {name}"), states.map(word))).collect()
}

fn each_outage(pair: [&Assessment; 2]) -> impl Iterator<Item = Difference> {
    let [one, other] = pair.map(|a| a.outages.iter().map(|outage| outage.name.clone()));
    let found = move |name: &str| pair.map(|a| a.outages.iter().find(|outage| *outage.name == *name));
    union(one, other).into_iter().flat_map(move |name| {
        let both = found(&name);
        let limit = both.map(|outage| {
            let limit = outage.and_then(smallest);
            (limit.map(|(_, mw)| mw), limit.map_or(String::new(), |(criterion, _)| format!(" {}", criterion.word())))
        });
        let margin = both.map(|outage| outage.and_then(|outage| outage.angle_margin_deg));
        let critical = both.map(|outage| outage.and_then(|outage| outage.critical_ms));
        let limit = Difference::numbers(format!("{name} out: limit, MW"), &limit, 0);
        let margin = Difference::plain(format!("{name} out: margin, °"), margin, 1);
        let clearing = Difference {
            values: both.map(|outage| outage.map_or(figures::NONE.into(), outages::critical)),
            ..Difference::plain(format!("{name} out: clearing, ms"), critical, 0)
        };
        let has_clearing = critical != [None, None];
        [limit, margin].into_iter().chain(has_clearing.then_some(clearing))
    })
}

/// The limit that binds first.
fn smallest(outage: &OutageRecord) -> Option<(Criterion, f64)> {
    let limits = outage.limit_mw;
    let each = [
        (Criterion::Separation, limits.separation),
        (Criterion::Angle, limits.angle),
        (Criterion::Area, limits.area),
        (Criterion::Loading, limits.loading),
        (Criterion::Voltage, limits.voltage),
    ];
    let each = each.into_iter().filter_map(|(criterion, limit)| Some((criterion, limit?)));
    each.min_by(|one, other| one.1.total_cmp(&other.1))
}

fn sources(pair: [&Assessment; 2]) -> impl Iterator<Item = Difference> {
    [0, 1].into_iter().flat_map(move |side| {
        let sources = pair.map(|a| &a.sources[side]);
        let bus = &sources[1].bus;
        let spread = |source: &SourceRecord| format!(" ±{}", figures::number(Some(source.x_sd), 2));
        [
            Difference::plain(format!("{bus}: E, kV"), sources.map(|source| source.e_kv), 1),
            Difference::numbers(format!("{bus}: X, Ω"), &sources.map(|source| (Some(source.x_ohm), spread(source))), 2),
        ]
    })
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::screen::state::sample;

    fn held(assessment: Assessment) -> Held {
        Held {
            time: assessment.time,
            assessments: vec![Arc::new(assessment)],
            board: Arc::new(Board { corridors: Vec::new() }),
        }
    }

    fn differing(change: impl Fn(&mut Assessment)) -> Vec<(String, String, String, String)> {
        let mut now = sample::ample();
        change(&mut now);
        let all = differences(&held(sample::ample()), &held(now), "Skarn-Velm", Theme { colour: false }).unwrap();
        let differing = all.into_iter().filter(Difference::differs);
        differing.map(|Difference { what, values: [a, now], change }| (what, a, now, change)).collect()
    }

    #[test]
    fn what_changed_is_found_and_nothing_else() {
        let row = |what: &str, a: &str, now: &str, change: &str| (what.into(), a.into(), now.into(), change.into());
        assert_eq!(differing(|_| ()), []);
        assert_eq!(differing(|a| a.transfer_mw = Some(1300.4)), [row("transfer, MW", "1284", "1300", "+16")]);
        assert_eq!(differing(|a| a.transfer_mw = None), [row("transfer, MW", "1284", "–", "")]);
        assert_eq!(differing(|a| Arc::make_mut(&mut a.switches)[3].on = false), [row("SV3", "closed", "OPEN", "")]);
        assert_eq!(
            differing(|a| a.outages[0].limit_mw.area = Some(1000.2)),
            [row("SV1 out: limit, MW", "2049 angle", "1000 area", "−1049")]
        );
        assert_eq!(differing(|a| a.sources[0].x_sd = 1.0), [row("Skarn: X, Ω", "22.00 ±6.60", "22.00 ±1.00", "")]);
        assert_eq!(differing(|a| drop(a.outages.remove(3))).len(), 2, "an outage that is judged no more");
    }
}
