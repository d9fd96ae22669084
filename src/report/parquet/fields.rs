use std::sync::Arc;

use crate::{
    desk::{Assessment, OutageRecord},
    margin::Criterion,
};

/// What a row is made of.
pub(super) struct Row<'a> {
    pub was: &'a Assessment,
    pub what_if: Option<&'a Assessment>,
    /// The outage that binds.
    pub binding: Option<&'a OutageRecord>,
}

/// A column.
pub(super) struct Field {
    pub name: &'static str,
    pub get: Get,
}

/// Where its values come from, and of what kind they are.
#[derive(Clone, Copy)]
pub(super) enum Get {
    /// Microseconds since 1970.
    Time(fn(&Row) -> i64),
    Count(fn(&Row) -> i64),
    /// A number that differs from frame to frame.
    Number(fn(&Row) -> Option<f64>),
    /// A number that stays for long.
    Steady(fn(&Row) -> Option<f64>),
    Text(for<'a> fn(&Row<'a>) -> Option<&'a str>),
    List(for<'a> fn(&Row<'a>) -> &'a [Arc<str>]),
}

impl<'a> Row<'a> {
    pub fn new(was: &'a Assessment, what_if: Option<&'a Assessment>) -> Self {
        let binding = outage(was).and_then(|name| was.outages.iter().find(|outage| *outage.name == *name));
        Self { was, what_if, binding }
    }
}

fn outage(assessment: &Assessment) -> Option<&str> {
    assessment.binding.as_ref()?.outage.as_deref()
}

fn criterion(assessment: &Assessment) -> Option<&'static str> {
    Some(Criterion::word(assessment.binding.as_ref()?.criterion))
}

const fn field(name: &'static str, get: Get) -> Field {
    Field { name, get }
}

/// The columns, in order.
pub(super) fn fields(with_what_if: bool) -> impl Iterator<Item = &'static Field> {
    WAS.iter().chain(WHAT_IF.iter().filter(move |_| with_what_if))
}

static WAS: [Field; 41] = [
    field("time", Get::Time(|row| row.was.time.timestamp_micros())),
    field("corridor", Get::Text(|row| Some(&row.was.corridor))),
    field("state", Get::Text(|row| Some(row.was.state.word()))),
    field("exporter", Get::Text(|row| row.was.exporter.as_deref())),
    field("transfer_mw", Get::Number(|row| row.was.transfer_mw)),
    field("bus_angle_deg", Get::Number(|row| row.was.bus_angle_deg)),
    field("internal_angle_deg", Get::Number(|row| row.was.internal_angle_deg)),
    field("swing_angle_deg", Get::Number(|row| row.was.swing_angle_deg)),
    field("headroom_mw", Get::Number(|row| row.was.headroom_mw)),
    field("headroom_sd_mw", Get::Number(|row| row.was.headroom_sd_mw)),
    field("binding_outage", Get::Text(|row| outage(row.was))),
    field("binding_criterion", Get::Text(|row| criterion(row.was))),
    field("binding_angle_margin_deg", Get::Number(|row| row.binding?.angle_margin_deg)),
    field("binding_swing_peak_deg", Get::Number(|row| row.binding?.swing_peak_deg)),
    field("binding_area_margin", Get::Number(|row| row.binding?.area_margin)),
    field("binding_critical_ms", Get::Number(|row| row.binding?.critical_ms)),
    field("binding_loading_pct", Get::Number(|row| row.binding?.loading_pct)),
    field("minutes_to_thin", Get::Number(|row| row.was.minutes_to_thin)),
    field("minutes_to_spent", Get::Number(|row| row.was.minutes_to_spent)),
    field("thin_mw", Get::Steady(|row| Some(row.was.thin_mw))),
    field("from_bus", Get::Text(|row| Some(&row.was.sources[0].bus))),
    field("from_r_ohm", Get::Steady(|row| Some(row.was.sources[0].r_ohm))),
    field("from_x_ohm", Get::Steady(|row| Some(row.was.sources[0].x_ohm))),
    field("from_r_sd", Get::Steady(|row| Some(row.was.sources[0].r_sd))),
    field("from_x_sd", Get::Steady(|row| Some(row.was.sources[0].x_sd))),
    field("from_basis", Get::Text(|row| Some(row.was.sources[0].basis.word()))),
    field("from_steps", Get::Count(|row| row.was.sources[0].steps.cast_signed())),
    field("to_bus", Get::Text(|row| Some(&row.was.sources[1].bus))),
    field("to_r_ohm", Get::Steady(|row| Some(row.was.sources[1].r_ohm))),
    field("to_x_ohm", Get::Steady(|row| Some(row.was.sources[1].x_ohm))),
    field("to_r_sd", Get::Steady(|row| Some(row.was.sources[1].r_sd))),
    field("to_x_sd", Get::Steady(|row| Some(row.was.sources[1].x_sd))),
    field("to_basis", Get::Text(|row| Some(row.was.sources[1].basis.word()))),
    field("to_steps", Get::Count(|row| row.was.sources[1].steps.cast_signed())),
    field("fit_chi2", Get::Number(|row| row.was.fit.chi2)),
    field("fit_dof", Get::Count(|row| row.was.fit.dof.cast_signed() as i64)),
    field("fit_limit", Get::Steady(|row| row.was.fit.limit)),
    field("suspects", Get::List(|row| &row.was.fit.suspects)),
    field("missing", Get::List(|row| &row.was.fit.missing)),
    field("assumed", Get::List(|row| &row.was.fit.assumed)),
    field("peak_mw", Get::Number(|row| Some(row.was.intact.as_ref()?.peak_mw))),
];

static WHAT_IF: [Field; 6] = [
    field("if_state", Get::Text(|row| Some(row.what_if?.state.word()))),
    field("if_transfer_mw", Get::Number(|row| row.what_if?.transfer_mw)),
    field("if_headroom_mw", Get::Number(|row| row.what_if?.headroom_mw)),
    field("if_headroom_sd_mw", Get::Number(|row| row.what_if?.headroom_sd_mw)),
    field("if_binding_outage", Get::Text(|row| outage(row.what_if?))),
    field("if_binding_criterion", Get::Text(|row| criterion(row.what_if?))),
];
