//! Learning the sources: a recorded day, many drills with random truths, and hostile feeds.

mod corridor;
mod orrin_tesk;
mod simulator;

use simulator::Drill;
use tautline::{config::LearningSettings, source::{Learner, Moved}};

#[test]
fn a_recorded_day_comes_to_the_truth() {
    let mut learner = Learner::new(&orrin_tesk::configured(), LearningSettings::default());
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

fn run(drill: simulator::Drill) -> Outcome {
    let mut simulator = simulator::Simulator::new(drill);
    let f = |k: &str, d: f64| std::env::var(k).ok().and_then(|v| v.parse().ok()).unwrap_or(d);
    let mut learner = Learner::new(&simulator.configured, LearningSettings { window_s: f("W", 10.0), gap_s: f("G", 6.0), step_threshold: f("T", 5.0), aging_ohm_per_sqrt_day: f("A", 1.0), ..LearningSettings::default() });
    let mut steps = Vec::new();
    while let Some(seen) = simulator.next() {
        steps.extend(learner.observe(&seen));
    }
    let estimate = *learner.estimate();
    let error = std::array::from_fn(|side| (estimate.mean[2 * side + 1] - simulator.truth[side].im) / simulator.truth[side].im);
    let sds = std::array::from_fn(|side| (estimate.mean[2 * side + 1] - simulator.truth[side].im) / estimate.sd()[2 * side + 1]);
    let start = 1_930_000_000.0_f64;
    let _ = start;
    let t0: chrono::DateTime<chrono::Utc> = "2031-03-14T00:00:00Z".parse().unwrap();
    let (mut large, mut named, mut right) = (0, 0, 0);
    for step in &simulator.steps {
        let single = step.de_kv[0] == 0.0 || step.de_kv[1] == 0.0;
        if !single || step.de_kv[0].abs().max(step.de_kv[1].abs()) < 1.5 || step.time_s < 1800.0 || step.time_s > drill.hours * 3600.0 - 60.0 { continue; }
        large += 1;
        let side = if step.de_kv[0] != 0.0 { Moved::From } else { Moved::To };
        let near = steps.iter().filter(|s| ((s.time - t0).num_milliseconds() as f64 * 1e-3 - step.time_s).abs() < 8.0).next();
        if std::env::var("MISS").is_ok() {
            let gap = simulator.steps.iter().map(|o| (o.time_s - step.time_s).abs()).filter(|g| *g > 0.0).fold(f64::INFINITY, f64::min);
            let what = near.map_or("missed".to_owned(), |s| if s.moved == side { "right".to_owned() } else { format!("wrong {:?}", s.moved) });
            println!("MISS {what} size {:.2} gap {:.0}", step.de_kv[0].abs().max(step.de_kv[1].abs()), gap);
        }
        if let Some(s) = near { named += 1; if s.moved == side { right += 1; } }
    }
    let false_steps = steps.iter().filter(|s| !s.topology_changed && !simulator.steps.iter().any(|o| ((s.time - t0).num_milliseconds() as f64 * 1e-3 - o.time_s).abs() < 20.0 && o.de_kv[0].abs().max(o.de_kv[1].abs()) > 0.4)).count();
    Outcome { false_steps, error, sds, large, named, right, logged: steps.len(), widened: steps.iter().filter(|s| s.widened).count() }
}

#[derive(Debug)]
struct Outcome { false_steps: usize, error: [f64; 2], sds: [f64; 2], large: usize, named: usize, right: usize, logged: usize, widened: usize }

#[test]
#[ignore = "tune"]
fn tune() {
    let n: u64 = std::env::var("N").ok().and_then(|n| n.parse().ok()).unwrap_or(40);
    let verbose = std::env::var("VERBOSE").is_ok();
    for (name, make) in [
        ("rate-.1", (|s| Drill { frame_s: 10.0, ..Drill::plain(s) }) as fn(u64) -> Drill),
        ("rate-.2", |s| Drill { frame_s: 5.0, ..Drill::plain(s) }),
        ("rate-1", |s| Drill { frame_s: 1.0, ..Drill::plain(s) }),
        ("rate-five", |s| Drill { frame_s: 0.2, hours: 12.0, ..Drill::plain(s) }),
        ("half-day", |s| Drill { hours: 12.0, ..Drill::plain(s) }),
        ("plain", (|s| Drill { skew: false, deadband: false, swing: false, trip: false, ..Drill::plain(s) }) as fn(u64) -> Drill),
        ("all", |s| Drill::plain(s)),
        ("notrip", |s| Drill { trip: false, ..Drill::plain(s) }),
        ("coincident", |s| Drill { coincident_per_hour: 1.0, ..Drill::plain(s) }),
        ("coinc-notrip", |s| Drill { coincident_per_hour: 1.0, trip: false, ..Drill::plain(s) }),
    ] {
        let outcomes: Vec<Outcome> = (0..n).map(|s| run(make(s))).collect();
        let mut errors: Vec<f64> = outcomes.iter().flat_map(|o| o.error.map(f64::abs)).collect();
        errors.sort_by(f64::total_cmp);
        let within = outcomes.iter().flat_map(|o| o.sds).filter(|s| s.abs() < 2.0).count() as f64 / errors.len() as f64;
        let rms = (outcomes.iter().flat_map(|o| o.sds).map(|s| s * s).sum::<f64>() / errors.len() as f64).sqrt();
        let bias = outcomes.iter().flat_map(|o| o.error).sum::<f64>() / errors.len() as f64;
        let within12 = errors.iter().filter(|e| **e < 0.12).count() as f64 / errors.len() as f64;
        let large: usize = outcomes.iter().map(|o| o.large).sum();
        let named: usize = outcomes.iter().map(|o| o.named).sum();
        let right: usize = outcomes.iter().map(|o| o.right).sum();
        let widened: usize = outcomes.iter().map(|o| o.widened).sum();
        println!("{name:>13}: median {:.2}% p90 {:.2}% max {:.1}% within12 {:.1}% 2sd {:.1}% rms {rms:.2} bias {:.2}% | large {large} named {:.1}% right/named {:.1}% right/large {:.1}% widened {widened} logged {} false {}",
            100.0 * errors[errors.len() / 2], 100.0 * errors[errors.len() * 9 / 10], 100.0 * errors[errors.len()-1], 100.0 * within12, 100.0 * within, 100.0 * bias,
            100.0 * named as f64 / large as f64, 100.0 * right as f64 / named as f64, 100.0 * right as f64 / large as f64, outcomes.iter().map(|o| o.logged).sum::<usize>(), outcomes.iter().map(|o| o.false_steps).sum::<usize>());
        if verbose { for (s, o) in outcomes.iter().enumerate() { println!("   {s} {o:?}"); } }
    }
}
