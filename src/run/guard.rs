//! Guards while energised: pure, asked with every sample and every tick.

use crate::plan::{Guards, Plan};
use crate::quantity::{Celsius, Moment, Reading, Readings, Seconds, at_least};
use crate::record::Status;
use crate::spec::sequence::RoleKind;

/// Why the unit must be de-energised now, in words with value and limit.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Trip(pub String);

/// What the guards know of a run.
#[derive(Debug, Clone)]
pub struct Watchman {
    guards: Guards,
    kinds: Vec<RoleKind>,
    names: Vec<String>,
    body_role: Option<usize>,
    ambient_role: Option<usize>,
    body_limit: Option<Celsius>,
    on: Option<On>,
    heard: Vec<Moment>,
    every: Vec<Option<Seconds>>,
    body: Option<f64>,
    ambient: Option<f64>,
}

/// Since when the unit is energised, and from what.
#[derive(Debug, Clone, Copy)]
struct On {
    since: Moment,
    cell: Option<usize>,
    body_then: Option<f64>,
    drew_power: bool,
    rise_seen: bool,
}

impl Watchman {
    /// Guards of a plan, not energised.
    pub fn new(plan: &Plan) -> Self {
        let roles = &plan.bay.roles;
        Self {
            guards: plan.guards.clone(),
            kinds: roles.iter().map(|role| role.kind).collect(),
            names: roles.iter().map(|role| role.name.clone()).collect(),
            body_role: plan.role("body").map(|(n, _)| n),
            ambient_role: plan.role("ambient").map(|(n, _)| n),
            body_limit: plan.guards.body,
            on: None,
            heard: vec![Moment::START; roles.len()],
            every: vec![None; roles.len()],
            body: None,
            ambient: None,
        }
    }

    /// The unit is about to be energised in a cell.
    pub fn energised(&mut self, at: Moment, cell: Option<usize>) {
        let on = On { since: at, cell, body_then: self.body, drew_power: false, rise_seen: false };
        self.on = Some(on);
    }

    /// The unit is off.
    pub fn off(&mut self) {
        self.on = None;
        self.body_limit = self.guards.body;
    }

    /// Whether the unit counts as energised.
    pub fn is_on(&self) -> bool {
        self.on.is_some()
    }

    /// An abnormal step has a trip temperature of its own.
    pub fn body_limit(&mut self, limit: Celsius) {
        self.body_limit = Some(limit);
    }

    /// Polling changed; silence counts from now.
    pub fn polling(&mut self, now: Moment, every: &[Option<Seconds>]) {
        self.every.copy_from_slice(every);
        self.heard.fill(now);
    }

    /// A sample came.
    ///
    /// # Errors
    /// The trip that it is.
    pub fn sample(&mut self, at: Moment, role: usize, status: Status, readings: &Readings) -> Result<(), Trip> {
        if self.counts_as_heard(role, status) {
            self.heard[role] = at;
        }
        if status != Status::Ok {
            return Ok(());
        }
        match self.kinds[role] {
            RoleKind::Temperature => self.temperature(at, role, readings),
            RoleKind::PowerMeter => self.input(at, readings),
            RoleKind::Supply | RoleKind::PositionSwitch => Ok(()),
        }
    }

    /// Time passed.
    ///
    /// # Errors
    /// The trip that it is: an instrument's silence, or a body that does not rise.
    pub fn tick(&self, now: Moment) -> Result<(), Trip> {
        let Some(on) = &self.on else { return Ok(()) };
        for (role, every) in self.every.iter().enumerate() {
            let Some(every) = every else { continue };
            let limit = *every + self.guards.silence[role];
            let silent = now.since(self.heard[role]);
            if silent > limit {
                let name = &self.names[role];
                let silent = Seconds::of((silent.get() * 10.0).round() / 10.0);
                return Err(Trip(format!(
                    "no reading from `{name}` for {silent}, limit {limit} (polling interval and silence limit)"
                )));
            }
        }
        self.believe_body(on, now)
    }

    /// An overload is an answer of a meter, but a temperature that is out of range
    /// leaves the body unwatched.
    fn counts_as_heard(&self, role: usize, status: Status) -> bool {
        match status {
            Status::Ok => true,
            Status::Overload => self.kinds[role] == RoleKind::PowerMeter,
            Status::NoValue | Status::Garbled | Status::NoReply => false,
        }
    }

    fn temperature(&mut self, at: Moment, role: usize, readings: &Readings) -> Result<(), Trip> {
        let Some(value) = readings.get(Reading::Temperature) else { return Ok(()) };
        if Some(role) == self.ambient_role {
            self.ambient = Some(value);
        }
        if Some(role) != self.body_role {
            return Ok(());
        }
        self.body = Some(value);
        let ambient = self.ambient;
        let least = self.guards.least_rise.get();
        let Some(on) = &mut self.on else { return Ok(()) };
        let from_start = on.body_then.map(|then| value - then);
        let from_ambient = ambient.map(|ambient| value - ambient);
        if from_start.max(from_ambient).is_some_and(|rise| rise >= least) {
            on.rise_seen = true;
        }
        match self.body_limit {
            Some(limit) if at_least(value, limit.get()) => {
                let after = at.since(on.since);
                Err(Trip(format!("body at {value} °C, limit {limit}, {} s after energising", after.get().round())))
            }
            _ => Ok(()),
        }
    }

    fn input(&mut self, at: Moment, readings: &Readings) -> Result<(), Trip> {
        let Some(on) = &mut self.on else { return Ok(()) };
        if let Some(current) = readings.get(Reading::Current)
            && current > self.guards.current.get()
        {
            let limit = self.guards.current;
            return Err(Trip(format!("current {current} A, limit {limit} (the bay's rating)")));
        }
        let Some(power) = readings.get(Reading::Power) else { return Ok(()) };
        let Some(limit) = on.cell.and_then(|cell| self.guards.input.get(cell)) else { return Ok(()) };
        // A tenth of what the plate could draw is heating that must show in the body.
        on.drew_power |= power > 0.1 * limit.get();
        let after = at.since(on.since);
        if after >= self.guards.input_after && power > limit.get() {
            return Err(Trip(format!(
                "input {power} W, limit {limit} from {} after energising on (1.3 times the upper limit)",
                self.guards.input_after
            )));
        }
        Ok(())
    }

    /// A sensor that has fallen off looks cool: drawing power without a rise is a trip.
    fn believe_body(&self, on: &On, now: Moment) -> Result<(), Trip> {
        let due = now.since(on.since) > self.guards.rise_within;
        if self.body_role.is_none() || !due || !on.drew_power || on.rise_seen {
            return Ok(());
        }
        Err(Trip(format!(
            "the body has not risen by {} within {} although power is drawn: the sensor can't be believed",
            self.guards.least_rise, self.guards.rise_within
        )))
    }
}
