//! How far the reading of files has come.

use std::io::Read;

use indicatif::{ProgressBar, ProgressStyle};

use crate::review::Deferred;

/// A bar on standard error, counting bytes; nothing where that is no terminal.
pub(super) fn bar(what: &'static str) -> ProgressBar {
    let template = "{msg}{bar:40} {percent:>3} % of {binary_total_bytes}, {eta} left";
    let style = ProgressStyle::with_template(template).unwrap_or_else(|_| ProgressStyle::default_bar());
    ProgressBar::new(0).with_style(style).with_message(what)
}

/// Counts on a bar what is read.
pub(super) fn following(bar: &ProgressBar) -> impl Fn(Deferred) -> Box<dyn Read + Send> + Sync + 'static {
    let bar = bar.clone();
    move |file| Box::new(bar.wrap_read(file))
}
