use super::change::{self, Change, ChangeErrors};
use crate::{
    fit::{Fit, FittedState, Standing},
    grid::{Corridor, Grid},
    margin::{Engine, Footing, Present, Seated, Trend},
    network::{C64, Topology},
};

/// What one corridor would be with a change, frame after frame: switches standing otherwise, the transfer shifted,
/// outages no longer reckoned with.
///
/// Sources, loads and what was learned are those of the corridor as it is. Through a switching the machines deliver
/// what they did, and the angle settles anew; then it opens or closes until the transfer is shifted. The corridor is
/// then judged whole, as if that were its state.
#[derive(Debug, Clone)]
pub struct Alternative {
    change: Change,
    pub(super) engine: Engine,
    pub(super) trend: Trend,
    /// Statuses of the frame before.
    topology: Option<Topology>,
}

impl Alternative {
    /// One for each corridor of the grid that a change touches, from texts such as `close SV3`, `open SV1`,
    /// `insert SV2-SC`, `bypass SV2-SC`, `transfer Skarn-Velm -200` (MW, + is more in the direction of the present
    /// transfer), and from the names of outages not to reckon with, `Skarn-Velm: tower` where several corridors have
    /// one of this name. Of a corridor's texts all hold together.
    pub fn parse(with: &[String], without: &[String], grid: &Grid) -> Result<Vec<Option<Self>>, ChangeErrors> {
        let alternative = |change: Change| Self {
            engine: Engine::new(grid.frequency_hz).without(change.without.clone()),
            change,
            trend: Trend::default(),
            topology: None,
        };
        let changes = change::parse(with, without, grid)?;
        Ok(changes.into_iter().map(|change| (change != Change::default()).then(|| alternative(change))).collect())
    }

    /// Statuses with the change. A trend does not reach across a switching.
    pub(super) fn topology(&mut self, now: &Topology) -> Topology {
        let topology = self.change.topology(now);
        if self.topology.as_ref() != Some(&topology) {
            self.trend.clear();
            self.topology = Some(topology.clone());
        }
        topology
    }

    /// A fit whose terminals are joined, with the change; `None`: it leaves no balance.
    pub(super) fn alter(
        &mut self,
        corridor: &Corridor,
        fit: &Fit,
        state: &FittedState,
        seated: &Seated,
        footing: &Footing,
        topology: Topology,
    ) -> Option<Fit> {
        let shift_mw = self.change.shift_mw;
        if topology == fit.topology && shift_mw == 0.0 {
            return Some(fit.clone());
        }
        let now = Present { topology: &fit.topology, voltage: &state.voltage, load: &state.load };
        let voltage = self.engine.moved(corridor, &now, seated, footing, &topology, shift_mw)?;
        let live = topology.live(corridor);
        let load = state.load.iter().zip(&live).map(|(load, live)| if *live { *load } else { C64::default() });
        let state = FittedState { voltage, load: load.collect(), live };
        let joined = topology.joins_terminals(corridor);
        let standing = if joined { Standing::Joined(state) } else { Standing::Parted { state, angle_known: false } };
        Some(Fit { topology, standing, ..fit.clone() })
    }
}
