use thiserror::Error;

use super::lines::MAX_LINE_BYTES;

/// Why a line is no frame.
#[derive(Debug, Error)]
pub(super) enum LineError {
    #[error("longer than {MAX_LINE_BYTES} bytes")]
    TooLong,
    #[error("not UTF-8")]
    NotUtf8,
    #[error("not a JSON object")]
    NoObject,
    #[error("{0}")]
    Json(#[from] serde_json::Error),
    #[error("the time is not RFC 3339, such as 2031-03-14T05:00:00Z")]
    Time,
    /// Makes every line below it useless too.
    #[error("the header has not exactly one column named `time`")]
    Header,
    #[error("{found} cells below a header of {expected}")]
    Cells { found: usize, expected: usize },
}
