use super::InputReport;
use crate::feed::{InputState, InputStatus, Monitor};

/// Every input in words.
pub(super) fn inputs(monitor: &Monitor) -> Vec<InputReport> {
    monitor.inputs().into_iter().map(report).collect()
}

fn report(input: InputStatus) -> InputReport {
    let standing = match input.state {
        InputState::Waiting => "waiting, nobody is there yet",
        InputState::Connected => "reading",
        InputState::Reconnecting => "LOST, being opened again",
        InputState::Ended => "ended",
    };
    let address = input.address.map_or(String::new(), |address| format!(" on {address}"));
    InputReport {
        standing: format!("{standing}{address}, {} frames", input.tally.frames),
        findings: input.tally.findings(),
        name: input.name,
    }
}
