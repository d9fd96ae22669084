//! What the commands that read frames have in common.

use chrono::TimeDelta;

use super::Failure;
use crate::{
    config::Config,
    feed::{Channels, Holder, Input},
};

/// The inputs named on the command line, else those of the configuration.
pub(super) fn chosen(named: &[Input], config: &Config) -> Result<Vec<Input>, Failure> {
    let mut inputs = named.to_vec();
    if inputs.is_empty() {
        inputs = config.feed.inputs.iter().map(|input| input.parse()).collect::<Result<_, _>>()?;
    }
    if inputs.is_empty() {
        return Err("no input: name a file or an --input, or set `inputs` under [feed] in the configuration".into());
    }
    if inputs.iter().filter(|input| **input == Input::Stdin).count() > 1 {
        return Err("standard input can be read only once".into());
    }
    Ok(inputs)
}

/// How long a value stands.
pub(super) fn max_age(config: &Config) -> TimeDelta {
    config.feed.max_age()
}

/// Keeps values as long as the configuration says.
pub(super) fn holder(config: &Config, channels: &Channels) -> Holder {
    Holder::new(channels, max_age(config))
}
