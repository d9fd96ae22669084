//! Learning the sources: a recorded day, many drills with random truths, and hostile feeds.

mod corridor;
mod orrin_tesk;

use tautline::source::{Learner, Settings};

#[test]
fn a_recorded_day_comes_to_the_truth() {
    let mut learner = Learner::new(&orrin_tesk::configured(), Settings::default());
    for seen in orrin_tesk::day() {
        if let Some(step) = learner.observe(&seen) { let e = learner.estimate(); let sd = e.sd();
            println!("{} {:?} p={:.2} de={:.2} {:.2} topo={} ex={} | X1 {:.2}±{:.2} X2 {:.2}±{:.2} R {:.2}±{:.2} {:.2}±{:.2}", step.time.format("%H:%M:%S"), step.moved, step.probability, step.de_kv[0], step.de_kv[1], step.topology_changed, step.explained, e.mean[1], sd[1], e.mean[3], sd[3],e.mean[0], sd[0], e.mean[2], sd[2]); }
    }
    let estimate = learner.estimate();
    for (side, truth) in orrin_tesk::TRUTH.into_iter().enumerate() {
        let (x, sd) = (estimate.mean[2 * side + 1], estimate.sd()[2 * side + 1]);
        assert!((x - truth).abs() < 0.06 * truth && (x - truth).abs() < 2.0 * sd, "side {side}: {x:.2} ± {sd:.2}, truth {truth}");
    }
}
