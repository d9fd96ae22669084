use roxmltree::{Document, Node, ParsingOptions};
use tautline::{
    events::{Event, EventKind},
    report::review::Paper,
    review::Review,
};

use super::paper::{frames, page, paper, review_of, small, task, with_what_if};

/// The page is well-formed, whole, and has nothing to load or to run.
fn checked(paper: &Paper) -> String {
    let page = page(paper);
    let options = ParsingOptions { allow_dtd: true, ..ParsingOptions::default() };
    let document = Document::parse_with_options(&page, options).unwrap_or_else(|error| panic!("{error}\n{page}"));
    for forbidden in ["<script", "http:", "https:", "@import", "<link", "<img", "<iframe", "javascript:"] {
        assert!(!page.contains(forbidden), "{forbidden}");
    }
    let nodes = || document.descendants().filter(Node::is_element);
    let mut ids: Vec<_> = nodes().filter_map(|node| node.attribute("id")).collect();
    for node in nodes() {
        for attribute in node.attributes() {
            assert!(!attribute.name().starts_with("on"), "{}", attribute.name());
            let words = attribute.value().split(' ');
            match attribute.name() {
                "aria-labelledby" => words.for_each(|id| assert!(ids.contains(&id), "{id}")),
                "href" => assert!(ids.contains(&&attribute.value()[1..]), "{}", attribute.value()),
                "d" => assert!(!attribute.value().contains("NaN") && !attribute.value().contains("inf")),
                _ => {}
            }
        }
        match node.tag_name().name() {
            "svg" if node.attribute("aria-hidden").is_none() => {
                let has = |name| node.children().any(|child| child.has_tag_name(name) && child.text().is_some());
                assert!(node.attribute("role") == Some("img") && has("title") && has("desc"));
            }
            "table" => assert!(node.children().any(|child| child.has_tag_name("caption"))),
            "th" => assert!(node.attribute("scope").is_some()),
            _ => {}
        }
    }
    let count = ids.len();
    ids.sort_unstable();
    ids.dedup();
    assert_eq!(ids.len(), count, "an id is there twice");
    headings_are_in_order(nodes());
    page
}

fn headings_are_in_order<'a>(nodes: impl Iterator<Item = Node<'a, 'a>>) {
    let levels = nodes.filter_map(|node| node.tag_name().name().strip_prefix('h')?.parse::<u8>().ok());
    let levels: Vec<_> = levels.collect();
    assert!(levels.first() == Some(&1) && !levels[1..].contains(&1), "{levels:?}");
    assert!(levels.windows(2).all(|pair| pair[1] <= pair[0] + 1), "{levels:?}");
}

#[test]
fn a_page_is_whole_with_and_without_a_what_if() {
    let (task, review) = small();
    let alone = checked(&paper(&task, &review, &[]));
    for told in ["Torvane-Melskar", "TM3 opened", "TM1 out, area", "3 lines that do not parse", "tautline advises."] {
        assert!(alone.contains(told), "{told}");
    }
    assert!(!alone.contains("would have been</th>"));
    let review = with_what_if(review);
    let compared = checked(&paper(&task, &review, &["close TM3".into()]));
    assert!(compared.contains("would have been</th>") && compared.contains("close TM3"));
}

#[test]
fn empty_blind_and_single_frames_have_a_page() {
    let task = task();
    checked(&paper(&task, &Review::new(task.config.feed.max_age()), &[]));
    let mut frames = frames(&task, 1);
    checked(&paper(&task, &review_of(&task, &frames[..1]), &[]));
    for frame in &mut frames {
        frame.readings.clear();
    }
    let page = checked(&paper(&task, &review_of(&task, &frames), &[]));
    assert!(page.contains("Headroom never known."));
}

#[test]
fn names_are_never_markup() {
    let (task, review) = small();
    let mut review = with_what_if(review);
    let hostile = "<script>alert(1)</script>\"' onload=\"x\u{1b}\u{0}\u{202e}\u{fffe}]]>&amp;".repeat(200);
    review.corridors[0].corridor = hostile.as_str().into();
    review.files[0].name = hostile.clone();
    review.files[0].findings = vec![hostile.clone(); 100];
    review.findings.push((review.days[0].date, hostile.clone()));
    let time = review.events[0].time;
    let kind = EventKind::Trip;
    review.events.push(Event {
        time,
        corridor: Some(hostile.as_str().into()),
        kind,
        state: None,
        text: hostile.clone(),
    });
    let sources = review.corridors[0].sources.as_mut().unwrap();
    sources[0][0].bus = hostile.as_str().into();
    review.corridors[0].meters.insert(hostile.as_str().into(), tautline::review::MeterNote::default());
    review.corridors[0].was.alarms.push(tautline::review::AlarmCount {
        alarm: hostile.as_str().into(),
        priority: tautline::alarm::Priority::Low,
        raised: 1,
    });
    let least = review.corridors[0].was.least.as_mut().unwrap();
    least.binding.as_mut().unwrap().outage = Some(hostile.as_str().into());
    let page = checked(&paper(&task, &review, &[hostile]));
    assert!(!page.contains(['\u{1b}', '\u{202e}', '\0']));
    assert!(page.len() < 300_000, "{} bytes", page.len());
}

/// Relative luminance of `#rrggbb` (WCAG 2.2).
fn luminance(colour: &str) -> f64 {
    let channel = |place: usize| {
        let value = f64::from(u8::from_str_radix(&colour[place..place + 2], 16).unwrap()) / 255.0;
        if value <= 0.04045 { value / 12.92 } else { ((value + 0.055) / 1.055).powf(2.4) }
    };
    0.2126 * channel(1) + 0.7152 * channel(3) + 0.0722 * channel(5)
}

#[test]
fn every_colour_stands_out_from_the_paper_in_light_dark_and_print() {
    let (task, review) = small();
    let page = page(&paper(&task, &review, &[]));
    let colours = |name: &str| -> Vec<f64> {
        page.match_indices(&format!("--{name}: #"))
            .map(|(at, found)| luminance(&page[at + found.len() - 1..]))
            .collect()
    };
    let papers = colours("paper");
    assert_eq!(papers.len(), 3);
    for name in ["ink", "muted", "link", "transfer", "headroom", "would", "spent", "thin", "blind"] {
        for (colour, paper) in colours(name).into_iter().zip(&papers) {
            let contrast = (colour.max(*paper) + 0.05) / (colour.min(*paper) + 0.05);
            assert!(contrast >= 4.5, "{name} has a contrast of {contrast:.2}");
        }
        assert_eq!(colours(name).len(), 3, "{name}");
    }
}

#[test]
fn a_day_of_twenty_corridors_is_small() {
    let (task, review) = small();
    let mut review = with_what_if(review);
    for corridor in &mut review.corridors {
        for course in [Some(&mut corridor.was), corridor.what_if.as_mut()].into_iter().flatten() {
            let slot = course.series.slots[0];
            // As irregular as can be.
            let wild = |place: i64, of: f64| of + 300.0 * (place as f64 * 1.7).sin();
            course.series.slots = (0..288)
                .map(|place| tautline::review::Slot {
                    at_s: slot.at_s + place * course.series.slot_s,
                    transfer_mw: slot.transfer_mw.map(|ends| ends.map(|mw| wild(place, mw))),
                    headroom_mw: slot.headroom_mw.map(|[low, high]| [wild(place, low), wild(place, high) + 77.7]),
                    ..slot
                })
                .collect();
        }
    }
    let first = review.corridors[0].clone();
    review.corridors = (0..20)
        .map(|place| {
            let mut corridor = first.clone();
            corridor.corridor = format!("Corridor {place}").into();
            corridor
        })
        .collect();
    let event = review.events[0].clone();
    review.events = vec![event; 5000];
    let page = checked(&paper(&task, &review, &[]));
    assert!(page.len() < 1_000_000, "{} bytes", page.len());
}
