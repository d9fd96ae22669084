use std::fs::File;

use parquet::{
    file::reader::{FileReader, SerializedFileReader},
    record::{Field, Row},
};
use tautline::{
    desk::{Assessment, Desk},
    feed::Holder,
    report::parquet::{Columns, ParquetFile},
    review::{Bench, Rows},
};

use super::paper::{frames, task};

fn fields(row: &Row) -> Vec<(String, Field)> {
    row.get_column_iter().map(|(name, field)| (name.clone(), field.clone())).collect()
}

fn get<'a>(fields: &'a [(String, Field)], name: &str) -> &'a Field {
    &fields.iter().find(|(known, _)| known == name).unwrap_or_else(|| panic!("no column {name}")).1
}

fn number(value: Option<f64>) -> Field {
    value.map_or(Field::Null, Field::Double)
}

fn word(value: Option<&str>) -> Field {
    value.map_or(Field::Null, |word| Field::Str(word.to_owned()))
}

fn list(field: &Field) -> Vec<String> {
    let Field::ListInternal(list) = field else { panic!("{field} is no list") };
    list.elements().iter().map(|element| element.to_string().trim_matches('"').to_owned()).collect()
}

/// A row is its record, bit by bit.
fn compare(row: &Row, was: &Assessment, what_if: Option<&Assessment>) {
    let fields = fields(row);
    let get = |name: &str| get(&fields, name);
    assert_eq!(*get("time"), Field::TimestampMicros(was.time.timestamp_micros()));
    assert_eq!(*get("corridor"), word(Some(&was.corridor)));
    assert_eq!(*get("state"), word(Some(was.state.word())));
    assert_eq!(*get("exporter"), word(was.exporter.as_deref()));
    assert_eq!(*get("transfer_mw"), number(was.transfer_mw));
    assert_eq!(*get("internal_angle_deg"), number(was.internal_angle_deg));
    assert_eq!(*get("headroom_mw"), number(was.headroom_mw));
    assert_eq!(*get("headroom_sd_mw"), number(was.headroom_sd_mw));
    assert_eq!(*get("minutes_to_thin"), number(was.minutes_to_thin));
    assert_eq!(*get("from_x_ohm"), number(Some(was.sources[0].x_ohm)));
    assert_eq!(*get("to_r_sd"), number(Some(was.sources[1].r_sd)));
    assert_eq!(*get("to_steps"), Field::Long(was.sources[1].steps.cast_signed()));
    assert_eq!(*get("fit_chi2"), number(was.fit.chi2));
    assert_eq!(list(get("suspects")), was.fit.suspects.iter().map(ToString::to_string).collect::<Vec<_>>());
    assert_eq!(list(get("missing")), was.fit.missing.iter().map(ToString::to_string).collect::<Vec<_>>());
    let binding = was.binding.as_ref();
    assert_eq!(*get("binding_outage"), word(binding.and_then(|binding| binding.outage.as_deref())));
    assert_eq!(*get("binding_criterion"), word(binding.map(|binding| binding.criterion.word())));
    let outage = was.outages.iter().find(|outage| Some(&outage.name) == binding.and_then(|b| b.outage.as_ref()));
    assert_eq!(*get("binding_area_margin"), number(outage.and_then(|outage| outage.area_margin)));
    assert_eq!(*get("binding_critical_ms"), number(outage.and_then(|outage| outage.critical_ms)));
    if let Some(what_if) = what_if {
        assert_eq!(*get("if_headroom_mw"), number(what_if.headroom_mw));
        assert_eq!(*get("if_state"), word(Some(what_if.state.word())));
    }
}

#[test]
fn rows_read_back_are_the_records() {
    let task = task();
    // A minute as it was, then one without a voltage, then one of nothing.
    let mut frames = frames(&task, 3);
    let third = frames.len() / 3;
    frames[2 * third..].iter_mut().for_each(|frame| frame.readings.clear());
    let mut holder = Holder::new(&task.channels, task.config.feed.max_age());
    let mut desk = Desk::new(&task.config, &task.channels);
    let records: Vec<Vec<Assessment>> =
        frames.iter().filter_map(|frame| holder.take(frame)).map(|snapshot| desk.assess(&snapshot)).collect();

    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("rows.parquet");
    let mut file = ParquetFile::create(&path, false, "this").unwrap();
    let mut bench = Bench::new(&task, task.config.grid.corridors.iter().map(|_| Columns::new(false)));
    for frames in frames.chunks(10) {
        bench.take(frames);
        for rows in bench.rows().filter(|rows| rows.len() >= 20) {
            file.write(rows).unwrap();
        }
    }
    bench.rows().for_each(|rows| file.write(rows).unwrap());
    assert!(!path.exists(), "it is not there before it is finished");
    file.finish().unwrap();
    assert_eq!(std::fs::read_dir(folder.path()).unwrap().count(), 1);

    let reader = SerializedFileReader::new(File::open(&path).unwrap()).unwrap();
    let said = reader.metadata().file_metadata().key_value_metadata().unwrap();
    assert!(said.iter().any(|pair| pair.key == "caution" && pair.value.as_ref().unwrap().contains("tautline advises")));
    let mut rows: Vec<Row> = reader.get_row_iter(None).unwrap().map(Result::unwrap).collect();
    let place = |row: &Row| {
        let fields = fields(row);
        let corridor = get(&fields, "corridor").to_string();
        task.config.grid.corridors.iter().position(|known| corridor.contains(&*known.name)).unwrap()
    };
    rows.sort_by_key(place);
    assert_eq!(rows.len(), records.len() * 3);
    let mut blind = 0;
    for (row, (corridor, frame)) in rows.iter().zip((0..3).flat_map(|c| (0..records.len()).map(move |f| (c, f)))) {
        compare(row, &records[frame][corridor], None);
        blind += usize::from(records[frame][corridor].headroom_mw.is_none());
    }
    assert!((1..rows.len()).contains(&blind), "{blind} blind rows");
}

#[test]
fn what_would_have_been_has_its_columns() {
    let task = task();
    let mut holder = Holder::new(&task.channels, task.config.feed.max_age());
    let mut desk = Desk::new(&task.config, &task.channels);
    let records: Vec<_> =
        frames(&task, 1).iter().filter_map(|frame| holder.take(frame)).map(|s| desk.assess(&s).remove(0)).collect();
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("rows.parquet");
    let mut columns = Columns::new(true);
    for pair in records.windows(2) {
        columns.take(&pair[0], Some(&pair[1]));
    }
    columns.take(&records[0], None);
    let mut file = ParquetFile::create(&path, true, "this").unwrap();
    file.write(&mut columns).unwrap();
    file.finish().unwrap();
    let reader = SerializedFileReader::new(File::open(&path).unwrap()).unwrap();
    let rows: Vec<Row> = reader.get_row_iter(None).unwrap().map(Result::unwrap).collect();
    for (row, pair) in rows.iter().zip(records.windows(2)) {
        compare(row, &pair[0], Some(&pair[1]));
    }
    assert_eq!(*get(&fields(rows.last().unwrap()), "if_headroom_mw"), Field::Null);
}

#[test]
fn a_file_that_is_given_up_leaves_nothing() {
    let folder = tempfile::tempdir().unwrap();
    drop(ParquetFile::create(&folder.path().join("rows.parquet"), false, "this").unwrap());
    assert_eq!(std::fs::read_dir(folder.path()).unwrap().count(), 0);
    assert!(ParquetFile::create(&folder.path().join("none").join("rows.parquet"), false, "this").is_err());
}
