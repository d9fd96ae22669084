//! What each event does to the world.

use std::sync::Arc;

use super::{Action, Change, What, agenda::Due, plant::FaultOn, truth::rounded, world::World};
use crate::{
    feed::End,
    grid::{BankIndex, FROM, Fault, TO},
    network::{C64, Topology},
};

impl World {
    pub(super) fn happen(&mut self, due: Due) {
        match due {
            Due::Action(action) => self.act(action),
            Due::Clear(circuit) => {
                if self.fault.take_if(|on| on.circuit == circuit).is_some() {
                    self.set_closed(circuit, false);
                }
            }
            Due::Random { side, draw } => {
                if let Some(steps) = &self.truth.sides[side].steps {
                    let mut kv = [0.0; 2];
                    kv[side] = draw.directed(self.stepped_kv[side], steps);
                    self.step(kv);
                }
            }
            Due::RandomBoth(draws) => {
                if let Some(steps) = &self.truth.coincident_steps {
                    self.step([0, 1].map(|side| draws[side].directed(self.stepped_kv[side], steps)));
                }
            }
        }
    }

    fn act(&mut self, action: Action) {
        match action {
            Action::Step { side, change } => {
                let mut kv = [0.0; 2];
                kv[side] = match change {
                    Change::Kv(kv) => kv,
                    Change::Percent(percent) => self.e_kv()[side] * percent / 100.0,
                };
                self.step(kv);
            }
            Action::Impedance { side, r_ohm, x_ohm } => {
                self.z_ohm[side] = C64::new(r_ohm, x_ohm);
                let bus = Arc::clone(&self.corridor.buses[side].name);
                self.record(What::Impedance { bus, r_ohm, x_ohm });
                self.disturb();
            }
            Action::Trip(circuit) => self.set_closed(circuit, false),
            Action::Return(circuit) => self.close(circuit),
            Action::Fault { circuit, fault } => self.begin_fault(circuit, fault),
            Action::Bypass(bank) => self.set_inserted(bank, false),
            Action::Insert(bank) => self.set_inserted(bank, true),
        }
    }

    fn step(&mut self, kv: [f64; 2]) {
        for side in [0, 1] {
            self.stepped_kv[side] += kv[side];
        }
        self.record(What::Step { kv: kv.map(rounded) });
        self.disturb();
    }

    fn set_closed(&mut self, circuit: usize, closed: bool) {
        if std::mem::replace(&mut self.topology.closed[circuit], closed) != closed {
            let name = Arc::clone(&self.corridor.circuits[circuit].name);
            self.record(What::Switched { name, in_service: closed });
            self.switch();
            self.disturb();
        }
    }

    fn set_inserted(&mut self, BankIndex { circuit, bank }: BankIndex, inserted: bool) {
        if std::mem::replace(&mut self.topology.inserted[circuit][bank], inserted) != inserted {
            let name = Arc::clone(&self.corridor.circuits[circuit].banks[bank].name);
            self.record(What::Switched { name, in_service: inserted });
            self.switch();
            self.disturb();
        }
    }

    /// Closes a circuit as its synchronism check would: within its limits, or onto a dead bus.
    fn close(&mut self, circuit: usize) {
        self.solve();
        let buses = self.corridor.circuits[circuit].between;
        let [first, second] = buses.map(|bus| self.voltages_kv[bus]);
        let check = self.corridor.reclose;
        let live = first.norm().min(second.norm()) > 0.0;
        let angle_deg = (first * second.conj()).arg().abs().to_degrees();
        let voltage_pct = 100.0 * (first.norm() - second.norm()).abs() / self.corridor.buses[buses[0]].nominal_kv;
        if live && (angle_deg > check.max_angle_deg || voltage_pct > check.max_voltage_pct) {
            let name = Arc::clone(&self.corridor.circuits[circuit].name);
            let (angle_deg, voltage_pct) = (rounded(angle_deg), rounded(voltage_pct));
            self.record(What::CloseRefused { name, angle_deg, voltage_pct });
        } else {
            self.set_closed(circuit, true);
        }
    }

    fn begin_fault(&mut self, circuit: usize, fault: Fault) {
        if !self.topology.closed[circuit] {
            return;
        }
        self.solve();
        let exporter = if self.transfer_mw() < 0.0 { TO } else { FROM };
        let distance = Topology::distance(&self.corridor, exporter);
        let [first, second] = self.corridor.circuits[circuit].between.map(|bus| distance[bus]);
        let counted_from = if second < first { End::To } else { End::From };
        self.fault = Some(FaultOn { circuit, fault, counted_from });
        self.record(What::Fault { name: Arc::clone(&self.corridor.circuits[circuit].name) });
        self.switch();
        self.disturb();
    }
}
