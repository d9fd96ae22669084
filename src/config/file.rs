use std::{fs::File, io::Read, path::Path};

use super::error::ConfigError;

/// Far beyond any configuration written by people, bytes.
const LARGEST_FILE: u64 = 4 << 20;

/// The text of a file, or what is wrong with it.
pub(crate) fn read(path: &Path) -> Result<String, ConfigError> {
    let failure = |message: String| ConfigError { line: None, key: String::new(), message };
    let unreadable = |error| failure(format!("cannot be read: {error}; check the path and the permissions"));
    if path.is_dir() {
        return Err(failure("is a directory; name a file in it".to_owned()));
    }
    let mut bytes = Vec::new();
    let file = File::open(path).map_err(unreadable)?;
    file.take(LARGEST_FILE + 1).read_to_end(&mut bytes).map_err(unreadable)?;
    if bytes.len() as u64 > LARGEST_FILE {
        return Err(failure(format!("is larger than {} MiB; is it the right file?", LARGEST_FILE >> 20)));
    }
    String::from_utf8(bytes).map_err(|error| {
        let good = &error.as_bytes()[..error.utf8_error().valid_up_to()];
        let line = Some(good.split(|byte| *byte == b'\n').count());
        ConfigError { line, ..failure("is not UTF-8 from here on; save it as UTF-8".to_owned()) }
    })
}
