//! The configuration as people write it, right and wrong.

use std::{fs, path::Path};

use tautline::config::Config;

#[test]
fn every_case_parses() {
    let folders = fs::read_dir("tests/cases")
        .expect("the cases are there")
        .chain(fs::read_dir("tests/feeds").expect("so are the feeds"));
    let mut count = 0;
    for folder in folders {
        let path = folder.expect("readable").path().join("config.toml");
        let config = Config::load(&path).unwrap_or_else(|errors| panic!("{errors}"));
        assert_eq!(config.grid.corridors.len(), 1, "{}", path.display());
        count += 1;
    }
    assert_eq!(count, 12);
    let two_area = Config::load(Path::new("tests/cases/two-area/config.toml")).unwrap();
    println!("{two_area:#?}");
}
