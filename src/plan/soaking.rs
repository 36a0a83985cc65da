//! What settling needs to know of a planned soak: the same while running and from
//! the record.

use super::types::{Action, Plan, PlannedRole};
use crate::quantity::{Kelvins, Reading, Seconds, Watts};
use crate::spec::sequence::{RoleKind, Soak, Soaking};

impl Plan {
    /// The set-up of settling for a soak; nothing for another action.
    pub fn soaking(&self, action: &Action) -> Option<Soaking> {
        let Action::Soak {
            at_least,
            at_most,
            every,
            until,
            early_finish,
        } = action
        else {
            return None;
        };
        let roles = &self.bay.roles;
        let watched = || roles.iter().filter(|role| is_watched(role));
        let slowest = watched()
            .map(|role| self.instrument_of(role).driver.update_interval)
            .fold(*every, later);
        let coarsest = |reading: Reading| {
            watched()
                .filter_map(|role| self.instrument_of(role).driver.accuracy_of(reading))
                .map(|accuracy| accuracy.resolution)
                .fold(0.0, f64::max)
        };
        Some(Soaking {
            soak: Soak {
                at_least: *at_least,
                at_most: *at_most,
                every: slowest,
                until: until.clone(),
                early_finish: *early_finish,
            },
            cycling: self.appliance.thermostat,
            element: self.appliance.element,
            fan: self.appliance.fan,
            power_resolution: Watts::new(coarsest(Reading::Power)).unwrap_or_default(),
            temperature_resolution: Kelvins::new(coarsest(Reading::Temperature))
                .unwrap_or_default(),
        })
    }
}

fn later(a: Seconds, b: Seconds) -> Seconds {
    if b > a { b } else { a }
}

/// The roles that a criterion looks at.
fn is_watched(role: &PlannedRole) -> bool {
    match role.kind {
        RoleKind::PowerMeter => true,
        RoleKind::Temperature => matches!(role.name.as_str(), "body" | "ambient"),
        RoleKind::Supply | RoleKind::PositionSwitch => false,
    }
}
