//! JSON Lines: the assessment record as other programs read it.

use std::io::{self, Write};

use crate::desk::Assessment;

/// Writes one record on one line. What is not finite, and so no JSON, is written as `null`.
pub fn write(assessment: &Assessment, mut to: impl Write) -> io::Result<()> {
    serde_json::to_writer(&mut to, assessment)?;
    to.write_all(b"\n")
}
