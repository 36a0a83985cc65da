//! A campaign: populations drawn, played and counted, part by part.

use std::sync::Arc;

use tokio::runtime::Runtime;

use super::TruthError;
use super::coverage::{Coverage, Quantity, count, rows};
use super::limit::draw;
use super::outcomes::{FaultRow, Outcomes, Place, SENSOR_FAULTS, UNIT_FAULTS, place};
use super::play::{Played, play, simulated};
use super::report::{Early, Part, Report};
use super::setting::{Kind, Setting, Variant};
use super::unit::{Spread, Unit};
use crate::analysis::Estimate;
use crate::plan::{Action, PlannedStep};
use crate::quantity::{Moment, Seconds};
use crate::virtual_bench::{Chance, Drawn, Fault, Onset};

/// One unit in so many of the whole count is made faulty, for each fault.
const PER_FAULT: u64 = 20;
/// One unit in so many runs with and without an early finish.
const PER_EARLY: u64 = 4;
/// A sensor's fault that can come up while energised does so by then, seconds of the
/// run: before the first measurement ends, so that it spoils something.
const ONSET_BY_S: f64 = 420.0;

/// What is to be measured.
#[derive(Debug, Clone, PartialEq)]
pub struct Campaign {
    /// Units of each population; faults and early finish take a share of it each.
    pub units: u64,
    /// Chooses everything.
    pub seed: u64,
    /// Which parts.
    pub parts: Vec<Part>,
    /// Draws on the limit.
    pub draws: u64,
    /// The accuracy that the drivers state, as a share of the true one: 1 is honest.
    pub claimed: f64,
}

impl Campaign {
    /// Everything, honestly.
    pub fn whole(units: u64, seed: u64) -> Self {
        Campaign {
            units,
            seed,
            parts: Part::ALL.to_vec(),
            draws: 20_000,
            claimed: 1.0,
        }
    }
}

/// Outcomes by where the truth lies.
type Places = Vec<(Place, Outcomes)>;

/// What a campaign works with.
struct Work<'a> {
    campaign: &'a Campaign,
    settings: Vec<Arc<Setting>>,
    runtime: Runtime,
    progress: &'a mut dyn FnMut(Part, u64),
    runs: u64,
}

/// Runs a campaign; `progress` is told the part and how many runs there were.
///
/// # Errors
/// Where something fails that has nothing to do with what is measured.
pub fn measure(
    campaign: &Campaign,
    progress: &mut dyn FnMut(Part, u64),
) -> Result<Report, TruthError> {
    let mut work = Work {
        campaign,
        settings: settings(campaign, false)?,
        runtime: simulated()?,
        progress,
        runs: 0,
    };
    let mut report = Report {
        units: campaign.units,
        seed: campaign.seed,
        ..Report::default()
    };
    for part in Part::ALL {
        if !campaign.parts.contains(&part) {
            continue;
        }
        match part {
            Part::Good => (report.good, report.places) = work.good()?,
            Part::Control => report.control = work.control()?,
            Part::Limit => report.limit = work.limit()?,
            Part::Faults => report.faults = work.faults()?,
            Part::EarlyFinish => report.early = work.early()?,
        }
    }
    report.runs = work.runs;
    Ok(report)
}

fn settings(campaign: &Campaign, early_finish: bool) -> Result<Vec<Arc<Setting>>, TruthError> {
    let variant = Variant {
        early_finish,
        claimed: campaign.claimed,
    };
    let of = |kind| Setting::new(kind, variant).map(Arc::new);
    Kind::ALL.into_iter().map(of).collect()
}

/// The appliances take turns, and in each every second unit lies around the limits.
fn turn(number: u64) -> (usize, Spread) {
    let spread = if (number / 2).is_multiple_of(2) {
        Spread::Production
    } else {
        Spread::Limits
    };
    ((number % 2) as usize, spread)
}

impl Work<'_> {
    fn play(
        &mut self,
        part: Part,
        setting: &Setting,
        unit: &Unit,
        drawn: Drawn,
    ) -> Result<Played, TruthError> {
        let played = play(&self.runtime, setting, unit, drawn)?;
        self.runs += 1;
        (self.progress)(part, self.runs);
        Ok(played)
    }

    fn good(&mut self) -> Result<(Vec<Coverage>, Places), TruthError> {
        let mut coverage = rows();
        let mut places: Places = Place::ALL
            .map(|place| (place, Outcomes::default()))
            .to_vec();
        for number in 0..self.campaign.units {
            let (which, spread) = turn(number);
            let setting = self.settings[which].clone();
            let unit = Unit::draw(&setting, self.campaign.seed, "good", number, spread);
            let played = self.play(Part::Good, &setting, &unit, Drawn::AsStated)?;
            let truths = count(&mut coverage, &setting, &unit, &played)?;
            let lies = place(&setting, &played, &truths);
            for (_, outcomes) in places.iter_mut().filter(|(place, _)| *place == lies) {
                outcomes.add(played.judgement.verdict);
            }
        }
        Ok((coverage, places))
    }

    /// All inputs normal, and the voltage exactly as it is wanted: how an input
    /// depends on it is no normal distribution.
    fn control(&mut self) -> Result<Vec<Coverage>, TruthError> {
        let mut coverage = rows();
        for number in 0..self.campaign.units {
            let (which, spread) = turn(number);
            let setting = self.settings[which].clone();
            let mut unit = Unit::draw(&setting, self.campaign.seed, "control", number, spread);
            unit.supply = 0.0;
            let played = self.play(Part::Control, &setting, &unit, Drawn::Normal)?;
            count(&mut coverage, &setting, &unit, &played)?;
        }
        Ok(coverage)
    }

    fn limit(&mut self) -> Result<Vec<super::limit::AtLimit>, TruthError> {
        let mut found = Vec::new();
        for setting in self.settings.clone() {
            let seed = self.campaign.seed;
            let unit = Unit::draw(&setting, seed, "limit", 0, Spread::Production);
            let played = self.play(Part::Limit, &setting, &unit, Drawn::AsStated)?;
            for quantity in [Quantity::Power, Quantity::Worst] {
                let result = played.cell(setting.kind.position());
                let Some(budget) = result.and_then(|result| quantity.of(result)) else {
                    continue;
                };
                let of = format!("{}, {}", quantity.words(), setting.kind.words());
                found.extend(self.both(&of, budget));
            }
        }
        Ok(found)
    }

    fn both(&self, of: &str, budget: &Estimate) -> [super::limit::AtLimit; 2] {
        let (draws, seed) = (self.campaign.draws, self.campaign.seed);
        let one = |drawn| draw(of, budget, drawn, draws, seed);
        [one(Drawn::AsStated), one(Drawn::Normal)]
    }

    fn faults(&mut self) -> Result<Vec<FaultRow>, TruthError> {
        let mut found = Vec::new();
        let unit_faults = UNIT_FAULTS.map(|(name, fan)| (name, fan, false));
        let sensor_faults = SENSOR_FAULTS.map(|(name, later)| (name, false, later));
        for (fault, fan_only, later) in unit_faults.into_iter().chain(sensor_faults) {
            for setting in self.settings.clone() {
                if fan_only && setting.kind != Kind::Fan {
                    continue;
                }
                found.push(self.fault(&setting, fault, later)?);
            }
        }
        Ok(found)
    }

    fn fault(
        &mut self,
        setting: &Setting,
        name: &'static str,
        later: bool,
    ) -> Result<FaultRow, TruthError> {
        let seed = self.campaign.seed;
        let mut outcomes = Outcomes::default();
        for number in 0..self.campaign.units.div_ceil(PER_FAULT) {
            let mut unit = Unit::draw(setting, seed, name, number, Spread::Production);
            let from = if later {
                let share = 0.5 * (1.0 + Chance::of(seed, &format!("{name} from")).even(number));
                Moment::START + Seconds::of(ONSET_BY_S * share)
            } else {
                Moment::START
            };
            unit.faults = vec![with_onset(name, from)?];
            let played = self.play(Part::Faults, setting, &unit, Drawn::AsStated)?;
            outcomes.add(played.judgement.verdict);
        }
        Ok(FaultRow {
            fault: name,
            kind: setting.kind,
            outcomes,
        })
    }

    /// Nothing where the sequence's language knows no early finish.
    fn early(&mut self) -> Result<Vec<Early>, TruthError> {
        let Ok(early_settings) = settings(self.campaign, true) else {
            return Ok(Vec::new());
        };
        let mut found: Vec<Early> = Kind::ALL.map(Early::new).to_vec();
        let mut coverage = rows();
        for number in 0..self.campaign.units.div_ceil(PER_EARLY) {
            let (which, spread) = turn(number);
            let usual = self.settings[which].clone();
            let unit = Unit::draw(&usual, self.campaign.seed, "early finish", number, spread);
            let long = self.play(Part::EarlyFinish, &usual, &unit, Drawn::AsStated)?;
            let setting = &early_settings[which];
            let short = self.play(Part::EarlyFinish, setting, &unit, Drawn::AsStated)?;
            count(&mut coverage, setting, &unit, &short)?;
            let soaked = [soaked_s(&usual, &long), soaked_s(setting, &short)];
            let verdicts = [long, short].map(|played| played.judgement.verdict);
            let of_kind = found.iter_mut().filter(|early| early.kind == usual.kind);
            of_kind.for_each(|early| early.add(soaked, verdicts));
        }
        for early in &mut found {
            let is_its = |row: &&Coverage| row.kind == Some(early.kind);
            for row in coverage.iter().filter(is_its) {
                match row.quantity {
                    Quantity::Power => early.power = row.covered,
                    Quantity::Worst => early.worst = row.covered,
                    Quantity::Body => {}
                }
            }
        }
        Ok(found)
    }
}

/// How long a unit soaked in all cells, seconds: energised, without the steps `measure`
/// that take the same time whatever the soak does.
fn soaked_s(setting: &Setting, played: &Played) -> f64 {
    let measured = |step: &PlannedStep| match (&step.action, step.cell) {
        (Action::Measure(timed), Some(cell)) => {
            let result = played.analysis.cells.get(cell)?;
            result.steady.known().map(|_| timed.length.get())
        }
        _ => None,
    };
    let measuring: f64 = setting.plan.steps.iter().filter_map(measured).sum();
    played.energised_s() - measuring
}

fn with_onset(name: &str, from: Moment) -> Result<Fault, TruthError> {
    let onset = Onset { role: None, from };
    let fault = match name {
        "sensor-fallen-off" => Fault::SensorFallenOff(onset),
        "sensor-open" => Fault::SensorOpen(onset),
        _ => name
            .parse()
            .map_err(|e: crate::virtual_bench::ParseFaultError| TruthError::Files(e.to_string()))?,
    };
    Ok(fault)
}
