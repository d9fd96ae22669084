//! What alarms would have done over recorded days, as text.

use std::{collections::BTreeSet, fmt};

use chrono::TimeDelta;
use chrono_tz::Tz;

use super::table::Table;
use crate::alarm::{
    Priority,
    trial::{ACCEPTABLE_FLOOD_PCT, ACCEPTABLE_PER_10_MIN, FLOOD_BEGINS_ABOVE, Figures, MANAGEABLE_PER_10_MIN},
};

/// Two sets of alarms side by side, or one alone.
pub struct SideBySide<'a> {
    /// What each is called, and what came of it.
    pub sets: [Option<(&'a str, &'a Figures)>; 2],
    /// Zone of the times.
    pub zone: Tz,
}

/// Many sets of alarms, one under another.
pub struct Swept<'a>(pub &'a [(String, Figures)]);

impl SideBySide<'_> {
    fn row(&self, what: impl Into<String>, acceptable: &str, of: impl Fn(&Figures) -> String) -> [String; 4] {
        let [first, second] = self.sets.map(|set| set.map_or(String::new(), |(_, figures)| of(figures)));
        [what.into(), first, second, acceptable.to_owned()]
    }

    fn measures(&self) -> Vec<[String; 4]> {
        let mut rows = vec![self.row("alarms", "", |f| f.alarms().to_string())];
        for priority in Priority::ALL.into_iter().rev() {
            rows.push(self.row(format!("  {priority}"), "", |f| f.by_priority[priority as usize].to_string()));
        }
        let average = format!("{ACCEPTABLE_PER_10_MIN}, at most {MANAGEABLE_PER_10_MIN}");
        let hourly = format!("{}, at most {}", 6.0 * ACCEPTABLE_PER_10_MIN, 6.0 * MANAGEABLE_PER_10_MIN);
        rows.extend([
            self.row("per hour", &hourly, |f| rate(f.per_hour())),
            self.row("per 10 minutes", &average, |f| rate(f.per_10_min())),
            self.row("most in 10 minutes", &FLOOD_BEGINS_ABOVE.to_string(), |f| f.most_in_10_min.to_string()),
            self.row("floods", "", |f| f.floods.to_string()),
            self.row("time in flood, %", &format!("below {ACCEPTABLE_FLOOD_PCT}"), |f| format!("{:.1}", f.flood_pct)),
            self.row("chattering alarms", "0", |f| f.chattering.len().to_string()),
            self.row("stale alarms", "few", |f| f.stale.len().to_string()),
            self.row("standing minutes", "", |f| format!("{:.0}", f.standing_min())),
            self.row("ends of a margin", "", |f| f.ends.len().to_string()),
            self.row("  not warned of", "0", |f| f.missed().to_string()),
            self.row("  warned, median", "", |f| lead(f.median_lead())),
        ]);
        rows
    }

    fn figures(&self) -> impl Iterator<Item = &Figures> {
        self.sets.iter().flatten().map(|(_, figures)| *figures)
    }
}

impl fmt::Display for SideBySide<'_> {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let [first, second] = self.sets.map(|set| set.map(|(name, _)| name).unwrap_or_default());
        writeln!(f, "{:.1} hours", self.figures().map(|figures| figures.hours).fold(0.0, f64::max))?;
        write!(f, "\n{}", Table::new(["", first, second, "acceptable"], self.measures()))?;

        let kinds: BTreeSet<_> = self.figures().flat_map(|figures| figures.by_kind.keys().copied()).collect();
        let kinds = kinds.into_iter().map(|kind| {
            self.row(kind.word(), "", |figures| {
                let (alarms, minutes) = figures.by_kind.get(&kind).copied().unwrap_or_default();
                format!("{alarms}, standing {minutes:.0} min")
            })
        });
        write!(f, "\n  alarms by kind\n{}", Table::new(["", first, second, ""], kinds))?;

        for (what, names) in [
            ("chattering", (|figures| &figures.chattering) as fn(&Figures) -> &Vec<_>),
            ("stale", |figures| &figures.stale),
        ] {
            let named: BTreeSet<_> = self.figures().flat_map(names).collect();
            let rows: Vec<_> = named
                .into_iter()
                .map(|name| {
                    let yes = |figures: &Figures| if names(figures).contains(name) { "yes" } else { "no" }.to_owned();
                    self.row(format!("{}: {}", name.0, name.1), "", yes)
                })
                .collect();
            if !rows.is_empty() {
                write!(f, "\n  {what}\n{}", Table::new(["", first, second, ""], rows))?;
            }
        }

        // Both sets saw the same headroom.
        let Some(ends) = self.figures().next().map(|figures| &figures.ends) else { return Ok(()) };
        if ends.is_empty() {
            return Ok(());
        }
        let rows = ends.iter().enumerate().map(|(index, end)| {
            let time = end.time.with_timezone(&self.zone).format("%Y-%m-%d %H:%M:%S");
            self.row(format!("{time} {}", end.corridor), "", |f| {
                f.ends.get(index).and_then(|end| end.lead).map_or("not warned".to_owned(), |time| lead(Some(time)))
            })
        });
        write!(
            f,
            "\n  ends of a margin, and how long before an alarm stood\n{}",
            Table::new(["", first, second, ""], rows)
        )
    }
}

impl fmt::Display for Swept<'_> {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let row = |(name, figures): &(String, Figures)| {
            [
                name.clone(),
                figures.alarms().to_string(),
                rate(figures.per_10_min()),
                figures.most_in_10_min.to_string(),
                figures.floods.to_string(),
                figures.chattering.len().to_string(),
                figures.stale.len().to_string(),
                format!("{:.0}", figures.standing_min()),
                format!("{} of {}", figures.missed(), figures.ends.len()),
                lead(figures.median_lead()),
            ]
        };
        let heading =
            ["", "alarms", "per 10 min", "most", "floods", "chattering", "stale", "standing min", "missed", "lead"];
        write!(f, "{}", Table::new(heading, self.0.iter().map(row)))
    }
}

fn rate(rate: Option<f64>) -> String {
    rate.map_or("-".to_owned(), |rate| format!("{rate:.2}"))
}

fn lead(lead: Option<TimeDelta>) -> String {
    lead.map_or("-".to_owned(), |lead| format!("{:.1} min", lead.as_seconds_f64() / 60.0))
}
