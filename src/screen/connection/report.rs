use super::InputReport;
use crate::{
    feed::{InputState, InputStatus, Monitor},
    recording::{Recorder, Status},
};

/// Every input in words.
pub(super) fn inputs(monitor: &Monitor) -> Vec<InputReport> {
    monitor.inputs().into_iter().map(report).collect()
}

/// A recording in words.
pub(super) fn recording(recorder: &Recorder) -> InputReport {
    let Status { file, recorded, lost, trouble, .. } = recorder.status();
    let file = file.as_ref().and_then(|file| file.file_name()).map(|name| name.to_string_lossy().into_owned());
    let standing = match (&trouble, file) {
        (Some(_), _) => "NOT WRITTEN".into(),
        (None, Some(file)) => format!("{file}, {recorded} frames"),
        (None, None) => "nothing recorded yet".into(),
    };
    InputReport {
        name: recorder.folder().display().to_string().into(),
        standing,
        findings: trouble.into_iter().chain(missing(lost)).collect(),
    }
}

/// What there is to say of a recording that has ended, if it was not all well.
pub(super) fn unrecorded(Status { lost, trouble, .. }: &Status) -> Option<String> {
    let said: Vec<_> = trouble.clone().into_iter().chain(missing(*lost)).collect();
    (!said.is_empty()).then(|| said.join("; "))
}

fn missing(lost: u64) -> Option<String> {
    (lost > 0).then(|| format!("{lost} frames are not in the recording"))
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
