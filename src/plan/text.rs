//! A plan for people, as `check` prints it, at most 80 columns wide.

use super::types::{Action, Plan, PlannedInstrument, PlannedRole, PlannedRule, PlannedStep};
use super::words::{answers, between, criterion, degrees, measured, span, time};
use crate::quantity::{Dimension, Volts, Watts, shortest};
use crate::spec::plate;
use crate::spec::sequence::{Decision, RuleKind, RuleWeight};

use super::guards::rise_is_usual;
use super::reference::rated_points;

/// Widest line.
const WIDTH: usize = 80;

/// Columns before the value of a named line.
const NAME: usize = 15;

/// Columns before a step's detail.
const STEP: usize = 19;

impl Plan {
    /// The plan in lines of at most 80 columns: what, with what, guards, steps, rules,
    /// how long.
    pub fn lines_of_text(&self) -> Vec<String> {
        let parts = [
            self.heading(),
            self.instrument_lines(),
            self.guard_lines(),
            self.step_lines(),
            self.rules
                .iter()
                .flat_map(|rule| self.rule_lines(rule))
                .collect(),
            self.duration_lines(),
        ];
        let titles = [
            "",
            "instruments",
            "guards while energised",
            "steps",
            "rules",
            "",
        ];
        let mut lines = Vec::new();
        for (title, part) in titles.into_iter().zip(parts) {
            if !lines.is_empty() {
                lines.push(String::new());
            }
            if !title.is_empty() {
                lines.push(title.to_owned());
            }
            lines.extend(part);
        }
        lines
    }

    fn heading(&self) -> Vec<String> {
        let appliance = &self.appliance;
        let mut lines = wrapped("", 4, &format!("{}, edition {}", self.title, self.edition));
        let facts = [
            (appliance.fan, "fan"),
            (appliance.thermostat, "thermostat"),
            (!appliance.diode_in.is_empty(), "series diode"),
        ];
        let facts: String = facts
            .into_iter()
            .filter(|(is, _)| *is)
            .map(|(_, what)| format!(", {what}"))
            .collect();
        lines.extend(named(
            "appliance",
            &format!(
                "{}: {}, class {:?}{facts}, used up to {}",
                appliance.model,
                super::words::kind(appliance.kind),
                appliance.protection_class,
                appliance.highest_ambient
            ),
        ));
        for entry in &appliance.plate {
            let element = entry
                .element
                .as_ref()
                .map_or_else(String::new, |e| format!(", element {e}"));
            lines.extend(named(
                "plate",
                &format!(
                    "{}{element}: {}, {}, {}",
                    entry.position,
                    span(entry.power),
                    span(entry.voltage),
                    span(entry.frequency)
                ),
            ));
        }
        if let Some(link) = &appliance.link {
            lines.extend(named(
                "thermal link",
                &format!(
                    "Tf {}, Th {}, Tm {}; {}; {}",
                    link.tf,
                    degrees(link.th),
                    degrees(link.tm),
                    link.sits,
                    measured(&link.measured_at)
                ),
            ));
        }
        lines.extend(named(
            "bench",
            &format!(
                "{}, {}, rated current {}",
                self.bench, self.bay.name, self.bay.rated_current
            ),
        ));
        lines
    }

    fn instrument_lines(&self) -> Vec<String> {
        self.instruments
            .iter()
            .enumerate()
            .flat_map(|(n, instrument)| named(&instrument.name, &self.serves(n, instrument)))
            .collect()
    }

    /// The roles that an instrument fills, and who it is.
    fn serves(&self, number: usize, instrument: &PlannedInstrument) -> String {
        let filled = |role: &&PlannedRole| role.instrument == number;
        let roles: Vec<String> = self
            .bay
            .roles
            .iter()
            .filter(filled)
            .map(connected)
            .collect();
        let certificate = instrument
            .certificate
            .as_ref()
            .map_or_else(String::new, |c| format!("; certificate: {c}"));
        let due = instrument
            .due
            .map_or_else(String::new, |due| format!("; calibration due {due}"));
        format!(
            "fills {}; {} on {}, driver {}{certificate}{due}",
            roles.join(", "),
            instrument.identity,
            self.lines[instrument.line].name,
            instrument.driver.name
        )
    }

    fn guard_lines(&self) -> Vec<String> {
        let guards = &self.guards;
        let mut lines = Vec::new();
        if let Some(body) = guards.body {
            let of = match &self.appliance.link {
                Some(link) if link.opens_from <= body => "Tf - 10 K (house default)",
                _ => "as the sequence states",
            };
            lines.extend(named("body", &format!("{body}, {of}")));
        }
        lines.extend(named(
            "current",
            &format!("{}, the bay's rating", guards.current),
        ));
        let mut told: Vec<String> = Vec::new();
        for (cell, input) in self.cells.iter().zip(&guards.input) {
            let line = format!("{}: {}", cell.position, digits(*input));
            if !told.contains(&line) {
                told.push(line);
            }
        }
        if !told.is_empty() {
            lines.extend(named(
                "input",
                &format!(
                    "{}; from {} after energising on, 1.3 times the upper limit (house default)",
                    told.join(", "),
                    guards.input_after
                ),
            ));
        }
        lines.extend(self.silence_lines());
        let whose = if rise_is_usual(guards) {
            "house default"
        } else {
            "the sequence's"
        };
        lines.extend(named(
            "sensor",
            &format!(
                "the body rises by {} within {} ({whose})",
                guards.least_rise, guards.rise_within
            ),
        ));
        lines
    }

    fn silence_lines(&self) -> Vec<String> {
        let mut by_limit: Vec<(String, Vec<&str>)> = Vec::new();
        for (role, silence) in self.bay.roles.iter().zip(&self.guards.silence) {
            let limit = silence.to_string();
            match by_limit.iter_mut().find(|(known, _)| *known == limit) {
                Some((_, roles)) => roles.push(&role.name),
                None => by_limit.push((limit, vec![&role.name])),
            }
        }
        by_limit
            .iter()
            .flat_map(|(limit, roles)| {
                named(
                    "silence",
                    &format!(
                        "{limit} beyond the polling interval (house default): {}",
                        roles.join(", ")
                    ),
                )
            })
            .collect()
    }

    fn step_lines(&self) -> Vec<String> {
        let mut lines = Vec::new();
        let mut cell = None;
        for step in &self.steps {
            if step.cell != cell {
                cell = step.cell;
                let words = cell.map(|n| self.cells[n].words());
                lines.extend(words.map_or_else(Vec::new, |words| wrapped("  -- ", 5, &words)));
            }
            lines.extend(step_line(step));
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
            Decision::SimpleUpTo { largest } => {
                format!(
                    "simple with U up to {} {}",
                    shortest(largest),
                    unit(rule.kind.dimension())
                )
            }
            Decision::Guarded { ratio } => format!("guarded by {ratio} U"),
            Decision::FourOutcomes => "four outcomes".to_owned(),
        };
        let of: String = [&rule.position, &rule.condition]
            .into_iter()
            .flatten()
            .map(|name| format!(", {name}"))
            .collect();
        let mut lines = wrapped(
            "  ",
            4,
            &format!("{}{of}; {weight}, {decision}", self.rule_words(rule)),
        );
        if rule.kind == RuleKind::PlatePower {
            let bands = self.plate_bands(rule.position.as_deref());
            lines.extend(bands.iter().flat_map(|band| wrapped("    ", 6, band)));
        }
        lines.extend(wrapped("    ", 6, &format!("source: {}", rule.source)));
        lines
    }

    fn rule_words(&self, rule: &PlannedRule) -> String {
        let link = self.appliance.link.as_ref();
        let ambient = self.appliance.highest_ambient;
        match &rule.kind {
            RuleKind::PlatePower => "power within the plate's band".to_owned(),
            RuleKind::PowerLimits { at_least, at_most } => {
                format!("power {}", between(*at_least, *at_most))
            }
            RuleKind::LinkHolding => {
                let th = degrees(link.and_then(|link| link.th));
                format!("link's body in {ambient} ambient at most Th, {th}")
            }
            RuleKind::LinkOpening => {
                let from = degrees(link.map(|link| link.opens_from));
                format!("link's body in {ambient} ambient at most Tf - 10 K, {from}")
            }
            RuleKind::LinkHouse { below_tf } => format!(
                "link's body in {ambient} ambient at most Th and at most Tf - {below_tf}, house limit"
            ),
            RuleKind::LinkMaximum => {
                let tm = degrees(link.and_then(|link| link.tm));
                format!("link's body at most Tm, {tm}, for 10 min after it opened")
            }
            RuleKind::Inrush { at_most } => format!("inrush at most {at_most}"),
            RuleKind::MomentaryInrush { at_most } => {
                format!("momentary inrush at most {at_most}")
            }
            RuleKind::HarmonicsClassA => "harmonics within class A".to_owned(),
            RuleKind::VoltageChange {
                dmax,
                dc,
                time_above,
            } => {
                let limits = [
                    dmax.map(|limit| format!("dmax at most {limit}")),
                    dc.map(|limit| format!("dc at most {limit}")),
                    time_above.map(|limit| format!("above 3.3 % for at most {limit}")),
                ];
                let limits: Vec<String> = limits.into_iter().flatten().collect();
                format!("voltage change: {}", limits.join(", "))
            }
            RuleKind::PositionOrder => format!(
                "input rises in the order {}",
                self.appliance.positions.join(", ")
            ),
            RuleKind::TemperatureRise { role, at_most } => {
                format!("{role} at most {at_most} above ambient")
            }
        }
    }

    /// The band of each voltage at which the plate is judged.
    fn plate_bands(&self, position: Option<&str>) -> Vec<String> {
        let band = |position: &str, volts: Volts, power| {
            let band = plate::limits(self.appliance.kind, power);
            format!(
                "{position}, {} at {volts}: {}",
                span(power),
                between(band.at_least, Some(band.at_most))
            )
        };
        self.appliance
            .plate
            .iter()
            .filter(|entry| entry.element.is_none())
            .filter(|entry| position.is_none_or(|p| p == entry.position))
            .flat_map(|entry| {
                rated_points(entry, self.appliance.fan)
                    .into_iter()
                    .map(|rated| band(&entry.position, rated.voltage, rated.rated))
                    .collect::<Vec<_>>()
            })
            .collect()
    }

    fn duration_lines(&self) -> Vec<String> {
        wrapped(
            "",
            4,
            &format!(
                "expected about {}, an estimate; at the longest {}; the operator's own time comes on top",
                time(self.expected),
                time(self.longest())
            ),
        )
    }
}

/// A role with its channel, the place that it measures and how its sensor is held.
fn connected(role: &PlannedRole) -> String {
    let channel = role.channel.map(|channel| format!("channel {channel}"));
    let place = role.place.as_ref().map(|place| format!("at {place}"));
    let said: Vec<String> = [channel, place, role.connection.attachment.clone()]
        .into_iter()
        .flatten()
        .collect();
    if said.is_empty() {
        return role.name.clone();
    }
    format!("{} ({})", role.name, said.join(", "))
}

/// The unit that a rule's U is stated in.
fn unit(dimension: Option<Dimension>) -> &'static str {
    match dimension {
        Some(Dimension::Power) => "W",
        Some(Dimension::Current) => "A",
        Some(Dimension::TemperatureDifference) => "K",
        _ => "",
    }
}

fn digits(power: Watts) -> String {
    format!("{power:.2}")
}

fn step_line(step: &PlannedStep) -> Vec<String> {
    let head = format!("  {:>3} {:<12} ", step.number, step.action.verb());
    wrapped(&head, STEP, &detail(&step.action))
}

fn detail(action: &Action) -> String {
    match action {
        Action::Instruct(text) => text.clone(),
        Action::SetCondition {
            condition,
            instruction,
        } => format!("{condition}: {instruction}"),
        Action::Ask(question) => format!("{} ({})", question.text, answers(question)),
        Action::Acclimatise(waiting) | Action::Rest(waiting) => format!(
            "until the body is within {} of ambient, at most {}, every {}",
            waiting.within, waiting.at_most, waiting.every
        ),
        Action::SetSupply(point) => format!("{}, {}", point.voltage, point.frequency),
        Action::SetPosition {
            position,
            by_switch,
            ..
        } => {
            let by = if *by_switch { "switch" } else { "operator" };
            format!("{position}, by the {by}")
        }
        Action::Energise | Action::Deenergise => String::new(),
        Action::Inrush(timed) | Action::Measure(timed) | Action::RunIn(timed) => {
            let waveform = if timed.waveform {
                ", with a waveform"
            } else {
                ""
            };
            format!("for {}, every {}{waveform}", timed.length, timed.every)
        }
        Action::Soak {
            at_least,
            at_most,
            every,
            until,
            early_finish,
        } => format!(
            "{at_least} to {at_most}, every {every}, until {}{}",
            criterion(until),
            if *early_finish {
                "; may finish early where two predictions agree (the result is then extrapolated)"
            } else {
                ""
            }
        ),
        Action::Abnormal {
            fault,
            length,
            every,
            body,
        } => format!("{fault}: for {length}, every {every}, trips at {body}; attended"),
    }
}

fn named(name: &str, text: &str) -> Vec<String> {
    wrapped(&format!("  {name:<12} "), NAME, text)
}

/// Words behind a head, further lines indented. A word that is longer than a line is
/// cut; a head that is too long has a line to itself.
fn wrapped(head: &str, indent: usize, text: &str) -> Vec<String> {
    let mut lines = Vec::new();
    let mut line = String::new();
    let mut length = 0;
    let mut is_empty = true;
    let push = |line: &mut String, lines: &mut Vec<String>| {
        lines.push(line.trim_end().to_owned());
        *line = " ".repeat(indent);
    };
    for c in head.chars() {
        if length == WIDTH {
            push(&mut line, &mut lines);
            length = indent;
        }
        line.push(c);
        length += 1;
    }
    for word in bound(text) {
        let letters = word.chars().count();
        let gap = usize::from(!is_empty);
        if length + gap + letters > WIDTH && (!is_empty || length > indent) {
            push(&mut line, &mut lines);
            (length, is_empty) = (indent, true);
        }
        if !is_empty {
            line.push(' ');
            length += 1;
        }
        for c in word.chars() {
            if length == WIDTH {
                push(&mut line, &mut lines);
                length = indent;
            }
            line.push(c);
            length += 1;
        }
        is_empty = false;
    }
    lines.push(line.trim_end().to_owned());
    lines
}

/// The words of a text; a number stays with the unit behind it.
fn bound(text: &str) -> Vec<String> {
    let mut words: Vec<String> = Vec::new();
    let mut after_number = false;
    for word in text.split_whitespace() {
        match words.last_mut() {
            Some(number) if after_number => *number = format!("{number} {word}"),
            _ => words.push(word.to_owned()),
        }
        after_number = !after_number && word.parse::<f64>().is_ok();
    }
    words
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_number_and_its_unit_stay_on_one_line() {
        let text = format!("{} 2 % per hour", "a".repeat(77));
        assert_eq!(wrapped("", 2, &text)[1], "  2 % per hour");
    }

    #[test]
    fn lines_break_between_words_and_are_indented() {
        let text = "word ".repeat(30);
        let lines = wrapped("  name ", 7, &text);
        assert_eq!(lines.len(), 3);
        assert!(lines[0].starts_with("  name word"));
        assert!(lines[1].starts_with("       word"));
        let words: usize = lines.iter().map(|line| line.matches("word").count()).sum();
        assert_eq!(words, 30);
        assert!(lines.iter().all(|line| line.chars().count() <= WIDTH));
    }

    #[test]
    fn a_word_or_a_head_longer_than_a_line_is_cut_and_nothing_is_lost() {
        let word = "ä".repeat(200);
        for lines in [wrapped("  ", 4, &word), wrapped(&word, 4, "x")] {
            assert!(lines.iter().all(|line| line.chars().count() <= WIDTH));
            let letters: usize = lines.iter().map(|line| line.matches('ä').count()).sum();
            assert_eq!(letters, 200);
        }
    }

    #[test]
    fn a_line_of_just_eighty_columns_stays_whole() {
        assert_eq!(wrapped("", 4, &format!("{} b", "a".repeat(78))).len(), 1);
        assert_eq!(wrapped("", 4, &format!("{} b", "a".repeat(79))).len(), 2);
    }
}
