//! The tube: for each interval, the storage power that the duty allows.

use super::Limits;

/// Allowed storage power in an interval, kW at the connection point, **discharge positive** (this is the one place where
/// discharge is positive: the letters of the window-sum method).
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Tube {
    /// Least discharge (most charge); may be minus infinity.
    pub lo: f64,
    /// Most discharge (least charge); may be infinity.
    pub hi: f64,
}

impl Tube {
    /// Islanded balance with curtailment allowed: surplus may be taken, deficit must be served.
    pub fn balance(net_kw: f64) -> Self {
        if net_kw > 0.0 { Self { lo: -net_kw, hi: 0.0 } } else { Self { lo: -net_kw, hi: -net_kw } }
    }

    /// A power (kW, positive = charge) that is fixed.
    pub fn fixed(power_kw: f64) -> Self {
        Self { lo: 0.0 - power_kw, hi: 0.0 - power_kw }
    }

    /// Limits at a connection point.
    pub fn limits(net_kw: f64, limits: &Limits) -> Self {
        let load = -net_kw;
        let within_import = limits.import_kw.map_or(f64::NEG_INFINITY, |limit| load - limit);
        let within_export = limits.export_kw.map_or(f64::INFINITY, |limit| load + limit);
        Self {
            lo: if limits.recharge { within_import } else { within_import.max(load.min(0.0)) },
            hi: if limits.discharge { within_export } else { within_export.min(load.max(0.0)) },
        }
    }

    /// The tube within a store's ratings (kW; none = no limit); may come out empty (`lo > hi`).
    #[must_use]
    pub fn rated(self, charge_kw: Option<f64>, discharge_kw: Option<f64>) -> Self {
        Self {
            lo: charge_kw.map_or(self.lo, |limit| self.lo.max(-limit)),
            hi: discharge_kw.map_or(self.hi, |limit| self.hi.min(limit)),
        }
    }
}
