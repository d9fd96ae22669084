//! One corridor's part of the page.

use super::{
    Paper,
    clock::Clock,
    compare::{cause, causes, rows},
    figures::{lasting, minutes_of, name, number, share},
    markup::{Cell, Table, anchor, escape, put},
    plot::{CoursePlot, durations},
    scale::TimeScale,
};
use crate::review::{CorridorReview, SourceNote};

/// Rows of the tables; everything is in the JSON.
const MOST_ROWS: usize = 25;
/// Slots that are still told apart on a page.
const MOST_SLOTS: usize = 512;

/// One corridor, to be written.
pub(super) struct CorridorBlock<'a> {
    pub paper: Paper<'a>,
    pub clock: Clock,
    pub time: &'a TimeScale,
    pub corridor: &'a CorridorReview,
    pub place: usize,
}

impl CorridorBlock<'_> {
    pub fn write(&self, page: &mut String) {
        let anchor = anchor(self.place);
        let own = name(&self.corridor.corridor);
        put!(page, "<section id=\"{anchor}\" class=\"corridor\"><h2>{}</h2>\n", escape(&own));
        self.course(page, &format!("{anchor}-course"));
        *page += "<div class=\"parts\"><div class=\"figures\">";
        self.figures(page);
        *page += "</div><div class=\"half\"><h3>Duration curve</h3>\n<figure>";
        self.scroll(page, "duration curve");
        durations(page, &self.paper, self.corridor, &format!("{anchor}-durations"));
        *page += "</div></figure>";
        self.causes(page);
        *page += "</div></div>\n<div class=\"parts small\">";
        for part in [Self::sources, Self::alarms, Self::meters] {
            *page += "<div>";
            part(self, page);
            *page += "</div>";
        }
        *page += "</div></section>\n";
    }

    /// Begins an area that can be scrolled sideways.
    fn scroll(&self, page: &mut String, what: &str) {
        let label = escape(&self.label(what));
        put!(page, "<div class=\"scroll\" tabindex=\"0\" role=\"group\" aria-label=\"{label}\">");
    }

    fn label(&self, what: &str) -> String {
        format!("{}: {what}", name(&self.corridor.corridor))
    }

    fn table(&self, page: &mut String, caption: &str, heading: &[&str], rows: Vec<Vec<Cell>>) {
        let left_out = rows.len().saturating_sub(MOST_ROWS);
        let table = Table { caption, label: &self.label(caption), heading };
        table.write(page, rows.into_iter().take(MOST_ROWS));
        if left_out > 0 {
            put!(page, "<p class=\"muted\">{left_out} more are in the JSON report.</p>");
        }
    }

    fn course(&self, page: &mut String, id: &str) {
        *page += "<h3>Course</h3>\n<figure>";
        self.scroll(page, "course");
        let (paper, clock, time, corridor) = (self.paper, self.clock, self.time, self.corridor);
        let courses = [Some(&corridor.was), corridor.what_if.as_ref()].into_iter().flatten();
        let series: Vec<_> = courses.map(|course| course.series.clone().in_at_most(MOST_SLOTS)).collect();
        CoursePlot { paper, clock, time, corridor, series: &series, id }.draw(page);
        let slot = lasting(1000 * series[0].slot_s);
        put!(
            page,
            "</div><figcaption>Bands: lowest to highest in each {slot}, blank where there is nothing. ○ least headroom. "
        );
        if let Some(known) = paper.configured(corridor) {
            put!(page, "Dashed line: thin threshold, {} MW. ", number(known.thin_mw, 0));
        }
        *page += "▼ trip, △ return, ■ bypass, □ insertion, ◆ alarm raised or returned.";
        if corridor.what_if.is_some() {
            *page += " Dashed bands and the lower strip: as it would have been.";
        }
        *page += "</figcaption></figure>\n";
    }

    fn figures(&self, page: &mut String) {
        let compared = self.corridor.what_if.is_some();
        let heading: &[&str] =
            if compared { &["figure", "was", "would have been", "difference"] } else { &["figure", "was"] };
        let rows = rows(&self.clock, self.corridor).into_iter().map(|row| {
            let mut cells = vec![Cell::text(row.what.trim()), Cell::number(row.was)];
            if compared {
                cells.extend([Cell::number(row.would), Cell::number(row.difference)]);
            }
            cells
        });
        self.table(page, "Figures", heading, rows.collect());
    }

    fn causes(&self, page: &mut String) {
        let causes = causes(self.corridor);
        if causes.is_empty() {
            return;
        }
        let compared = self.corridor.what_if.is_some();
        let heading: &[&str] = if compared {
            &["outage, criterion", "was", "would have been", "share"]
        } else {
            &["outage, criterion", "was", "share"]
        };
        let sides = if compared { 2 } else { 1 };
        let rows = causes.iter().map(|(binding, parts)| {
            let parts = &parts[..sides];
            let mut cells = vec![Cell::text(cause(binding))];
            cells.extend(parts.iter().map(|part| Cell::number(share(*part))));
            cells.push(Cell::Bars(parts.to_vec()));
            cells
        });
        self.table(page, "What set the headroom, share of the time", heading, rows.collect());
    }

    fn sources(&self, page: &mut String) {
        let Some([first, last]) = &self.corridor.sources else { return };
        let row = |(when, note): (&str, &SourceNote)| {
            let ohm = |ohm: f64, sd: f64| Cell::number(format!("{} ±{}", number(ohm, 2), number(sd, 2)));
            let basis = Cell::text(note.basis.word());
            let bus = Cell::text(format!("{}, {when}", name(&note.bus)));
            vec![
                bus,
                ohm(note.r_ohm, note.r_sd),
                ohm(note.x_ohm, note.x_sd),
                basis,
                Cell::number(note.steps.to_string()),
            ]
        };
        let notes = first.iter().zip(last).flat_map(|(first, last)| [("first", first), ("last", last)]);
        let heading = ["behind", "R, ohm", "X, ohm", "basis", "steps"];
        self.table(page, "Sources at the first and the last frame", &heading, notes.map(row).collect());
    }

    fn alarms(&self, page: &mut String) {
        let was = &self.corridor.was.alarms;
        let would = self.corridor.what_if.as_ref().map(|course| &course.alarms);
        let only_there = would.into_iter().flatten().filter(|count| was.iter().all(|known| known.alarm != count.alarm));
        let raised = |alarms: &[crate::review::AlarmCount], alarm: &str| {
            Cell::number(alarms.iter().find(|count| *count.alarm == *alarm).map_or(0, |count| count.raised).to_string())
        };
        let rows: Vec<_> = was
            .iter()
            .chain(only_there)
            .map(|count| {
                let first =
                    [Cell::text(name(&count.alarm)), Cell::text(count.priority.word()), raised(was, &count.alarm)];
                first.into_iter().chain(would.map(|would| raised(would, &count.alarm))).collect()
            })
            .collect();
        if rows.is_empty() {
            *page += "<p>No alarm was raised.</p>";
            return;
        }
        let heading: &[&str] = if would.is_some() {
            &["alarm", "priority", "raised", "would have been"]
        } else {
            &["alarm", "priority", "raised"]
        };
        self.table(page, "Alarms", heading, rows);
    }

    fn meters(&self, page: &mut String) {
        let mut meters: Vec<_> = self.corridor.meters.iter().collect();
        if meters.is_empty() {
            *page += "<p>No channel was missing or set aside.</p>";
            return;
        }
        meters.sort_by_key(|(_, note)| std::cmp::Reverse(note.missing_ms + note.suspect_ms));
        let rows = meters.into_iter().map(|(channel, note)| {
            let minutes = [note.missing_ms, note.suspect_ms].map(|ms| Cell::number(minutes_of(ms)));
            [Cell::text(name(channel))].into_iter().chain(minutes).collect()
        });
        let heading = ["channel", "missing, min", "set aside, min"];
        self.table(page, "Channels that were of no use", &heading, rows.collect());
    }
}
