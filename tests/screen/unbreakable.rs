//! No size, no numbers and no keys break a drawing.

use proptest::prelude::*;
use tautline::desk::Assessment;

use crate::{
    sample,
    stage::{draw, press, replay},
};

fn odd_number() -> impl Strategy<Value = f64> {
    prop_oneof![Just(f64::NAN), Just(f64::INFINITY), Just(f64::NEG_INFINITY), Just(f64::MAX), Just(0.0), -1e4..1e4f64,]
}

fn broken(value: f64) -> Assessment {
    let mut broken = sample::thin();
    broken.headroom_mw = Some(value);
    broken.headroom_sd_mw = Some(value);
    broken.transfer_mw = Some(value);
    broken.minutes_to_spent = Some(value);
    let detail = std::sync::Arc::make_mut(broken.detail.as_mut().unwrap());
    detail.picture.angle_rad = value;
    detail.picture.curve.amplitude_mw = value;
    detail.picture.p_m_mw = value;
    for outage in &mut broken.outages {
        outage.critical_ms = Some(value);
        outage.limit_mw.angle = Some(value);
        outage.loading_pct = Some(value);
        let picture = outage.picture.as_mut().unwrap();
        (picture.equilibrium_rad, picture.swing_peak_rad, picture.tipping_rad) =
            (Some(value), Some(-value), Some(value));
        (picture.curve.mean_mw, picture.cleared_rad) = (value, value);
    }
    broken
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(150))]

    #[test]
    fn any_size_any_number_any_keys(
        sizes in prop::collection::vec((0u16..300, 0u16..100), 1..4),
        value in odd_number(),
        keys in prop::collection::vec(
            prop::sample::select(vec![
                "j", "k", "<enter>", "<esc>", "<tab>", "<back-tab>", "s", "/a", "<backspace>", "?", "m", "]", "[", "b", "t",
                "14:03", "<space>", "+", "<page-down>", "<page-up>", "<end>", "<home>", "<left>", "g", "G", "}", ",", "a", "v", "y", "Y", "z", "o", "n", "u", "30m x", "e", "w", "W", "r", "d", "x", "X", "'", "\"", "A", "B", "p", "<delete>", "v",
            ]),
            0..12,
        ),
    ) {
        let mut app = replay(vec![sample::ample(), broken(value), sample::spent(), sample::blind()]);
        for (width, height) in sizes {
            for key in &keys {
                press(&mut app, key);
                draw(&mut app, width, height, true);
            }
        }
    }
}

#[test]
fn the_smallest_sizes() {
    for width in 0..60 {
        for height in 0..24 {
            for keys in ["", "j <enter>", "j <enter> <tab>", "?", "m", "a", "a <tab>", "e", "e /x", "A B"] {
                let mut app = replay(vec![sample::ample(), sample::thin(), sample::blind()]);
                press(&mut app, keys);
                draw(&mut app, width, height, false);
            }
        }
    }
}
