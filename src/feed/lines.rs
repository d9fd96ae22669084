/// Longest line that is looked at; a longer one is skipped to its end without being held. The frame with which a recorded
/// day of some eighty corridors starts fits in.
pub(crate) const MAX_LINE_BYTES: usize = 8 << 20;

/// Cuts a stream of bytes into lines, whatever the pieces it comes in.
#[derive(Debug, Default)]
pub(super) struct Lines {
    /// The beginning of a line whose end has not come yet.
    begun: Vec<u8>,
    too_long: bool,
    number: u64,
}

/// A line's number, counted from 1, and its text without white space around it; `None`: too long.
type Line<'a> = (u64, Option<&'a [u8]>);

impl Lines {
    /// Takes the next piece of the stream; empty lines are left out.
    pub fn push(&mut self, bytes: &[u8], mut each: impl FnMut(Line)) {
        for piece in bytes.split_inclusive(|&byte| byte == b'\n') {
            let ends = piece.ends_with(b"\n");
            if ends && self.begun.is_empty() && piece.len() <= MAX_LINE_BYTES && !self.too_long {
                self.number += 1;
                each_trimmed(self.number, piece, &mut each);
            } else {
                self.extend(piece);
                if ends {
                    self.finish(&mut each);
                }
            }
        }
    }

    /// Ends the line that has begun, if there is one.
    pub fn finish(&mut self, mut each: impl FnMut(Line)) {
        if std::mem::take(&mut self.too_long) {
            self.number += 1;
            each((self.number, None));
        } else if !self.begun.is_empty() {
            self.number += 1;
            each_trimmed(self.number, &self.begun, &mut each);
            self.begun.clear();
        }
    }

    fn extend(&mut self, piece: &[u8]) {
        self.too_long |= self.begun.len() + piece.len() > MAX_LINE_BYTES;
        if self.too_long {
            self.begun.clear();
        } else {
            self.begun.extend_from_slice(piece);
        }
    }
}

fn each_trimmed(number: u64, line: &[u8], mut each: impl FnMut(Line)) {
    let line = line.strip_prefix(b"\xef\xbb\xbf").unwrap_or(line).trim_ascii();
    if !line.is_empty() {
        each((number, Some(line)));
    }
}
