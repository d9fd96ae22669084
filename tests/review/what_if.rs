//! What-ifs on recorded days.

use tautline::{
    desk::{Alternative, State},
    review::{Course, Run, Stretch},
};

use crate::bed::Bed;

/// Both corridors of a day as they were and as they would have been.
fn compared(bed: &Bed, with: &[&str], without: &[&str]) -> Vec<(Course, Option<Course>)> {
    let texts = |texts: &[&str]| texts.iter().map(|text| (*text).to_owned()).collect::<Vec<_>>();
    let alternatives = Alternative::parse(&texts(with), &texts(without), &bed.config.grid).unwrap();
    let stretches = Stretch::all(&[bed.file("day.jsonl", &bed.lines)], &|file| Box::new(file), |_| {}).unwrap();
    let run = Run {
        task: &bed.task(alternatives),
        stretches: &stretches,
        threads: None,
        carry: false,
        output: &2,
        known: &|_, _| None,
        follow: &|file| Box::new(file),
    };
    let mut courses = Vec::new();
    run.go(|done| -> std::io::Result<()> {
        courses.extend(done.reviewed.day.corridors.into_iter().map(|corridor| (corridor.was, corridor.what_if)));
        Ok(())
    })
    .unwrap();
    courses
}

#[test]
fn a_change_touches_its_corridor_alone_and_leaves_the_past_as_it_was() {
    let bed = Bed::new(24.0);
    let plain = compared(&bed, &[], &[]);
    let corridor = &bed.config.grid.corridors[0];
    let changed = compared(&bed, &[&format!("transfer {} -150", corridor.name)], &[]);
    assert_eq!(
        changed.iter().map(|(was, _)| was).collect::<Vec<_>>(),
        plain.iter().map(|(was, _)| was).collect::<Vec<_>>()
    );
    assert!(changed[1].1.is_none());
    let (was, what_if) = (&changed[0].0, changed[0].1.as_ref().unwrap());
    let (least, lifted) = (was.least.as_ref().unwrap(), what_if.least.as_ref().unwrap());
    assert!(lifted.headroom_mw > least.headroom_mw + 100.0, "{least:?} {lifted:?}");
    assert!(what_if.minutes(State::Ample) >= was.minutes(State::Ample));
    assert!((what_if.mean_transfer_mw().unwrap() - (was.mean_transfer_mw().unwrap() - 150.0)).abs() < 0.5);
}

#[test]
fn an_outage_that_is_not_reckoned_with_binds_no_more() {
    let bed = Bed::new(24.0);
    let plain = compared(&bed, &[], &[]);
    let bound = plain[0].0.least.as_ref().unwrap().binding.as_ref().unwrap().outage.clone().unwrap();
    let changed = compared(&bed, &[], &[&bound]);
    let what_if = changed[0].1.as_ref().unwrap();
    assert!(what_if.binding_ms.shares().iter().all(|share| share.of.outage.as_ref() != Some(&bound)));
    assert!(what_if.least.as_ref().unwrap().headroom_mw > plain[0].0.least.as_ref().unwrap().headroom_mw);
}

/// Where part of the day has no balance, that is the lowest, and the first part of the curve that is not there.
#[test]
fn a_time_without_balance_is_worse_than_any_headroom() {
    let bed = Bed::new(24.0);
    let corridor = &bed.config.grid.corridors[0].name;
    let plain = compared(&bed, &[], &[]);
    let peak = 0.5 * plain[0].0.transfer_mw.unwrap()[1] + 0.5 * plain[0].0.transfer_mw.unwrap()[0];
    let least = plain[0].0.least.as_ref().unwrap();
    let shift = least.headroom_mw + 2.0 * peak;
    let changed = compared(&bed, &[&format!("transfer {corridor} {shift}")], &[]);
    let what_if = changed[0].1.as_ref().unwrap();
    let (known_ms, none_ms) = (what_if.durations.total_ms(), what_if.unbalanced.map_or(0, |unbalanced| unbalanced.ms));
    assert!(known_ms > 0 && none_ms > 0, "{known_ms} and {none_ms} ms: another shift would be better");
    assert!(what_if.least.is_some() && what_if.lowest().is_none());
    let part = known_ms as f64 / (known_ms + none_ms) as f64;
    assert!(what_if.held_for(part - 1e-6).is_some() && what_if.held_for(part + 1e-6).is_none());
}

#[test]
fn without_a_balance_there_is_no_headroom_but_spent_time() {
    let bed = Bed::new(24.0);
    let corridor = &bed.config.grid.corridors[0].name;
    let changed = compared(&bed, &[&format!("transfer {corridor} 20000")], &[]);
    let what_if = changed[0].1.as_ref().unwrap();
    let unbalanced = what_if.unbalanced.unwrap();
    assert_eq!(unbalanced.ms, what_if.state_ms.ms(&State::Spent));
    assert_eq!(what_if.durations.total_ms(), 0);
    assert!(what_if.lowest().is_none() && what_if.held_for(0.5).is_none());
}
