//! What is found of a corridor, as the assessment record carries it. `None` stands where a value does not exist.

use std::sync::Arc;

use serde::{Deserialize, Serialize, Serializer, ser::SerializeMap};

use super::OutagePicture;

/// The corridor with nothing lost.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Intact {
    /// Transfer at the curve's peak, MW.
    pub peak_mw: f64,
    /// 90° less the internal angle past the curve's zero.
    pub angle_margin_deg: f64,
    /// Largest current against its continuous rating, %.
    pub loading_pct: Option<f64>,
    /// Where that is.
    pub loaded_circuit: Option<Arc<str>>,
    /// Limits by the intact requirements.
    pub limit_mw: IntactLimits,
}

/// Transfers up to which the intact corridor holds, MW; `None`: to its peak.
#[derive(Debug, Clone, Copy, PartialEq, Default, Serialize)]
pub struct IntactLimits {
    /// By the intact angle margin.
    pub angle: Option<f64>,
    /// By the continuous ratings.
    pub loading: Option<f64>,
    /// By the floors.
    pub voltage: Option<f64>,
}

/// One outage, judged.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct OutageRecord {
    /// The circuit, the bank or the configured combination.
    pub name: Arc<str>,
    /// No path is left between the terminals; nothing else is computed then.
    pub separates: bool,
    /// Transfer at the peak of the remaining network, MW.
    pub peak_mw: Option<f64>,
    /// Internal angle of the new equilibrium, degrees.
    pub angle_deg: Option<f64>,
    /// Angle margin there, degrees.
    pub angle_margin_deg: Option<f64>,
    /// Largest angle of the first swing, between the sources of the swing, degrees.
    pub swing_peak_deg: Option<f64>,
    /// The equal-area criterion as one number, -1 to 1.
    pub area_margin: Option<f64>,
    /// Critical clearing time, ms; `None` without a fault or beyond 2 s.
    pub critical_ms: Option<f64>,
    /// Largest current against its short-time rating, %.
    pub loading_pct: Option<f64>,
    /// Where that is.
    pub loaded_circuit: Option<Arc<str>>,
    /// Voltages at the new equilibrium, kV by bus.
    #[serde(serialize_with = "kv_by_bus")]
    pub kv: Option<Vec<(Arc<str>, f64)>>,
    /// Limits by criterion.
    pub limit_mw: OutageLimits,
    /// What a screen draws of it: not part of the record.
    #[serde(skip)]
    pub picture: Option<OutagePicture>,
}

/// Transfers up to which a criterion holds after an outage, MW; `None`: to the peak.
#[derive(Debug, Clone, Copy, PartialEq, Default, Serialize)]
pub struct OutageLimits {
    /// An equilibrium with the required angle margin.
    pub angle: Option<f64>,
    /// The required area margin.
    pub area: Option<f64>,
    /// Short-time ratings.
    pub loading: Option<f64>,
    /// Floors.
    pub voltage: Option<f64>,
    /// 0 where the outage separates the corridor and that is not accepted.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub separation: Option<f64>,
}

/// What sets the headroom.
#[derive(Debug, Clone, PartialEq, Eq, Serialize)]
pub struct Binding {
    /// The outage; `None`: the intact corridor.
    pub outage: Option<Arc<str>>,
    /// The criterion.
    pub criterion: Criterion,
}

/// What must hold after an outage.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "lowercase")]
pub enum Criterion {
    /// An equilibrium with enough angle margin.
    Angle,
    /// Enough area margin.
    Area,
    /// Ratings.
    Loading,
    /// Floors.
    Voltage,
    /// A path between the terminals.
    Separation,
}

impl Criterion {
    /// Its word.
    pub fn word(self) -> &'static str {
        match self {
            Self::Angle => "angle",
            Self::Area => "area",
            Self::Loading => "loading",
            Self::Voltage => "voltage",
            Self::Separation => "separation",
        }
    }
}

/// A single action at hand.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Action {
    /// `insert <bank>` or `close <circuit>`.
    pub action: String,
    /// The headroom after it, MW.
    pub headroom_mw: Option<f64>,
}

/// Whether an open circuit may be closed.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Reclose {
    /// The open circuit.
    pub circuit: Arc<str>,
    /// Standing angle across it, without sign, degrees.
    pub angle_deg: Option<f64>,
    /// Voltage difference across it, % of nominal.
    pub voltage_pct: Option<f64>,
    /// Within the synchronism-check setting; `None` where it cannot be told.
    pub allowed: Option<bool>,
    /// Transfer at which the angle would fit, where it does not, MW.
    pub transfer_to_fit_mw: Option<f64>,
}

// The signature is serde's.
#[allow(clippy::ref_option)]
fn kv_by_bus<S: Serializer>(kv: &Option<Vec<(Arc<str>, f64)>>, serializer: S) -> Result<S::Ok, S::Error> {
    match kv {
        None => serializer.serialize_none(),
        Some(kv) => {
            let mut map = serializer.serialize_map(Some(kv.len()))?;
            for (bus, kv) in kv {
                map.serialize_entry(bus, kv)?;
            }
            map.end()
        }
    }
}
