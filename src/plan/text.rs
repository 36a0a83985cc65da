//! A plan for people, as `check` prints it.

use super::types::{Action, Plan, PlannedRule, PlannedStep};
use crate::quantity::{Seconds, Watts};
use crate::spec::plate;
use crate::spec::sequence::{
    AnswerKind, Criterion, CriterionKind, Decision, RuleKind, RuleWeight, Span,
};

impl Plan {
    /// The plan in lines: what, with what, guards, steps, rules, how long.
    pub fn lines_of_text(&self) -> Vec<String> {
        let mut lines = vec![
            format!("{}, edition {}", self.title, self.edition),
            format!("appliance  {}", self.appliance.model),
            format!(
                "bench      {}, {}, rated {}",
                self.bench, self.bay.name, self.bay.rated_current
            ),
        ];
        lines.extend(self.roles());
        lines.extend(self.guard_lines());
        lines.push(String::new());
        lines.push("steps".to_owned());
        lines.extend(self.step_lines());
        lines.push(String::new());
        lines.push("rules".to_owned());
        lines.extend(self.rules.iter().flat_map(|rule| self.rule_lines(rule)));
        lines.push(String::new());
        lines.push(format!(
            "expected about {}, at the longest {}, without the operator's time",
            hours(self.expected),
            hours(self.longest())
        ));
        lines
    }

    fn roles(&self) -> Vec<String> {
        let role = |role: &super::types::PlannedRole| {
            let instrument = self.instrument_of(role);
            let channel = role
                .channel
                .map_or_else(String::new, |c| format!(", channel {c}"));
            let due = instrument
                .due
                .map_or_else(String::new, |due| format!(", due {due}"));
            format!(
                "  {:<10} {}{channel} ({}{due})",
                role.name, instrument.name, instrument.driver.name
            )
        };
        let mut lines = vec!["roles".to_owned()];
        lines.extend(self.bay.roles.iter().map(role));
        lines
    }

    fn guard_lines(&self) -> Vec<String> {
        let guards = &self.guards;
        let mut lines = vec!["guards while energised".to_owned()];
        if let Some(body) = guards.body {
            lines.push(format!(
                "  body       {body} (the lower of Tf - 10 K and the sequence's)"
            ));
        }
        lines.push(format!(
            "  current    {} (the bay's rating)",
            guards.current
        ));
        for (cell, input) in self.cells.iter().zip(&guards.input) {
            let line = format!(
                "  input      {input:.2}, position {}, from {} on",
                cell.position, guards.input_after
            );
            if !lines.contains(&line) {
                lines.push(line);
            }
        }
        let silence = guards.silence.iter().map(|s| s.get()).fold(0.0, f64::max);
        lines.push(format!(
            "  silence    {silence} s beyond the polling interval, at the longest"
        ));
        lines.push(format!(
            "  sensor     rises by {} within {} (house default)",
            guards.least_rise, guards.rise_within
        ));
        lines
    }

    fn step_lines(&self) -> Vec<String> {
        let mut lines = Vec::new();
        let mut cell = None;
        for step in &self.steps {
            if step.cell != cell {
                cell = step.cell;
                lines.extend(cell.map(|n| {
                    let cell = &self.cells[n];
                    let condition = cell
                        .condition
                        .as_ref()
                        .map_or_else(String::new, |c| format!("{c}, "));
                    format!(
                        "  -- {condition}{}, {} {}",
                        cell.position, cell.supply.voltage, cell.supply.frequency
                    )
                }));
            }
            lines.push(step_line(step));
        }
        lines
    }

    fn rule_lines(&self, rule: &PlannedRule) -> Vec<String> {
        let weight = match rule.weight {
            RuleWeight::Required => "required",
            RuleWeight::Information => "information",
        };
        let decision = match rule.decision {
            Decision::Simple => "simple".to_owned(),
            Decision::Guarded { ratio } => format!("guarded by {ratio} U"),
            Decision::FourOutcomes => "four outcomes".to_owned(),
        };
        let of = [&rule.position, &rule.condition];
        let of: String = of
            .into_iter()
            .flatten()
            .map(|name| format!(", {name}"))
            .collect();
        let mut lines: Vec<String> = self
            .limits_of(rule)
            .into_iter()
            .map(|limits| format!("  {limits}{of}; {weight}, {decision}"))
            .collect();
        lines.push(format!("    source: {}", rule.source));
        lines
    }

    fn limits_of(&self, rule: &PlannedRule) -> Vec<String> {
        let link = self.appliance.link.as_ref();
        match &rule.kind {
            RuleKind::PlatePower => self.plate_limits(rule.position.as_deref()),
            RuleKind::PowerLimits { at_least, at_most } => {
                vec![format!("power {}", between(*at_least, *at_most))]
            }
            RuleKind::LinkHolding => {
                let th = link
                    .and_then(|link| link.th)
                    .map_or_else(String::new, |th| th.to_string());
                vec![format!("body at the highest ambient to Th {th}")]
            }
            RuleKind::LinkOpening => {
                let from = link.map_or_else(String::new, |link| link.opens_from.to_string());
                vec![format!("body at the highest ambient to Tf - 10 K, {from}")]
            }
            RuleKind::Inrush { at_most } => vec![format!("inrush to {at_most}")],
            RuleKind::PositionOrder => vec![format!(
                "input rises: {}",
                self.appliance.positions.join(" < ")
            )],
            RuleKind::TemperatureRise { role, at_most } => {
                vec![format!("{role} rises to {at_most} over ambient")]
            }
        }
    }

    fn plate_limits(&self, position: Option<&str>) -> Vec<String> {
        let wanted = self
            .appliance
            .plate
            .iter()
            .filter(|entry| position.is_none_or(|p| p == entry.position));
        wanted
            .map(|entry| {
                let band = plate::limits(self.appliance.kind, entry.power);
                let rated = span(entry.power);
                format!(
                    "power {}, rated {rated}: {}",
                    entry.position,
                    between(band.at_least, Some(band.at_most))
                )
            })
            .collect()
    }
}

fn step_line(step: &PlannedStep) -> String {
    format!(
        "  {:>3} {:<11} {}",
        step.number,
        step.action.verb(),
        detail(&step.action)
    )
    .trim_end()
    .to_owned()
}

fn detail(action: &Action) -> String {
    match action {
        Action::Instruct(text) => text.clone(),
        Action::SetCondition {
            condition,
            instruction,
        } => format!("{condition}: {instruction}"),
        Action::Ask(question) => format!("{} ({})", question.text, answers(&question.answer)),
        Action::Acclimatise(waiting) | Action::Rest(waiting) => format!(
            "until the body is within {} of ambient, at most {}, every {}",
            waiting.within, waiting.at_most, waiting.every
        ),
        Action::SetSupply(point) => format!("{} {}", point.voltage, point.frequency),
        Action::SetPosition {
            position,
            by_switch: true,
            ..
        } => position.clone(),
        Action::SetPosition {
            position,
            by_switch: false,
            ..
        } => format!("{position}, by the operator"),
        Action::Energise | Action::Deenergise => String::new(),
        Action::Inrush(timed) | Action::Measure(timed) | Action::RunIn(timed) => {
            format!("for {}, every {}", timed.length, timed.every)
        }
        Action::Soak {
            at_least,
            at_most,
            every,
            until,
        } => {
            format!(
                "{at_least} to {at_most}, every {every}, until {}",
                criterion(until)
            )
        }
        Action::Abnormal {
            fault,
            length,
            every,
            body,
        } => {
            format!("{fault}: for {length}, every {every}, trips at {body}; attended")
        }
    }
}

fn answers(kind: &AnswerKind) -> String {
    match kind {
        AnswerKind::YesNo => "yes or no".to_owned(),
        AnswerKind::Number { unit, .. } => format!("a number in {unit}"),
        AnswerKind::Choice(choices) => choices.join(", "),
    }
}

fn criterion(criterion: &Criterion) -> String {
    let (what, per) = match criterion.kind {
        CriterionKind::Slope { window } => (format!("slope over {window}"), " per hour"),
        CriterionKind::ThreeReadings => ("three readings at 10 % of the time".to_owned(), ""),
        CriterionKind::ChangeWithin { interval } => (format!("change within {interval}"), ""),
    };
    let power = criterion
        .power_change
        .map(|change| format!(", power {change}{per}"));
    let body = criterion
        .temperature_change
        .map(|change| format!(", body {change}{per}"));
    [Some(what), power, body].into_iter().flatten().collect()
}

fn between(at_least: Option<Watts>, at_most: Option<Watts>) -> String {
    match (at_least, at_most) {
        (Some(low), Some(high)) => format!("{low:.2} to {high:.2}"),
        (None, Some(high)) => format!("to {high:.2}, no lower limit"),
        (Some(low), None) => format!("from {low:.2}, no upper limit"),
        (None, None) => "without limits".to_owned(),
    }
}

fn span(power: Span<Watts>) -> String {
    if power.low == power.high {
        power.low.to_string()
    } else {
        format!("{} to {}", power.low, power.high)
    }
}

fn hours(time: Seconds) -> String {
    let minutes = (time.get() / 60.0).round() as u64;
    if minutes < 120 {
        format!("{minutes} min")
    } else {
        format!("{} h {:02} min", minutes / 60, minutes % 60)
    }
}
