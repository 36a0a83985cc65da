//! Guards while energised: pure, asked with every sample and every tick.

use crate::plan::{Guards, Plan};
use crate::quantity::{Celsius, Moment, Reading, Readings, Seconds, at_least};
use crate::record::{Status, TripOf};
use crate::spec::sequence::RoleKind;

/// Why the unit must be de-energised now, in words with value and limit.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Trip {
    /// The words.
    pub reason: String,
    /// What it is evidence of.
    pub speaks_of: TripOf,
}

impl Trip {
    fn of_unit(reason: String) -> Self {
        Self {
            reason,
            speaks_of: TripOf::Unit,
        }
    }

    fn of_bench(reason: String) -> Self {
        Self {
            reason,
            speaks_of: TripOf::Bench,
        }
    }
}

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
        let roles: Vec<(&str, RoleKind)> = plan
            .bay
            .roles
            .iter()
            .map(|role| (role.name.as_str(), role.kind))
            .collect();
        Self::watching(plan.guards.clone(), &roles)
    }

    fn watching(guards: Guards, roles: &[(&str, RoleKind)]) -> Self {
        let called = |wanted: &str| roles.iter().position(|(name, _)| *name == wanted);
        Self {
            body_limit: guards.body,
            guards,
            kinds: roles.iter().map(|(_, kind)| *kind).collect(),
            names: roles.iter().map(|(name, _)| (*name).to_owned()).collect(),
            body_role: called("body"),
            ambient_role: called("ambient"),
            on: None,
            heard: vec![Moment::START; roles.len()],
            every: vec![None; roles.len()],
            body: None,
            ambient: None,
        }
    }

    /// The unit is about to be energised in a cell.
    pub fn energised(&mut self, at: Moment, cell: Option<usize>) {
        let on = On {
            since: at,
            cell,
            body_then: self.body,
            drew_power: false,
            rise_seen: false,
        };
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
    pub fn sample(
        &mut self,
        at: Moment,
        role: usize,
        status: Status,
        readings: &Readings,
    ) -> Result<(), Trip> {
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
                return Err(Trip::of_bench(format!(
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
        let Some(value) = readings.get(Reading::Temperature) else {
            return Ok(());
        };
        if Some(role) == self.ambient_role {
            self.ambient = Some(value);
        }
        if Some(role) != self.body_role {
            return Ok(());
        }
        self.body = Some(value);
        let ambient = self.ambient;
        let least = self.guards.least_rise.get();
        let Some(on) = &mut self.on else {
            return Ok(());
        };
        let from_start = on.body_then.map(|then| value - then);
        let from_ambient = ambient.map(|ambient| value - ambient);
        if [from_start, from_ambient]
            .into_iter()
            .flatten()
            .any(|rise| rise >= least)
        {
            on.rise_seen = true;
        }
        match self.body_limit {
            Some(limit) if at_least(value, limit.get()) => {
                let after = at.since(on.since);
                Err(Trip::of_unit(format!(
                    "body at {value} °C, limit {limit}, {} s after energising",
                    after.get().round()
                )))
            }
            _ => Ok(()),
        }
    }

    fn input(&mut self, at: Moment, readings: &Readings) -> Result<(), Trip> {
        let Some(on) = &mut self.on else {
            return Ok(());
        };
        if let Some(current) = readings.get(Reading::Current)
            && current > self.guards.current.get()
        {
            let limit = self.guards.current;
            return Err(Trip::of_unit(format!(
                "current {current} A, limit {limit} (the bay's rating)"
            )));
        }
        let Some(power) = readings.get(Reading::Power) else {
            return Ok(());
        };
        let Some(limit) = on.cell.and_then(|cell| self.guards.input.get(cell)) else {
            return Ok(());
        };
        // A tenth of what the plate could draw is heating that must show in the body.
        on.drew_power |= power > 0.1 * limit.get();
        let after = at.since(on.since);
        if after >= self.guards.input_after && power > limit.get() {
            return Err(Trip::of_unit(format!(
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
        Err(Trip::of_bench(format!(
            "the body has not risen by {} within {} although power is drawn: the sensor can't be believed",
            self.guards.least_rise, self.guards.rise_within
        )))
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::quantity::{Amps, Kelvins, Watts};

    const METER: usize = 0;
    const BODY: usize = 1;
    const AMBIENT: usize = 2;

    fn at(s: f64) -> Moment {
        Moment::START + Seconds::of(s)
    }

    /// Energised at 10 s, polled each second.
    fn energised() -> Watchman {
        let guards = Guards {
            body: Some(Celsius::of(111.0)),
            current: Amps::of(10.0),
            input_after: Seconds::of(60.0),
            input: vec![Watts::of(14.04)],
            silence: vec![Seconds::of(2.0); 3],
            least_rise: Kelvins::of(10.0),
            rise_within: Seconds::of(300.0),
        };
        let roles = [
            ("meter", RoleKind::PowerMeter),
            ("body", RoleKind::Temperature),
            ("ambient", RoleKind::Temperature),
        ];
        let mut watchman = Watchman::watching(guards, &roles);
        watchman.polling(at(9.0), &[Some(Seconds::of(1.0)); 3]);
        degrees(&mut watchman, 9.5, BODY, 23.0).unwrap();
        degrees(&mut watchman, 9.5, AMBIENT, 23.0).unwrap();
        watchman.energised(at(10.0), Some(0));
        watchman
    }

    fn degrees(watchman: &mut Watchman, s: f64, role: usize, value: f64) -> Result<(), Trip> {
        watchman.sample(
            at(s),
            role,
            Status::Ok,
            &Readings::one(Reading::Temperature, value),
        )
    }

    fn drawn(watchman: &mut Watchman, s: f64, current: f64, power: f64) -> Result<(), Trip> {
        let mut readings = Readings::one(Reading::Current, current);
        readings.set(Reading::Power, power);
        watchman.sample(at(s), METER, Status::Ok, &readings)
    }

    #[test]
    fn a_body_at_its_limit_trips_and_just_below_does_not() {
        assert!(degrees(&mut energised(), 20.0, BODY, 110.999).is_ok());
        assert!(degrees(&mut energised(), 20.0, BODY, 111.0).is_err());
        let trip = degrees(&mut energised(), 20.0, BODY, 120.0).unwrap_err();
        assert!(
            trip.reason.contains("120 °C") && trip.reason.contains("111 °C"),
            "{trip:?}"
        );
    }

    #[test]
    fn a_hot_ambient_or_a_hot_body_while_off_is_no_trip() {
        assert!(degrees(&mut energised(), 20.0, AMBIENT, 200.0).is_ok());
        let mut resting = energised();
        resting.off();
        assert!(degrees(&mut resting, 20.0, BODY, 200.0).is_ok());
    }

    #[test]
    fn current_above_the_bays_rating_trips_at_any_time() {
        assert!(drawn(&mut energised(), 10.1, 10.0, 9.0).is_ok());
        assert!(drawn(&mut energised(), 10.1, 10.001, 9.0).is_err());
    }

    #[test]
    fn input_is_guarded_only_after_the_stated_inrush_time() {
        assert!(drawn(&mut energised(), 69.9, 0.1, 25.0).is_ok());
        assert!(drawn(&mut energised(), 70.0, 0.1, 14.04).is_ok());
        assert!(drawn(&mut energised(), 70.0, 0.1, 14.05).is_err());
    }

    #[test]
    fn silence_beyond_interval_and_limit_trips_and_names_the_role() {
        let mut watchman = energised();
        drawn(&mut watchman, 20.0, 0.1, 9.0).unwrap();
        degrees(&mut watchman, 20.0, AMBIENT, 23.0).unwrap();
        degrees(&mut watchman, 18.0, BODY, 40.0).unwrap();
        assert!(watchman.tick(at(21.0)).is_ok());
        let trip = watchman.tick(at(21.1)).unwrap_err();
        assert!(trip.reason.contains("`body`"), "{trip:?}");
    }

    #[test]
    fn a_sentinel_keeps_a_meter_heard_but_not_a_temperature() {
        let mut watchman = energised();
        for (role, status) in [
            (METER, Status::Overload),
            (AMBIENT, Status::Ok),
            (BODY, Status::Overload),
        ] {
            watchman
                .sample(at(20.0), role, status, &Readings::NONE)
                .unwrap();
        }
        let trip = watchman.tick(at(20.0)).unwrap_err();
        assert!(trip.reason.contains("`body`"), "{trip:?}");
        assert!(watchman.heard[METER] == at(20.0));
    }

    fn keep_heard(watchman: &mut Watchman, s: f64, power: f64, body: f64) {
        drawn(watchman, s, 0.1, power).unwrap();
        degrees(watchman, s, BODY, body).unwrap();
        degrees(watchman, s, AMBIENT, 23.0).unwrap();
    }

    #[test]
    fn a_body_that_does_not_rise_is_not_believed_where_power_is_drawn() {
        let mut fallen_off = energised();
        keep_heard(&mut fallen_off, 310.0, 9.0, 25.0);
        assert!(fallen_off.tick(at(310.0)).is_ok());
        keep_heard(&mut fallen_off, 310.5, 9.0, 25.0);
        assert!(fallen_off.tick(at(310.5)).is_err());
        let mut dead = energised();
        keep_heard(&mut dead, 311.0, 0.2, 23.0);
        assert!(
            dead.tick(at(311.0)).is_ok(),
            "a dead unit is no sensor's fault"
        );
        let mut good = energised();
        keep_heard(&mut good, 200.0, 9.0, 33.0);
        keep_heard(&mut good, 311.0, 9.0, 30.0);
        assert!(good.tick(at(311.0)).is_ok());
    }

    #[test]
    fn an_abnormal_step_has_its_own_trip_until_the_unit_is_off() {
        let mut watchman = energised();
        watchman.body_limit(Celsius::of(140.0));
        assert!(degrees(&mut watchman, 20.0, BODY, 130.0).is_ok());
        assert!(degrees(&mut watchman, 20.0, BODY, 140.0).is_err());
        watchman.off();
        watchman.energised(at(30.0), Some(0));
        assert!(degrees(&mut watchman, 31.0, BODY, 130.0).is_err());
    }
}
