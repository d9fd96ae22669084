//! What was learned, over a restart.

use std::{collections::BTreeMap, fs};

use tautline::{
    config::LearningSettings,
    source::{
        Learner,
        store::{StoreError, load, save},
    },
};

use crate::simulator::{Drill, Simulator};

fn learned() -> (Simulator, Learner) {
    let mut simulator = Simulator::new(Drill { hours: 3.0, ..Drill::day(7) });
    let mut learner = Learner::new(&simulator.configured, LearningSettings::default());
    for seen in simulator.by_ref() {
        learner.observe(&seen);
    }
    (simulator, learner)
}

#[test]
fn what_was_learned_survives_a_restart() {
    let (simulator, learner) = learned();
    let directory = tempfile::tempdir().unwrap();
    let path = directory.path().join("state.json");
    assert!(load(&path).unwrap().is_empty());
    save(&path, BTreeMap::from([("Skarn-Velm".to_owned(), learner.memory().unwrap())])).unwrap();
    assert_eq!(fs::read_dir(directory.path()).unwrap().count(), 1);

    let mut again = Learner::new(&simulator.configured, LearningSettings::default());
    assert_eq!(again.estimate().steps, [0, 0]);
    again.recall(&load(&path).unwrap()["Skarn-Velm"]).unwrap();
    assert!((again.estimate().mean - learner.estimate().mean).amax() < 1e-9);
    assert!((again.estimate().covariance - learner.estimate().covariance).amax() < 1e-9);
    assert_eq!(again.estimate().steps, learner.estimate().steps);
    assert_eq!(again.steps().count(), learner.steps().count());
    assert!(learner.steps().count() > 5);
}

#[test]
fn what_does_not_fit_is_refused() {
    let (simulator, learner) = learned();
    let memory = learner.memory().unwrap();
    let mut other = simulator.configured;
    other[1].x_ohm += 1.0;
    let mut learner = Learner::new(&other, LearningSettings::default());
    assert!(matches!(learner.recall(&memory), Err(StoreError::OtherSources)));

    let text = serde_json::to_string(&memory).unwrap();
    let mut value: serde_json::Value = serde_json::from_str(&text).unwrap();
    value["covariance"][1][1] = (-4.0).into();
    let mut learner = Learner::new(&simulator.configured, LearningSettings::default());
    let before = *learner.estimate();
    let impossible = serde_json::from_value(value).unwrap();
    assert!(matches!(learner.recall(&impossible), Err(StoreError::Impossible)));
    assert_eq!(*learner.estimate(), before);
}

#[test]
fn a_damaged_file_is_named_and_nothing_more() {
    let directory = tempfile::tempdir().unwrap();
    let path = directory.path().join("state.json");
    for damaged in
        ["", "{", "[]", "{\"version\":9,\"corridors\":{}}", "{\"version\":1,\"corridors\":{\"a\":{}}}", "\u{0}\u{1b}"]
    {
        fs::write(&path, damaged).unwrap();
        let message = load(&path).unwrap_err().to_string();
        assert!(message.contains("state.json") && message.contains("ignored"), "{message}");
    }
}

#[test]
fn frames_that_come_again_teach_nothing_new() {
    let (simulator, learner) = learned();
    let mut again = Learner::new(&simulator.configured, LearningSettings::default());
    again.recall(&learner.memory().unwrap()).unwrap();
    for seen in Simulator::new(Drill { hours: 2.5, ..Drill::day(7) }) {
        assert!(again.observe(&seen).is_none());
    }
    assert_eq!(again.estimate().steps, learner.estimate().steps);
}
