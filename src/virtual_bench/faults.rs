//! Faults that a virtual bench can be given, by name.
//!
//! A name may be followed by `:role` (which sensor or instrument it hits) and by
//! `@300s` (from when on, in seconds of the run): `no-reply:supply@300s`.

use std::fmt;
use std::str::FromStr;

use crate::quantity::{Moment, Seconds, shortest};

/// Something wrong with the unit, with a sensor or with a line.
#[derive(Debug, Clone, PartialEq)]
pub enum Fault {
    /// The unit draws nothing: its mains path is open.
    DeadUnit,
    /// The thermal link opens by itself, seven minutes after the first energising.
    LinkOpensMidSoak,
    /// The last element is one of another type: a plain one with 0.7 times its
    /// resistance; a PTC also switches 40 K higher.
    WrongElement,
    /// The heater is clamped loosely: its loss falls to 0.4 of what it was.
    LooseClamp,
    /// The fan is blocked: it draws more and cools nothing.
    StuckFan,
    /// A link of a much lower rating is fitted.
    WrongLink,
    /// The switch is wired the other way round.
    SwappedPositions,
    /// The first element is bridged to 12.5 ohm.
    ShortedElement,
    /// The sensor has come off and hangs in the air; hits `body`.
    SensorFallenOff(Onset),
    /// The sensors of `body` and `ambient` are exchanged.
    SwappedChannels(Onset),
    /// The sensor is broken: the instrument answers "not a number"; hits `body`.
    SensorOpen(Onset),
    /// The sensor's wires are exchanged: its rise over ambient turns round; hits `body`.
    SensorReversed(Onset),
    /// A sensor of another type: its rise reads 0.78 of what it is; hits `body`.
    SensorWrongType(Onset),
    /// Its current input loses the DC part; hits the power meter.
    MeterLosesDc(Onset),
    /// No reply comes; hits the power meter.
    NoReply(Onset),
    /// Replies come after the driver's time has passed; hits the power meter.
    LateReply(Onset),
    /// Bytes of replies are spoiled; hits the power meter.
    Garbled(Onset),
    /// What was sent comes back before the reply; hits the power meter.
    Echo(Onset),
    /// The line is dead in both directions; hits the power meter.
    Disconnect(Onset),
    /// Another instrument answers the identity query; hits the power meter.
    WrongIdentity(Onset),
    /// Each command leaves an error in the queue; hits the supply.
    ErrorQueue(Onset),
}

/// Whom a fault hits, and from when on.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Onset {
    /// The role that it hits; absent: the one that the fault's description names.
    pub role: Option<String>,
    /// From when on.
    pub from: Moment,
}

/// Why a fault's name was not understood.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub enum ParseFaultError {
    /// There is no such fault.
    #[error("no fault is called `{0}`; there are: {list}", list = Fault::ALL.join(", "))]
    Unknown(String),
    /// The start is not a number of seconds.
    #[error("`{0}` is not a start in seconds, as in `no-reply@300s`")]
    Start(String),
    /// A fault of the unit is there from the beginning and hits no role.
    #[error("`{0}` is a fault of the unit: it takes no role and no start")]
    NoOnset(String),
}

impl Fault {
    /// Every name.
    pub const ALL: [&'static str; 21] = [
        "dead-unit",
        "link-opens-mid-soak",
        "wrong-element",
        "loose-clamp",
        "stuck-fan",
        "wrong-link",
        "swapped-positions",
        "shorted-element",
        "sensor-fallen-off",
        "swapped-channels",
        "sensor-open",
        "sensor-reversed",
        "sensor-wrong-type",
        "no-reply",
        "late-reply",
        "garbled",
        "echo",
        "disconnect",
        "wrong-identity",
        "error-queue",
        "meter-loses-dc",
    ];

    /// Its name, as it is parsed.
    pub fn name(&self) -> &'static str {
        Self::ALL[self.number()]
    }

    /// Whom it hits and from when on; absent for faults of the unit.
    pub fn onset(&self) -> Option<&Onset> {
        match self {
            Fault::DeadUnit
            | Fault::LinkOpensMidSoak
            | Fault::WrongElement
            | Fault::LooseClamp
            | Fault::StuckFan
            | Fault::WrongLink
            | Fault::SwappedPositions
            | Fault::ShortedElement => None,
            Fault::SensorFallenOff(onset)
            | Fault::MeterLosesDc(onset)
            | Fault::SwappedChannels(onset)
            | Fault::SensorOpen(onset)
            | Fault::SensorReversed(onset)
            | Fault::SensorWrongType(onset)
            | Fault::NoReply(onset)
            | Fault::LateReply(onset)
            | Fault::Garbled(onset)
            | Fault::Echo(onset)
            | Fault::Disconnect(onset)
            | Fault::WrongIdentity(onset)
            | Fault::ErrorQueue(onset) => Some(onset),
        }
    }

    fn number(&self) -> usize {
        match self {
            Fault::DeadUnit => 0,
            Fault::LinkOpensMidSoak => 1,
            Fault::WrongElement => 2,
            Fault::LooseClamp => 3,
            Fault::StuckFan => 4,
            Fault::WrongLink => 5,
            Fault::SwappedPositions => 6,
            Fault::ShortedElement => 7,
            Fault::SensorFallenOff(_) => 8,
            Fault::SwappedChannels(_) => 9,
            Fault::SensorOpen(_) => 10,
            Fault::SensorReversed(_) => 11,
            Fault::SensorWrongType(_) => 12,
            Fault::NoReply(_) => 13,
            Fault::LateReply(_) => 14,
            Fault::Garbled(_) => 15,
            Fault::Echo(_) => 16,
            Fault::Disconnect(_) => 17,
            Fault::WrongIdentity(_) => 18,
            Fault::ErrorQueue(_) => 19,
            Fault::MeterLosesDc(_) => 20,
        }
    }

    fn named(name: &str, onset: Onset) -> Option<Self> {
        let fault = match name {
            "dead-unit" => Fault::DeadUnit,
            "link-opens-mid-soak" => Fault::LinkOpensMidSoak,
            "wrong-element" => Fault::WrongElement,
            "loose-clamp" => Fault::LooseClamp,
            "stuck-fan" => Fault::StuckFan,
            "wrong-link" => Fault::WrongLink,
            "swapped-positions" => Fault::SwappedPositions,
            "shorted-element" => Fault::ShortedElement,
            "sensor-fallen-off" => Fault::SensorFallenOff(onset),
            "swapped-channels" => Fault::SwappedChannels(onset),
            "sensor-open" => Fault::SensorOpen(onset),
            "sensor-reversed" => Fault::SensorReversed(onset),
            "sensor-wrong-type" => Fault::SensorWrongType(onset),
            "no-reply" => Fault::NoReply(onset),
            "late-reply" => Fault::LateReply(onset),
            "garbled" => Fault::Garbled(onset),
            "echo" => Fault::Echo(onset),
            "disconnect" => Fault::Disconnect(onset),
            "wrong-identity" => Fault::WrongIdentity(onset),
            "error-queue" => Fault::ErrorQueue(onset),
            "meter-loses-dc" => Fault::MeterLosesDc(onset),
            _ => return None,
        };
        Some(fault)
    }
}

impl FromStr for Fault {
    type Err = ParseFaultError;

    fn from_str(text: &str) -> Result<Self, ParseFaultError> {
        let (whom, start) = match text.split_once('@') {
            Some((whom, start)) => (whom, Some(start)),
            None => (text, None),
        };
        let (name, role) = match whom.split_once(':') {
            Some((name, role)) => (name.trim(), Some(role.trim().to_owned())),
            None => (whom.trim(), None),
        };
        let plain = role.is_none() && start.is_none();
        let from = start.map_or(Ok(Moment::START), parse_start)?;
        let fault = Self::named(name, Onset { role, from })
            .ok_or_else(|| ParseFaultError::Unknown(name.to_owned()))?;
        if fault.onset().is_none() && !plain {
            return Err(ParseFaultError::NoOnset(name.to_owned()));
        }
        Ok(fault)
    }
}

/// A start in seconds: `300s` or `300 s`, at most a year.
fn parse_start(text: &str) -> Result<Moment, ParseFaultError> {
    let number = text.trim().strip_suffix('s').map(str::trim_end);
    number
        .and_then(|n| n.parse::<f64>().ok())
        .filter(|s| *s <= 366.0 * 86_400.0)
        .and_then(Seconds::new)
        .map(|seconds| Moment::START + seconds)
        .ok_or_else(|| ParseFaultError::Start(text.to_owned()))
}

impl fmt::Display for Fault {
    /// As it is parsed.
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(self.name())?;
        let Some(onset) = self.onset() else {
            return Ok(());
        };
        if let Some(role) = &onset.role {
            write!(f, ":{role}")?;
        }
        if onset.from > Moment::START {
            write!(f, "@{}s", shortest(onset.from.as_secs_f64()))?;
        }
        Ok(())
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_name_is_parsed_and_written_the_same() {
        for name in Fault::ALL {
            let fault: Fault = name.parse().unwrap();
            assert_eq!(fault.name(), name);
            assert_eq!(fault.to_string(), name);
        }
    }

    #[test]
    fn a_start_and_a_role_are_understood() {
        let fault: Fault = "no-reply:supply@300s".parse().unwrap();
        let onset = Onset {
            role: Some("supply".to_owned()),
            from: Moment::from_micros(300_000_000),
        };
        assert_eq!(fault, Fault::NoReply(onset));
        assert_eq!(fault.to_string(), "no-reply:supply@300s");
        assert_eq!(
            "echo@1.5 s".parse::<Fault>().unwrap().to_string(),
            "echo@1.5s"
        );
    }

    #[test]
    fn what_is_not_a_fault_says_what_would_be() {
        let message = |text: &str| text.parse::<Fault>().unwrap_err().to_string();
        assert!(message("noreply").contains("no-reply, late-reply"));
        for bad in [
            "echo@",
            "echo@s",
            "echo@-1s",
            "echo@infs",
            "echo@NaNs",
            "echo@1e99s",
        ] {
            assert!(message(bad).contains("start in seconds"), "{bad}");
        }
        assert!(message("dead-unit@3s").contains("no start"));
        assert!(message("").contains("dead-unit"));
    }
}
