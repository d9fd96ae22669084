//! States as a strip: each has its own pattern and word, so that none depends on colour.

use super::{
    markup::{put, px},
    scale::TimeScale,
};
use crate::{desk::State, review::Series};

const HIGH_PX: f64 = 18.0;
/// From these widths there is room for the word, or for its first letter.
const WORD_PX: f64 = 52.0;
const LETTER_PX: f64 = 13.0;

/// The patterns, once a page.
pub(super) const PATTERNS: &str = "\
<svg class=\"defs\" width=\"0\" height=\"0\" aria-hidden=\"true\"><defs>\
<pattern id=\"p-ample\" width=\"8\" height=\"8\" patternUnits=\"userSpaceOnUse\">\
<rect class=\"ground ample\" width=\"8\" height=\"8\"/></pattern>\
<pattern id=\"p-thin\" width=\"6\" height=\"6\" patternUnits=\"userSpaceOnUse\" patternTransform=\"rotate(45)\">\
<rect class=\"ground thin\" width=\"6\" height=\"6\"/><rect class=\"ink thin\" width=\"2\" height=\"6\"/></pattern>\
<pattern id=\"p-blind\" width=\"6\" height=\"6\" patternUnits=\"userSpaceOnUse\">\
<rect class=\"ground blind\" width=\"6\" height=\"6\"/><circle class=\"ink blind\" cx=\"3\" cy=\"3\" r=\"1.2\"/></pattern>\
<pattern id=\"p-spent\" width=\"8\" height=\"8\" patternUnits=\"userSpaceOnUse\">\
<rect class=\"ink spent\" width=\"8\" height=\"8\"/></pattern></defs></svg>\n";

/// Time in one state without a break.
struct Run {
    state: State,
    begin_s: i64,
    end_s: i64,
}

/// Draws the worst state of each slot.
pub(super) fn draw(page: &mut String, series: &Series, time: &TimeScale, top_px: f64) {
    let runs = runs(series);
    for state in State::ALL {
        let mut path = String::new();
        for run in runs.iter().filter(|run| run.state == state) {
            let [left, right] = [run.begin_s, run.end_s].map(|at_s| time.x(at_s));
            path.push('M');
            px(&mut path, left);
            path.push(' ');
            px(&mut path, top_px);
            path.push('h');
            // Never too narrow to be seen.
            px(&mut path, (right - left).max(1.0));
            put!(path, "v{HIGH_PX}H");
            px(&mut path, left);
            path.push('z');
        }
        if !path.is_empty() {
            put!(page, "<path fill=\"url(#p-{})\" d=\"{path}\"/>", state.word());
        }
    }
    for run in &runs {
        let [left, right] = [run.begin_s, run.end_s].map(|at_s| time.x(at_s));
        let word = run.state.word();
        let word = match right - left {
            WORD_PX.. => word,
            LETTER_PX.. => &word[..1],
            _ => continue,
        };
        put!(page, "<text class=\"in-strip {}\" x=\"", run.state.word());
        px(page, f64::midpoint(left, right));
        *page += "\" y=\"";
        px(page, top_px + 13.0);
        put!(page, "\">{word}</text>");
    }
}

fn runs(series: &Series) -> Vec<Run> {
    let mut runs: Vec<Run> = Vec::new();
    for slot in &series.slots {
        let end_s = slot.at_s + series.slot_s;
        match runs.last_mut() {
            Some(run) if run.state == slot.state && run.end_s == slot.at_s => run.end_s = end_s,
            _ => runs.push(Run { state: slot.state, begin_s: slot.at_s, end_s }),
        }
    }
    runs
}
