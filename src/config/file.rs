use std::{fs::File, io::Read, path::Path};

/// Far beyond any configuration written by people, bytes.
const LARGEST_FILE: u64 = 4 << 20;

/// The text of a file, or what is wrong with it.
pub(crate) fn read(path: &Path) -> Result<String, String> {
    if path.is_dir() {
        return Err("is a directory; name the configuration file in it".to_owned());
    }
    let unreadable = |error| format!("cannot be read: {error}; check the path and the permissions");
    let mut bytes = Vec::new();
    let file = File::open(path).map_err(unreadable)?;
    file.take(LARGEST_FILE + 1).read_to_end(&mut bytes).map_err(unreadable)?;
    if bytes.len() as u64 > LARGEST_FILE {
        return Err(format!("is larger than {} MiB; that is no configuration", LARGEST_FILE >> 20));
    }
    String::from_utf8(bytes).map_err(|error| {
        let good = &error.as_bytes()[..error.utf8_error().valid_up_to()];
        let line = 1 + good.iter().filter(|byte| **byte == b'\n').count();
        format!("is not UTF-8 (line {line}); save it as UTF-8")
    })
}
