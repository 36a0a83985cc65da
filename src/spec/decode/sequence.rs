//! The sequence file: the appliance, the roles, the conditions, the guards.

use crate::quantity::{Amps, Celsius, Hertz, Kelvins, Volts, Watts, at_least};
use crate::spec::Located;
use crate::spec::fields::{Field, Fields, all_different, list, located, named, some};
use crate::spec::scalars::{
    Allowed, choice, duration, located_name, quantity, share, span, temperature, text, yes_no,
};
use crate::spec::sequence::{
    AmbientEffect, Appliance, ApplianceKind, Condition, Facts, GuardLimits, HeatingElement,
    MeasuredAt, PlateEntry, ProtectionClass, RoleNeed, SelfHeating, Sequence, ThermalLink,
};
use crate::spec::yaml::NodeKind;

use super::driver::ROLE_KINDS;
use super::rules::rule;
use super::steps::step;

/// A whole sequence file.
pub(in crate::spec) fn sequence(field: Field<'_>) -> Option<Sequence> {
    let fields = field.fields()?;
    let title = fields.required("sequence", located_name);
    let edition = fields.required("edition", located_name);
    let appliance = fields.required("appliance", appliance);
    let roles = fields.required("roles", named(role));
    let conditions = fields.or("conditions", Vec::new(), named(condition));
    let guards = fields.or("guards", GuardLimits::default(), guards);
    let steps = fields.required("steps", some(step(EachAllowed::Yes)));
    let rules = fields.required("rules", some(rule));
    fields.finish()?;
    Some(Sequence {
        title: title?,
        edition: edition?,
        appliance: appliance?,
        roles: roles?,
        conditions: conditions?,
        guards: guards?,
        steps: steps?,
        rules: rules?,
    })
}

/// Whether an `each` block may stand among these steps; none stands in another.
#[derive(Clone, Copy, PartialEq, Eq)]
pub(super) enum EachAllowed {
    Yes,
    No,
}

const KINDS: &[(&str, ApplianceKind)] = &[
    ("heating", ApplianceKind::Heating),
    ("combined", ApplianceKind::Combined),
    ("motor-operated", ApplianceKind::MotorOperated),
];

const CLASSES: &[(&str, ProtectionClass)] = &[
    ("I", ProtectionClass::I),
    ("II", ProtectionClass::II),
    ("III", ProtectionClass::III),
];

const ELEMENTS: &[(&str, HeatingElement)] = &[
    ("ptc", HeatingElement::Ptc),
    ("resistor", HeatingElement::Resistor),
];

/// Ambient that an input is referred to (house default, the middle of IEC 60335-1
/// 5.7's "in doubt 23 +-2 °C", from memory).
const REFERENCE_AMBIENT_DEGC: f64 = 23.0;

fn appliance(field: Field<'_>) -> Option<Appliance> {
    let fields = field.fields()?;
    let model = fields.required("model", located_name);
    let kind = fields.required("kind", choice(KINDS));
    let protection_class = fields.required("protection class", choice(CLASSES));
    let highest_ambient = fields.required("highest ambient", temperature);
    let reference_ambient = fields.or(
        "reference ambient",
        Celsius::of(REFERENCE_AMBIENT_DEGC),
        temperature,
    );
    let supply_range = fields.optional("supply range", located(span::<Volts>(Allowed::Positive)));
    let positions = fields.required("positions", names);
    let plate = fields.required("plate", some(plate_entry));
    let link = fields.optional("thermal link", link);
    let facts = fields.required("facts", facts);
    fields.finish()?;
    Some(Appliance {
        model: model?,
        kind: kind?,
        protection_class: protection_class?,
        highest_ambient: highest_ambient?,
        reference_ambient: reference_ambient?,
        supply_range: supply_range?,
        positions: positions?,
        plate: plate?,
        link: link?,
        facts: facts?,
    })
}

/// A list of different names, at least one.
pub(super) fn names(field: Field<'_>) -> Option<Vec<Located<String>>> {
    let names = some(located_name)(field)?;
    all_different(&names, field.notes)?;
    Some(names)
}

fn plate_entry(field: Field<'_>) -> Option<PlateEntry> {
    let fields = field.fields()?;
    let position = fields.optional("position", located_name);
    let element = fields.optional("element", located_name);
    let voltage = fields.required("voltage", located(span::<Volts>(Allowed::Positive)));
    let frequency = fields.required("frequency", span::<Hertz>(Allowed::Positive));
    let power = fields.required("power", located(span::<Watts>(Allowed::Positive)));
    fields.finish()?;
    Some(PlateEntry {
        voltage: voltage?,
        frequency: frequency?,
        power: power?,
        position: position?,
        element: element?,
    })
}

fn link(field: Field<'_>) -> Option<ThermalLink> {
    let fields = field.fields()?;
    let tf = fields.required("Tf", located(temperature));
    let th = fields.optional("Th", temperature);
    let tm = fields.optional("Tm", temperature);
    let sits = fields.required("sits", text);
    let measured_at = fields.required("measured at", measured_at);
    let ambient_effect = fields.optional("ambient effect", ambient_effect);
    let ordered = match (&tf, th, tm) {
        (Some(tf), Some(Some(th)), _) if at_least(th.get(), tf.get()) => fields.wrong(
            "Th",
            format!("Th is {th}, not below Tf, {}", tf.value),
            "take both from the part's data sheet",
        ),
        (Some(tf), _, Some(Some(tm))) if at_least(tf.get(), tm.get()) => fields.wrong(
            "Tm",
            format!("Tm is {tm}, not above Tf, {}", tf.value),
            "take both from the part's data sheet",
        ),
        _ => Some(()),
    };
    fields.finish()?;
    ordered?;
    Some(ThermalLink {
        tf: tf?,
        th: th?,
        tm: tm?,
        sits: sits?,
        measured_at: measured_at?,
        ambient_effect: ambient_effect?,
    })
}

fn ambient_effect(field: Field<'_>) -> Option<AmbientEffect> {
    let fields = field.fields()?;
    let value = fields.required("value", share);
    let expanded = fields.required("U", share);
    let source = fields.required("source", text);
    fields.finish()?;
    Some(AmbientEffect {
        value: value?,
        expanded: expanded?,
        source: source?,
    })
}

fn self_heating(field: Field<'_>) -> Option<SelfHeating> {
    let fields = field.fields()?;
    let rise = fields.required("rise", quantity::<Kelvins>(Allowed::NotNegative));
    let at = fields.required("at", quantity::<Amps>(Allowed::Positive));
    fields.finish()?;
    Some(SelfHeating {
        rise: rise?,
        at: at?,
    })
}

fn outside_only(fields: Fields<'_>) -> Option<MeasuredAt> {
    let place = fields.required("outside only", text);
    let limit = fields.required("house limit", temperature);
    fields.finish()?;
    Some(MeasuredAt::OutsideOnly {
        place: place?,
        limit: limit?,
    })
}

fn measured_at(field: Field<'_>) -> Option<MeasuredAt> {
    if let NodeKind::Scalar(words) = &field.node.kind {
        return match words.as_str() {
            "link body" => Some(MeasuredAt::LinkBody),
            _ => field.wrong(
                "`measured at` is neither `link body` nor a mapping",
                "write `link body`, or `{place: ..., allowance: 3 K, allowance source: ..., self-heating: {rise: 7 K, at: 10 A}}`, or `{outside only: ..., house limit: 85 °C}`",
            ),
        };
    }
    let fields = field.fields()?;
    if fields.find("outside only").is_some() {
        return outside_only(fields);
    }
    let place = fields.required("place", text);
    let allowance = fields.optional("allowance", quantity::<Kelvins>(Allowed::NotNegative));
    let source = fields.optional("allowance source", text);
    let self_heating = fields.optional("self-heating", self_heating);
    let sourced = match (&allowance, &source) {
        (Some(Some(_)), Some(None)) => fields.wrong(
            "allowance",
            "an allowance without its source",
            "add `allowance source: ...`: who measured or stated it",
        ),
        _ => Some(()),
    };
    fields.finish()?;
    sourced?;
    Some(MeasuredAt::Elsewhere {
        place: place?,
        allowance: allowance?,
        source: source?,
        self_heating: self_heating?,
    })
}

fn facts(field: Field<'_>) -> Option<Facts> {
    let fields = field.fields()?;
    let element = fields.required("heating element", choice(ELEMENTS));
    let fan = fields.or("fan", false, yes_no);
    let thermostat = fields.or("thermostat", false, yes_no);
    let diode_in = fields.or("diode in position", Vec::new(), one_or_more);
    fields.finish()?;
    Some(Facts {
        element: element?,
        fan: fan?,
        thermostat: thermostat?,
        diode_in: diode_in?,
    })
}

/// One name, or a list of them.
fn one_or_more(field: Field<'_>) -> Option<Vec<Located<String>>> {
    match field.node.kind {
        NodeKind::Scalar(_) => located_name(field).map(|one| vec![one]),
        _ => names(field),
    }
}

fn role(name: Located<String>, field: Field<'_>) -> Option<RoleNeed> {
    if let NodeKind::Scalar(_) = field.node.kind {
        let kind = choice(ROLE_KINDS)(field)?;
        return Some(RoleNeed {
            name,
            kind,
            place: None,
        });
    }
    let fields = field.fields()?;
    let kind = fields.required("kind", choice(ROLE_KINDS));
    let place = fields.optional("at", text);
    fields.finish()?;
    Some(RoleNeed {
        name,
        kind: kind?,
        place: place?,
    })
}

fn condition(name: Located<String>, field: Field<'_>) -> Option<Condition> {
    let instruction = text(field)?;
    Some(Condition { name, instruction })
}

fn guards(field: Field<'_>) -> Option<GuardLimits> {
    let fields = field.fields()?;
    let body = fields.optional("body", located(temperature));
    let input_after = fields.optional("input after", duration);
    fields.finish()?;
    Some(GuardLimits {
        body: body?,
        input_after: input_after?,
    })
}

/// `at least` and `at most` of one kind: at least one of them, in their order.
pub(super) fn limits(
    fields: &Fields<'_>,
    whole: Field<'_>,
    (at_least, at_most): (Option<Option<f64>>, Option<Option<f64>>),
) -> Option<()> {
    match (at_least, at_most) {
        (Some(Some(low)), Some(Some(high))) if low > high => fields.wrong(
            "at most",
            "`at most` is below `at least`",
            "write the larger one as `at most`",
        ),
        (Some(None), Some(None)) => whole.notes.error(
            whole.key,
            "no limit is stated",
            "add `at least: ...`, `at most: ...`, or both",
        ),
        _ => Some(()),
    }
}

/// The names of an axis; an axis that is left out is empty.
pub(super) fn axis(fields: &Fields<'_>, key: &'static str) -> Option<Vec<Located<String>>> {
    let names = fields.or(key, Vec::new(), list(located_name))?;
    Some(names)
}

#[cfg(test)]
mod tests {
    use crate::quantity::{Celsius, Kelvins, Seconds, Volts, Watts};
    use crate::spec::load_sequence;
    use crate::spec::sequence::{
        AnswerKind, CriterionKind, Decision, MeasuredAt, RoleKind, RuleKind, StepAction,
    };
    use crate::spec::shipped::SEQUENCES;
    use crate::spec::wrong_files::{Kind, wrong};

    #[test]
    fn the_dryer_is_read_as_it_is_written() {
        let sequence = load_sequence("dryer", SEQUENCES[0].text.as_bytes());
        let sequence = sequence.value.expect("a sequence");
        assert_eq!(sequence.edition.value, "1");
        let appliance = &sequence.appliance;
        assert_eq!(appliance.highest_ambient, Celsius::of(35.0));
        assert_eq!(appliance.positions[1].value, "high");
        assert_eq!(appliance.plate[0].power.low, Watts::of(4.5));
        assert_eq!(appliance.plate[0].voltage.high, Volts::of(240.0));
        let link = appliance.link.as_ref().expect("a link");
        assert_eq!(link.tf.value, Celsius::of(121.0));
        assert_eq!(link.measured_at, MeasuredAt::LinkBody);
        assert!(appliance.facts.fan && !appliance.facts.thermostat);
        assert_eq!(sequence.roles[1].kind, RoleKind::PowerMeter);
        assert_eq!(sequence.guards.input_after, Some(Seconds::of(300.0)));
        let StepAction::Each(each) = &sequence.steps[3].action else {
            panic!("{:?}", sequence.steps[3]);
        };
        assert_eq!(each.conditions.len() * each.positions.len(), 4);
        let StepAction::Soak(soak) = &each.steps[2].action else {
            panic!("{:?}", each.steps[2]);
        };
        assert_eq!(soak.until.temperature_change, Some(Kelvins::of(3.0)));
        let window = Seconds::of(300.0);
        assert_eq!(soak.until.kind, CriterionKind::Slope { window });
        assert_eq!(sequence.rules[0].kind.value, RuleKind::PlatePower);
        assert_eq!(sequence.rules[1].decision, Decision::FourOutcomes);
        assert_eq!(sequence.rules[4].kind.place.text(), "inrush");
    }

    #[test]
    fn house_defaults_fill_what_is_left_out() {
        let text = Kind::Sequence.changed(&[("            at least: 10 min\n", "")]);
        let sequence = load_sequence("dryer", text.as_bytes()).value.expect("one");
        let StepAction::Acclimatise(waiting) = &sequence.steps[2].action else {
            panic!("{:?}", sequence.steps[2]);
        };
        assert_eq!(waiting.within, Kelvins::of(3.0));
        let StepAction::Each(each) = &sequence.steps[3].action else {
            panic!("{:?}", sequence.steps[3]);
        };
        let StepAction::Soak(soak) = &each.steps[2].action else {
            panic!("{:?}", each.steps[2]);
        };
        assert_eq!(soak.at_least, Seconds::of(600.0));
    }

    #[test]
    fn the_other_forms_are_read() {
        let text = Kind::Sequence.changed(&[
            (
                "measured at: link body",
                "measured at: {place: outlet, allowance: 3 K, allowance source: trial of 4 units}",
            ),
            ("answer: yes or no", "answer: {choice: [no, perhaps]}"),
            ("fan: yes", "fan: true\n    diode in position: low"),
            (
                "decision: four outcomes",
                "decision: {guarded: 0.83}\n    position: low",
            ),
            ("- acclimatise:", "- instruct: Wait.\n  - run in: {for: 5 min, every: 1 s}\n  - de-energise\n  - acclimatise:"),
        ]);
        let loaded = load_sequence("file", text.as_bytes());
        let sequence = loaded
            .value
            .unwrap_or_else(|| panic!("{:#?}", loaded.problems));
        let link = sequence.appliance.link.expect("a link");
        assert!(matches!(
            link.measured_at,
            MeasuredAt::Elsewhere {
                allowance: Some(_),
                ..
            }
        ));
        let StepAction::Ask(question) = &sequence.steps[0].action else {
            panic!("{:?}", sequence.steps[0]);
        };
        assert!(matches!(&question.answer, AnswerKind::Choice(c) if c.len() == 2));
        assert_eq!(sequence.appliance.facts.diode_in[0].value, "low");
        assert_eq!(
            sequence.rules[0].decision,
            Decision::Guarded { ratio: 0.83 }
        );
        assert!(matches!(sequence.steps[4].action, StepAction::Deenergise));
    }

    #[test]
    fn each_wrong_value_of_the_appliance_is_one_problem() {
        Kind::Sequence.check(&[
            wrong(
                "edition: \"1\"\n",
                "",
                "2:1",
                "the sequence lacks `edition`",
                "add `edition",
            ),
            wrong(
                "edition: \"1\"",
                "editoin: \"1\"",
                "3:1",
                "unknown key `editoin`",
                "mean `edition`",
            ),
            wrong(
                "edition: \"1\"",
                "edition: \"1\"\ncolour: red",
                "4:1",
                "unknown key",
                "known here: sequence",
            ),
            wrong(
                "kind: combined",
                "kind: combnied",
                "7:9",
                "can't be `combnied`",
                "mean `combined`",
            ),
            wrong(
                "class: II",
                "class: 2",
                "8:21",
                "can't be `2`",
                "one of: I, II, III",
            ),
            wrong(
                "power: 9 W",
                "power: 9",
                "13:74",
                "`9` has no unit",
                "write `9 W`",
            ),
            wrong(
                "power: 9 W",
                "power: 9 V",
                "13:74",
                "is a voltage, not a power",
                "`9 W`",
            ),
            wrong(
                "power: 9 W",
                "power: .nan",
                "13:74",
                "not a finite number",
                "`9 W`",
            ),
            wrong(
                "power: 9 W",
                "power: .inf W",
                "13:74",
                "not a finite number",
                "`9 W`",
            ),
            wrong(
                "power: 9 W",
                "power: 1e999 W",
                "13:74",
                "not a finite number",
                "`9 W`",
            ),
            wrong(
                "power: 9 W",
                "power: 1e12 W",
                "13:74",
                "beyond anything",
                "unit",
            ),
            wrong("power: 9 W", "power: -9 W", "13:74", "is negative", "check"),
            wrong("power: 9 W", "power: 0 W", "13:74", "above zero", "check"),
            wrong(
                "power: 9 W",
                "power: 09 W",
                "13:74",
                "zero too many",
                "`9 W`",
            ),
            wrong("power: 9 W", "power: 0x9 W", "13:74", "not a unit", "`9 W`"),
            wrong(
                "power: 9 W",
                "power: nine",
                "13:74",
                "does not start with a number",
                "`9 W`",
            ),
            wrong(
                "power: 9 W",
                "power: 9 W to 8 W",
                "13:74",
                "begins above its end",
                "`8 W to 9 W`",
            ),
            wrong("power: 9 W", "power: 8-9 W", "13:74", "as a range", "to"),
            wrong("power: 9 W", "power: [9 W]", "13:74", "not a list", "`9 W`"),
            wrong("power: 9 W", "power: ", "13:67", "has no value", "`9 W`"),
            wrong(
                "Th: 100 °C",
                "Th: 121 °C",
                "16:9",
                "not below Tf",
                "data sheet",
            ),
            wrong(
                "Tm: 175 °C",
                "Tm: 121 °C",
                "17:9",
                "not above Tf",
                "data sheet",
            ),
            wrong(
                "Tf: 121 °C",
                "Tf: 121 K",
                "15:9",
                "difference, not a temperature",
                "°C",
            ),
            wrong("35 °C", "35000 °C", "9:20", "out of range", "right unit"),
            wrong(
                "[low, high]  ",
                "[low, low]  ",
                "10:20",
                "`low` stands twice",
                "one of the two",
            ),
            wrong(
                "[low, high]  ",
                "low  ",
                "10:14",
                "must be a list",
                "`[low]`",
            ),
            wrong("[low, high]  ", "[]  ", "10:14", "is empty", "at least one"),
            wrong(
                "fan: yes",
                "fan: perhaps",
                "22:10",
                "neither yes nor no",
                "`yes` or `no`",
            ),
            wrong(
                "at: link body",
                "at: outlet",
                "19:18",
                "neither `link body`",
                "place",
            ),
            wrong(
                "at: link body",
                "at: {place: outlet, allowance: 3 K}",
                "19:45",
                "without its source",
                "source",
            ),
            wrong(
                "meter: power meter",
                "meter: power",
                "26:10",
                "can't be `power`",
                "one of",
            ),
            wrong(
                "dry: Take",
                "\" dry\": Take",
                "34:3",
                "begins or ends with a blank",
                "printable",
            ),
            wrong(
                "Nordlicht CD-9",
                "\"CD\\e[31m9\"",
                "6:10",
                "unprintable",
                "printable",
            ),
            wrong(
                "body: 115 °C",
                "bdy: 115 °C",
                "37:3",
                "unknown key `bdy`",
                "mean `body`",
            ),
        ]);
    }

    #[test]
    fn every_problem_of_meaning_is_reported_at_once() {
        let text = Kind::Sequence.changed(&[
            ("edition: \"1\"\n", ""),
            ("kind: combined", "kind: kettle"),
            ("4.5 W", "4.5"),
            ("Th: 100 °C", "Th: .nan"),
            ("at least: 10 min", "at least: -10 min"),
            ("weight: required", "wieght: required"),
            ("at most: 0.5 A", "at most: 0.5 V"),
        ]);
        let (value, problems) = Kind::Sequence.load(text.as_bytes());
        assert!(!value);
        assert_eq!(problems.len(), 7, "{problems:#?}");
        let lines: Vec<usize> = problems.iter().map(|p| p.place.line_column().0).collect();
        assert!(lines.is_sorted(), "{lines:?}");
    }
}
