//! One drill, and what desks make of it.

use std::{sync::Arc, time::Duration};

use chrono::TimeDelta;
use tautline::{
    config::Config,
    desk::{CorridorDesk, Desk},
    drill::{Drill, Invention, Scenario, Truth},
    feed::{Channels, Frame, Holder, Snapshot},
    source::{Estimate, Step},
};

/// From one look at the headroom to the next, s.
const LOOK_EVERY_S: f64 = 60.0;

/// A drill of one corridor.
pub struct Course {
    pub config: Config,
    pub scenario: Scenario,
    channels: Arc<Channels>,
}

/// How it went.
pub struct Outcome {
    pub estimate: Estimate,
    pub true_x_ohm: [f64; 2],
    pub steps: Vec<Step>,
    pub facts: Vec<Truth>,
    pub looks: Vec<Look>,
}

/// A headroom's errors against that of the true sources, MW: learned, and as configured.
pub struct Look {
    pub learned_off: f64,
    pub learned_sd: f64,
    pub configured_off: f64,
}

impl Course {
    pub fn new(invention: &Invention) -> Self {
        let (config, scenario) = invention.invent().read().unwrap();
        Self { channels: Arc::new(Channels::new(&config)), config, scenario }
    }

    pub fn changed(mut self, change: impl FnOnce(&mut Scenario)) -> Self {
        change(&mut self.scenario);
        self
    }

    pub fn true_x_ohm(&self) -> [f64; 2] {
        [0, 1].map(|side| self.scenario.corridors[0].sides[side].x_ohm)
    }

    pub fn drill(&self) -> Drill {
        Drill::new(&self.config, &self.channels, &self.scenario)
    }

    /// Frames as they stand in a feed: with what is held of earlier ones.
    pub fn snapshots(&self, frames: impl Iterator<Item = Frame>) -> impl Iterator<Item = Snapshot> {
        let max_age = TimeDelta::from_std(Duration::from_secs_f64(self.config.feed.max_age_s)).unwrap();
        let mut holder = Holder::new(&self.channels, max_age);
        frames.filter_map(move |frame| holder.take(&frame))
    }

    /// A desk that learns.
    pub fn learning(&self) -> CorridorDesk {
        self.desk(&self.config)
    }

    /// A desk that holds the configured sources.
    pub fn holding(&self) -> CorridorDesk {
        let mut config = self.config.clone();
        config.learning.enabled = false;
        self.desk(&config)
    }

    /// A desk that holds the true sources.
    fn yardstick(&self) -> CorridorDesk {
        let mut config = self.config.clone();
        config.learning.enabled = false;
        for (side, truth) in config.grid.corridors[0].sides.iter_mut().zip(&self.scenario.corridors[0].sides) {
            (side.source.r_ohm, side.source.x_ohm) = (truth.r_ohm, truth.x_ohm);
        }
        self.desk(&config)
    }

    fn desk(&self, config: &Config) -> CorridorDesk {
        Desk::new(config, &self.channels).corridors.remove(0)
    }

    /// Plays it, and looks at the headroom now and then in its second half.
    pub fn run(&self) -> Outcome {
        let mut desk = self.learning();
        let mut others = [self.holding(), self.yardstick()];
        let (mut steps, mut looks) = (Vec::new(), Vec::new());
        let mut next_look_s = 0.5 * self.scenario.duration_s;
        let mut drill = self.drill();
        for snapshot in self.snapshots(drill.by_ref()) {
            if (snapshot.time - self.scenario.start).as_seconds_f64() < next_look_s {
                desk.follow(&snapshot);
            } else {
                next_look_s += LOOK_EVERY_S;
                let own = desk.assess(&snapshot);
                let [configured, truth] = others.each_mut().map(|other| other.assess(&snapshot).headroom_mw);
                let headrooms = [own.headroom_mw, own.headroom_sd_mw, configured, truth];
                if let [Some(learned), Some(learned_sd), Some(configured), Some(truth)] = headrooms {
                    let (learned_off, configured_off) = (learned - truth, configured - truth);
                    looks.push(Look { learned_off, learned_sd, configured_off });
                }
            }
            let newest = desk.learner().steps().next_back();
            steps.extend(newest.filter(|step| steps.last() != Some(*step)));
        }
        Outcome {
            estimate: *desk.learner().estimate(),
            true_x_ohm: self.true_x_ohm(),
            steps,
            facts: drill.take_truth(),
            looks,
        }
    }
}
