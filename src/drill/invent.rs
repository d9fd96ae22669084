//! Makes up configurations and scenarios with random truths, to try the learning of sources and the speed of everything.

use std::fmt::Write;

use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;

use super::Scenario;
use crate::config::{Config, ConfigErrors};

/// What to make up: the same always comes out the same.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Invention {
    /// Of everything random.
    pub seed: u64,
    /// Each with three circuits, a series capacitor and a fault.
    pub corridors: usize,
    /// How long, h.
    pub hours: f64,
    /// From one frame to the next, s.
    pub interval_s: f64,
    /// How far the configured reactances may be off the true ones, relative.
    pub prior_error: f64,
    /// Whether a circuit trips, and returns after some hours.
    pub with_trip: bool,
    /// Whether values are up to 2 s old, and stand within deadbands of 0.2 kV, 1 MW and 1 Mvar.
    pub with_slow_telemetry: bool,
    /// Whether both sides move at once about every hour.
    pub with_coincident_steps: bool,
}

impl Default for Invention {
    /// A day of one corridor, a frame every two seconds, priors off by up to 40 %, nothing else out of the ordinary.
    fn default() -> Self {
        Self {
            seed: 1,
            corridors: 1,
            hours: 24.0,
            interval_s: 2.0,
            prior_error: 0.4,
            with_trip: false,
            with_slow_telemetry: false,
            with_coincident_steps: false,
        }
    }
}

/// A configuration and a scenario for it, as the files would say it.
#[derive(Debug, Clone, PartialEq)]
pub struct Invented {
    /// The configuration (TOML).
    pub config: String,
    /// The scenario (TOML).
    pub scenario: String,
}

impl Invented {
    /// Reads both.
    pub fn read(&self) -> Result<(Config, Scenario), ConfigErrors> {
        let config = Config::parse(&self.config, "invented configuration")?;
        let scenario = Scenario::parse(&self.scenario, "invented scenario", &config)?;
        Ok((config, scenario))
    }
}

/// Nominal voltage of everything made up, kV.
const NOMINAL_KV: f64 = 400.0;
/// Days begin and end low, with a morning and a higher evening peak: hour and share of the highest transfer.
const DAY: [(f64, f64); 7] = [(0.0, 0.45), (5.0, 0.4), (8.5, 0.8), (13.0, 0.7), (18.5, 1.0), (21.0, 0.8), (24.0, 0.5)];

impl Invention {
    /// Makes it up.
    pub fn invent(&self) -> Invented {
        let Self { seed, hours, interval_s, with_slow_telemetry, .. } = self;
        let mut random = ChaCha8Rng::seed_from_u64(*seed);
        let mut config = String::from("# Made up.\n[grid]\nfrequency_hz = 50\n");
        let mut scenario = format!(
            "# Made up.\nstart = 2031-03-14T00:00:00Z\nhours = {hours}\ninterval_s = {interval_s}\nseed = {}\n\n\
             [metering]\nnoise = {{ kv = 0.4, mw = 1.5, mvar = 1.5, deg = 0.05 }}\n",
            // TOML's whole numbers have a sign.
            seed >> 1
        );
        if *with_slow_telemetry {
            scenario += "deadband = { kv = 0.2, mw = 1.0, mvar = 1.0 }\nskew_s = 2.0\n";
        }
        let mut events = String::new();
        for number in 1..=self.corridors {
            let corridor = InventedCorridor::new(number, self.prior_error, &mut random);
            corridor.configure(&mut config);
            corridor.stage(self, &mut scenario);
            if self.with_trip {
                let trip_s = uniform(&mut random, 0.1, 0.6) * hours * 3600.0;
                let return_s = trip_s + uniform(&mut random, 0.05, 0.2) * hours * 3600.0;
                let _ = write!(
                    events,
                    "\n[[event]]\nat = {trip_s:.1}\ntrip = \"{number}-A\"\n\n[[event]]\nat = {return_s:.1}\nreturn = \"{number}-A\"\n"
                );
            }
        }
        scenario += &events;
        Invented { config, scenario }
    }
}

fn uniform(random: &mut ChaCha8Rng, low: f64, high: f64) -> f64 {
    random.random_range(low..=high)
}

struct InventedCorridor {
    number: usize,
    length_km: f64,
    x_ohm_per_km: f64,
    bank_ohm: f64,
    sides: [InventedSide; 2],
    highest_mw: f64,
}

struct InventedSide {
    r_ohm: f64,
    x_ohm: f64,
    configured_x_ohm: f64,
    e_kv: f64,
    stored_energy_mws: f64,
    load_mw: f64,
}

impl InventedCorridor {
    fn new(number: usize, prior_error: f64, random: &mut ChaCha8Rng) -> Self {
        let length_km = uniform(random, 160.0, 340.0);
        let x_ohm_per_km = uniform(random, 0.29, 0.34);
        let bank_ohm = 0.3 * x_ohm_per_km * length_km;
        let sides = [0, 1].map(|_| {
            let x_ohm = uniform(random, 10.0, 36.0);
            InventedSide {
                r_ohm: x_ohm * uniform(random, 0.05, 0.1),
                x_ohm,
                configured_x_ohm: x_ohm * uniform(random, 1.0 - prior_error, 1.0 + prior_error),
                e_kv: uniform(random, 406.0, 420.0),
                stored_energy_mws: uniform(random, 30_000.0, 150_000.0),
                load_mw: uniform(random, 200.0, 1200.0),
            }
        });
        let line_ohm = x_ohm_per_km * length_km;
        let circuits_s = 2.0 / line_ohm + 1.0 / (line_ohm - bank_ohm);
        let between_ohm = sides[0].x_ohm + sides[1].x_ohm + 1.0 / circuits_s;
        // Half of E²/X: about 30 degrees between the sources.
        let highest_mw = NOMINAL_KV * NOMINAL_KV / between_ohm * uniform(random, 0.4, 0.55);
        Self { number, length_km, x_ohm_per_km, bank_ohm, sides, highest_mw }
    }

    fn buses(&self) -> [String; 2] {
        [format!("{} West", self.number), format!("{} East", self.number)]
    }

    fn configure(&self, config: &mut String) {
        let Self { number, length_km, x_ohm_per_km, bank_ohm, .. } = self;
        let _ = write!(config, "\n[[corridor]]\nname = \"{number}\"\nthin_mw = 150\n");
        for ((key, bus), side) in ["from", "to"].into_iter().zip(self.buses()).zip(&self.sides) {
            let InventedSide { configured_x_ohm: x, stored_energy_mws, load_mw, .. } = side;
            let (r, mvar) = (0.07 * x, 0.25 * load_mw);
            let _ = write!(
                config,
                "[corridor.{key}]\nbus = \"{bus}\"\nnominal_kv = {NOMINAL_KV}\nmin_kv = 360\n\
                 stored_energy_mws = {stored_energy_mws:.0}\nload = {{ mw = {load_mw:.0}, mvar = {mvar:.0} }}\n\
                 source = {{ r_ohm = {r:.3}, x_ohm = {x:.3}, spread = 0.4 }}\n"
            );
        }
        for letter in ["A", "B", "C"] {
            let _ = write!(
                config,
                "[[corridor.circuit]]\nname = \"{number}-{letter}\"\nlength_km = {length_km:.1}\nr_ohm_per_km = 0.028\n\
                 x_ohm_per_km = {x_ohm_per_km:.4}\nb_us_per_km = 3.6\nrating_a = 1900\nshort_time_rating_a = 2300\n"
            );
        }
        let _ = write!(
            config,
            "series_capacitors = [{{ name = \"{number}-C-SC\", x_ohm = {bank_ohm:.2}, at = 0.5 }}]\n\
             [corridor.fault]\nkind = \"three-phase\"\nat = 0.1\nclear_ms = 90\n\
             [corridor.require]\nangle_margin_deg = 30\narea_margin = 0.1\n\
             [corridor.reclose]\nmax_angle_deg = 60\n"
        );
    }

    fn stage(&self, invention: &Invention, scenario: &mut String) {
        let points = DAY.map(|(hour, share)| {
            format!("[{:.0}, {:.0}]", hour / 24.0 * invention.hours * 3600.0, share * self.highest_mw)
        });
        let _ = write!(
            scenario,
            "\n[[corridor]]\nname = \"{}\"\ntransfer_mw = [{}]\nwander = {{ mw = 20, minutes = 20 }}\n",
            self.number,
            points.join(", ")
        );
        if invention.with_coincident_steps {
            *scenario += "coincident_steps = { per_hour = 1, kv = [1.5, 6.0] }\n";
        }
        for (key, InventedSide { r_ohm, x_ohm, e_kv, .. }) in ["from", "to"].into_iter().zip(&self.sides) {
            let _ = write!(
                scenario,
                "[corridor.{key}]\nr_ohm = {r_ohm:.3}\nx_ohm = {x_ohm:.3}\ne_kv = {e_kv:.1}\n\
                 wander = {{ kv = 0.5, minutes = 20 }}\nsteps = {{ per_hour = 3, kv = [1.5, 6.0] }}\n"
            );
        }
    }
}
