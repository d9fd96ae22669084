use super::PowerAngle;

/// The present power-angle curve and where the corridor stands on it: sources of the swing.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Picture {
    /// P_e of the present network, MW.
    pub curve: PowerAngle,
    /// What the machines go on delivering, MW.
    pub p_m_mw: f64,
    /// Present angle, rad.
    pub angle_rad: f64,
}

/// One outage's curves and the angles of its swing.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct OutagePicture {
    /// P_e after the outage, MW.
    pub curve: PowerAngle,
    /// P_e while the fault is on.
    pub fault: Option<PowerAngle>,
    /// Angle when the fault is cleared (the present angle without one), rad.
    pub cleared_rad: f64,
    /// New equilibrium of the swing, rad.
    pub equilibrium_rad: Option<f64>,
    /// Tipping point, rad.
    pub tipping_rad: Option<f64>,
    /// Top of the first swing, rad; `None` when it is not survived.
    pub swing_peak_rad: Option<f64>,
}
