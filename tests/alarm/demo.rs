//! The built-in alarms on the bundled demo day: early, few and calm.

use std::{path::Path, sync::Arc};

use chrono::{NaiveTime, TimeDelta};
use tautline::{
    alarm::{
        Board, Event, State, Transition,
        trial::{ACCEPTABLE_PER_10_MIN, FLOOD_BEGINS_ABOVE, Figures, Trial},
    },
    config::Config,
    desk::Desk,
    feed::{Channels, Holder, Reader, Recorded},
};

#[test]
fn the_built_in_alarms_warn_in_time_and_do_not_cry_wolf() {
    let folder = Path::new(env!("CARGO_MANIFEST_DIR"));
    let config = Config::load(&folder.join("config/demo.toml")).unwrap();
    let channels = Arc::new(Channels::new(&config));
    let reader = Reader::open(&folder.join("replay-data/demo-day.jsonl.zst"), &channels).unwrap();
    let mut holder = Holder::new(&channels, TimeDelta::seconds(10));
    let mut desk = Desk::new(&config, &channels);
    let mut board = Board::new(&config);
    let trial = |(corridor, alarms): (_, &Vec<_>)| Trial::new(corridor, alarms);
    let mut trials: Vec<Trial> = config.grid.corridors.iter().zip(&config.alarms).map(trial).collect();
    let mut seen: Vec<Transition> = Vec::new();
    for frame in Recorded::new(vec![reader], &channels) {
        let assessments = desk.assess(&holder.take(&frame).unwrap());
        seen.extend(board.observe(&assessments));
        trials.iter_mut().zip(&assessments).for_each(|(trial, assessment)| trial.take(assessment));
    }
    let figures = Figures::of(trials);
    let raised = seen.iter().filter(|transition| transition.to == State::Unacknowledged).count();
    assert_eq!(figures.alarms(), raised, "counted as they came");
    assert!(figures.per_10_min().unwrap() < ACCEPTABLE_PER_10_MIN / 4.0, "{:?}", figures.per_10_min());
    assert!(figures.most_in_10_min < FLOOD_BEGINS_ABOVE && figures.floods == 0);
    assert_eq!(figures.chattering, []);
    assert_eq!(figures.stale, []);

    // The evening peak spends one margin, and an alarm on it stands a quarter of an hour before.
    let [end] = &figures.ends[..] else { panic!("{:?}", figures.ends) };
    assert_eq!((&*end.corridor, end.time.format("%H").to_string()), ("Ashkel-Rovanth", "19".to_owned()));
    assert!(end.lead.is_some_and(|lead| lead > TimeDelta::minutes(15)), "{:?}", end.lead);

    // Each event with the time until which its alarm must have come, and the time from which it may.
    let at = |text: &str| NaiveTime::parse_from_str(text, "%H:%M:%S").unwrap();
    for (corridor, alarm, from, until) in [
        // The data fail.
        ("Torvane-Melskar", "data silent", "04:12:00", "04:13:10"),
        ("Ulvey-Kestram", "data silent", "04:12:00", "04:13:10"),
        ("Ashkel-Rovanth", "data silent", "04:12:00", "04:13:10"),
        // A fault takes a circuit, and its return is refused twenty minutes later.
        ("Torvane-Melskar", "headroom thin", "09:41:22", "09:42:00"),
        ("Torvane-Melskar", "standing angle", "09:41:22", "09:50:00"),
        // A transducer loses a part of its scale.
        ("Ulvey-Kestram", "suspect meter", "15:04:00", "15:07:00"),
        // The evening peak: little time, little room, none.
        ("Ashkel-Rovanth", "time short", "18:30:00", "19:15:00"),
        ("Ashkel-Rovanth", "headroom thin", "18:45:00", "19:20:00"),
        ("Ashkel-Rovanth", "headroom spent", "19:20:00", "19:34:00"),
    ] {
        let found = seen.iter().any(|t| {
            (&*t.corridor, &*t.alarm, t.event) == (corridor, alarm, Event::Alarm)
                && (at(from)..at(until)).contains(&t.time.time())
        });
        assert!(found, "{corridor}: {alarm} between {from} and {until}");
    }
}
