//! Plots of a corridor as SVG.

use super::{
    Paper,
    clock::Clock,
    compare::cause,
    figures::{NO_BALANCE, minutes, mw, name, room},
    markup::{escape, put, px},
    scale::{Scale, TimeScale},
    strip,
};
use crate::{
    desk::State,
    events::{Event, EventKind},
    review::{CorridorReview, Course, Series, Slot},
};

const WIDTH_PX: f64 = 1000.0;
const LEFT_PX: f64 = 66.0;
const RIGHT_PX: f64 = 974.0;
const TRANSFER_PX: [f64; 2] = [24.0, 124.0];
const HEADROOM_PX: [f64; 2] = [162.0, 362.0];
const SWITCHING_PX: f64 = 378.0;
const ALARMS_PX: f64 = 396.0;
const STRIP_PX: f64 = 408.0;

/// Draws the course of one corridor.
pub(super) struct CoursePlot<'a> {
    pub paper: Paper<'a>,
    pub clock: Clock,
    pub time: &'a TimeScale,
    pub corridor: &'a CorridorReview,
    /// As it was and, with a what-if, as it would have been.
    pub series: &'a [Series],
    /// Unique in the page.
    pub id: &'a str,
}

impl CoursePlot<'_> {
    pub fn draw(&self, page: &mut String) {
        let would = self.corridor.what_if.as_ref();
        let end_px = STRIP_PX + 22.0 * self.series.len() as f64;
        opening(page, self.id, [WIDTH_PX, end_px + 34.0], &self.title(), &self.essence());
        let courses = || [Some(&self.corridor.was), would].into_iter().flatten();
        let slots = || self.series.iter().flat_map(|series| &series.slots);
        let transfer =
            Scale::new(slots().filter_map(|slot| slot.transfer_mw).flatten(), TRANSFER_PX[0], TRANSFER_PX[1], 4.0);
        let thin_mw = self.paper.configured(self.corridor).map(|known| known.thin_mw);
        let headrooms = slots().filter_map(|slot| slot.headroom_mw).flatten().chain([0.0]).chain(thin_mw);
        let headroom = Scale::new(headrooms, HEADROOM_PX[0], HEADROOM_PX[1], 7.0);
        self.time_grid(page, end_px);
        panel(page, &transfer, &self.transfer_word(), TRANSFER_PX, (LEFT_PX, RIGHT_PX));
        panel(page, &headroom, "headroom, MW", HEADROOM_PX, (LEFT_PX, RIGHT_PX));
        level(page, &headroom, 0.0, "zero", (LEFT_PX, RIGHT_PX));
        if let Some(thin_mw) = thin_mw {
            level(page, &headroom, thin_mw, "threshold", (LEFT_PX, RIGHT_PX));
        }
        self.bands(page, &transfer, "transfer", |slot| slot.transfer_mw);
        self.bands(page, &headroom, "headroom", |slot| slot.headroom_mw);
        for (course, class) in courses().zip(["was", "would"]) {
            self.least(page, course, &headroom, class);
        }
        self.least_in_words(page, courses());
        self.marks(page);
        for ((series, word), top_px) in self.series.iter().zip(["state", "would be"]).zip([STRIP_PX, STRIP_PX + 22.0]) {
            strip::draw(page, series, self.time, top_px);
            label(page, word, top_px + 13.0);
        }
        *page += "</svg>\n";
    }

    fn title(&self) -> String {
        format!("{}: transfer and headroom over time", name(&self.corridor.corridor))
    }

    /// The plot in a few sentences.
    fn essence(&self) -> String {
        let told = |course: &Course| {
            let transfer = course.transfer_mw.map_or("Transfer never known.".to_owned(), |[low, high]| {
                format!("Transfer between {} and {} MW.", mw(low), mw(high))
            });
            let none = course.unbalanced.map_or("Headroom never known.".to_owned(), |unbalanced| {
                format!("No balance from {}.", self.clock.when(unbalanced.first))
            });
            let least = course.lowest().map_or(none, |least| {
                let cause =
                    least.binding.as_ref().map_or(String::new(), |binding| format!(", set by {}", cause(binding)));
                format!("Least headroom {} MW at {}{cause}.", room(least.headroom_mw), self.clock.when(least.time))
            });
            let [thin, spent, blind] =
                [State::Thin, State::Spent, State::Blind].map(|state| minutes(course.minutes(state)));
            format!("{transfer} {least} Minutes thin {thin}, spent {spent}, blind {blind}.")
        };
        let would =
            self.corridor.what_if.as_ref().map_or(String::new(), |would| format!(" Would have been: {}", told(would)));
        told(&self.corridor.was) + &would
    }

    fn transfer_word(&self) -> String {
        match self.paper.terminals(self.corridor) {
            ["", _] | [_, ""] => "transfer, MW".into(),
            [from, to] => format!("transfer, MW from {} to {}", name(from), name(to)),
        }
    }

    fn time_grid(&self, page: &mut String, end_px: f64) {
        let mut path = String::new();
        let mut labels = String::new();
        for tick in self.time.ticks() {
            let x = self.time.x(tick.at_s);
            for [top, bottom] in [TRANSFER_PX, HEADROOM_PX] {
                path.push('M');
                px(&mut path, x);
                put!(path, " {top}V{bottom}");
            }
            text(&mut labels, "tick middle", x, end_px + 13.0, &tick.label);
            if let Some(offset) = tick.offset {
                text(&mut labels, "tick middle offset", x, end_px + 27.0, &offset);
            }
        }
        put!(page, "<path class=\"grid\" d=\"{path}\"/>{labels}");
        for shift in self.time.shifts() {
            let x = self.time.x(shift.at_s);
            *page += "<path class=\"shift\" d=\"M";
            px(page, x);
            put!(page, " {}V{end_px}\"/>", TRANSFER_PX[0]);
            let anchor = if x > 850.0 { "tick end" } else { "tick" };
            let beside = if x > 850.0 { x - 4.0 } else { x + 4.0 };
            text(page, anchor, beside, HEADROOM_PX[0] - 22.0, &format!("{} → {}", shift.from, shift.to));
        }
    }

    /// A band from the lowest to the highest of each slot, in fine units; where slots are missing there is none.
    fn band(&self, series: &Series, scale: &Scale, of: fn(&Slot) -> Option<[f64; 2]>) -> String {
        let mut pen = Pen::default();
        let known: Vec<_> = series.slots.iter().filter_map(|slot| Some((slot.at_s, of(slot)?))).collect();
        for run in known.chunk_by(|(before, _), (after, _)| after - before == series.slot_s) {
            let edges = |at_s: i64| [at_s, at_s + series.slot_s].map(|at_s| self.time.x(at_s));
            let highs = run.iter().map(|(at_s, [_, high])| (edges(*at_s), *high));
            let lows = run.iter().rev().map(|(at_s, [low, _])| {
                let [left, right] = edges(*at_s);
                ([right, left], *low)
            });
            for (place, ([begin, end], value)) in highs.chain(lows).enumerate() {
                if place == 0 {
                    pen.start(begin, scale.y(value));
                }
                pen.step(end, scale.y(value));
            }
            pen.close();
        }
        pen.path
    }

    /// Bands of what was and of what would have been, where that is something else.
    fn bands(&self, page: &mut String, scale: &Scale, what: &str, of: fn(&Slot) -> Option<[f64; 2]>) {
        let paths: Vec<_> = self.series.iter().map(|series| self.band(series, scale, of)).collect();
        for (place, (path, class)) in paths.iter().zip(["was", "would"]).enumerate() {
            if !path.is_empty() && (place == 0 || *path != paths[0]) {
                put!(page, "<path class=\"band {what} {class}\" {FINE} d=\"{path}\"/>");
            }
        }
    }

    fn least(&self, page: &mut String, course: &Course, scale: &Scale, class: &str) {
        let Some(least) = course.lowest() else { return };
        let (x, y) = (self.time.x(least.time.timestamp()), scale.y(least.headroom_mw));
        put!(page, "<circle class=\"least {class}\" r=\"4\" cx=\"");
        px(page, x);
        *page += "\" cy=\"";
        px(page, y);
        *page += "\"/>";
    }

    /// The least headrooms in words, at the head of their panel.
    fn least_in_words<'b>(&self, page: &mut String, courses: impl Iterator<Item = &'b Course>) {
        let mut words = Vec::new();
        for (course, (class, word)) in courses.zip([("was", "least"), ("would", "would have been")]) {
            let told = match (course.lowest(), course.unbalanced) {
                (Some(least), _) => format!("○ {word} {} MW, {}", room(least.headroom_mw), self.clock.when(least.time)),
                (None, Some(none)) => format!("{word} {NO_BALANCE}, first {}", self.clock.when(none.first)),
                (None, None) => continue,
            };
            words.push(format!("<tspan class=\"{class}\">{}</tspan>", escape(&told)));
        }
        let y = HEADROOM_PX[0] - 9.0;
        put!(page, "<text class=\"said end\" x=\"{RIGHT_PX}\" y=\"{y}\">{}</text>", words.join("   "));
    }

    fn marks(&self, page: &mut String) {
        let own = |event: &&Event| event.corridor.as_ref() == Some(&self.corridor.corridor);
        for (kind, shape, y) in [
            (EventKind::Trip, "m-4.5 -4h9l-4.5 8z", SWITCHING_PX),
            (EventKind::Return, "m-4.5 4h9l-4.5 -8z", SWITCHING_PX),
            (EventKind::Bypass, "m-3.5 -3.5h7v7h-7z", SWITCHING_PX),
            (EventKind::Insertion, "m-3.5 -3.5h7v7h-7z", SWITCHING_PX),
            (EventKind::Alarm, "m-4 0l4 -4l4 4l-4 4z", ALARMS_PX),
        ] {
            let events = self.paper.review.events.iter().filter(own).filter(|event| event.kind == kind);
            let mut places: Vec<_> = events.map(|event| self.time.x(event.time.timestamp()).round()).collect();
            places.dedup_by(|later, earlier| *later - *earlier < 2.0);
            let path: Vec<_> = places.iter().map(|x| format!("M{x} {y}{shape}")).collect();
            let path = path.concat();
            if !path.is_empty() {
                put!(page, "<path class=\"mark {}\" d=\"{path}\"/>", kind.word());
            }
        }
        label(page, "switching", SWITCHING_PX + 4.0);
        label(page, "alarms", ALARMS_PX + 4.0);
    }
}

const CURVE_PX: [f64; 2] = [520.0, 300.0];
const CURVE_X_PX: (f64, f64) = (66.0, 496.0);
const CURVE_Y_PX: [f64; 2] = [24.0, 256.0];

/// Draws for which part of the time the headroom was how large.
pub(super) fn durations(page: &mut String, paper: &Paper, corridor: &CorridorReview, id: &str) {
    let courses = || [Some(&corridor.was), corridor.what_if.as_ref()].into_iter().flatten();
    let held = |course: &Course| {
        let parts = [100_u8, 95, 50].iter().filter_map(|pct| {
            let held = course.held_for(f64::from(*pct) / 100.0)?;
            Some(format!("{} MW for {pct} % of the time", mw(held.into())))
        });
        parts.collect::<Vec<_>>().join(", ")
    };
    let told: Vec<_> = courses().map(held).collect();
    let told = format!("There were at least {}.", told.join("; would have been at least "));
    opening(page, id, CURVE_PX, &format!("{}: duration curve of the headroom", name(&corridor.corridor)), &told);
    let thin_mw = paper.configured(corridor).map(|known| known.thin_mw);
    let ends = |course: &Course| {
        let mut curve = course.durations.curve().map(|(mw, _)| f64::from(mw));
        let first = curve.next();
        [first, curve.last()]
    };
    let values = courses().flat_map(ends).flatten().chain([0.0]).chain(thin_mw);
    let scale = Scale::new(values, CURVE_Y_PX[0], CURVE_Y_PX[1], 7.0);
    panel(page, &scale, "headroom, MW", CURVE_Y_PX, CURVE_X_PX);
    level(page, &scale, 0.0, "zero", CURVE_X_PX);
    if let Some(thin_mw) = thin_mw {
        level(page, &scale, thin_mw, "threshold", CURVE_X_PX);
    }
    let x = |part: f64| CURVE_X_PX.0 + part * (CURVE_X_PX.1 - CURVE_X_PX.0);
    for pct in [0_u8, 25, 50, 75, 100] {
        text(page, "tick middle", x(f64::from(pct) / 100.0), CURVE_Y_PX[1] + 15.0, &format!("{pct} %"));
    }
    text(page, "tick middle", x(0.5), CURVE_Y_PX[1] + 32.0, "part of the time with at least so much");
    for (course, class) in courses().zip(["was", "would"]) {
        let path = curve(course, &scale, x);
        if !path.is_empty() {
            put!(page, "<path class=\"curve {class}\" {FINE} d=\"{path}\"/>");
        }
    }
    *page += "</svg>\n";
}

fn curve(course: &Course, scale: &Scale, x: impl Fn(f64) -> f64) -> String {
    let total = course.durations.total_ms().max(1) as f64;
    let mut pen = Pen::default();
    let mut drawn: Option<(f64, f64)> = None;
    let mut points = course.durations.curve().peekable();
    while let Some((mw, ms)) = points.next() {
        let (right, y) = (x(ms as f64 / total), scale.y(mw.into()));
        match drawn {
            None => pen.start(x(0.0), y),
            // Too near to be seen.
            Some((x, before)) if right - x < 1.5 && y - before < 1.5 && points.peek().is_some() => continue,
            Some(_) => {}
        }
        pen.step(right, y);
        drawn = Some((right, y));
    }
    pen.path
}

/// Units of a [`Pen`] in a pixel, and what scales them back.
const FINENESS: f64 = 5.0;
const FINE: &str = "transform=\"scale(.2)\"";

/// Draws steps in whole fine units, which makes the shortest of paths.
#[derive(Default)]
struct Pen {
    path: String,
    at: (i64, i64),
}

impl Pen {
    fn start(&mut self, x: f64, y: f64) {
        self.at = (fine(x), fine(y));
        let path = &mut self.path;
        put!(path, "M{} {}", self.at.0, self.at.1);
    }

    /// First up or down, then along.
    fn step(&mut self, x: f64, y: f64) {
        let to = (fine(x), fine(y));
        let path = &mut self.path;
        if to.1 != self.at.1 {
            put!(path, "v{}", to.1 - self.at.1);
        }
        put!(path, "h{}", to.0 - self.at.0);
        self.at = to;
    }

    fn close(&mut self) {
        self.path.push('z');
    }
}

fn fine(px: f64) -> i64 {
    // Within a plot.
    #[allow(clippy::cast_possible_truncation)]
    let units = (px * FINENESS).round() as i64;
    units
}

fn opening(page: &mut String, id: &str, [width, height]: [f64; 2], title: &str, essence: &str) {
    put!(
        page,
        "<svg class=\"plot\" viewBox=\"0 0 {width} {height}\" role=\"img\" aria-labelledby=\"{id}-t {id}-d\">\
         <title id=\"{id}-t\">{}</title><desc id=\"{id}-d\">{}</desc>",
        escape(title),
        escape(essence)
    );
}

/// Frame, values and name of a panel.
fn panel(page: &mut String, scale: &Scale, title: &str, [top, bottom]: [f64; 2], (left, right): (f64, f64)) {
    let mut path = String::new();
    for (value, word) in scale.ticks() {
        let y = scale.y(value);
        put!(path, "M{left} ");
        px(&mut path, y);
        put!(path, "H{right}");
        text(page, "tick end", left - 7.0, y + 4.0, &word);
    }
    put!(page, "<path class=\"grid\" d=\"{path}M{left} {top}V{bottom}\"/>");
    text(page, "name", left, top - 9.0, title);
}

fn level(page: &mut String, scale: &Scale, value: f64, class: &str, (left, right): (f64, f64)) {
    put!(page, "<path class=\"level {class}\" d=\"M{left} ");
    px(page, scale.y(value));
    put!(page, "H{right}\"/>");
}

fn label(page: &mut String, word: &str, y: f64) {
    text(page, "tick end", LEFT_PX - 7.0, y, word);
}

fn text(page: &mut String, class: &str, x: f64, y: f64, words: &str) {
    put!(page, "<text class=\"{class}\" x=\"");
    px(page, x);
    *page += "\" y=\"";
    px(page, y);
    put!(page, "\">{}</text>", escape(words));
}

/// The time axis of a review: whole slots, so that a single frame has a width too.
pub(super) fn time_scale(paper: &Paper) -> TimeScale {
    let slot_s = |corridor: &CorridorReview| corridor.was.series.slot_s;
    let slot_s = paper.review.corridors.iter().map(slot_s).max().unwrap_or(1);
    let [first, last] = paper.review.span.map_or([0; 2], |(first, last)| [first.timestamp(), last.timestamp()]);
    TimeScale {
        zone: paper.zone,
        begin_s: first.div_euclid(slot_s) * slot_s,
        end_s: (last.div_euclid(slot_s) + 1) * slot_s,
        left_px: LEFT_PX,
        right_px: RIGHT_PX,
    }
}
