//! The sequence file: the appliance, the roles, the conditions, the guards.

use crate::quantity::{Hertz, Kelvins, Volts, Watts, at_least};
use crate::spec::Located;
use crate::spec::fields::{Field, Fields, all_different, list, located, named, some};
use crate::spec::scalars::{
    Allowed, choice, duration, located_name, quantity, span, temperature, text, yes_no,
};
use crate::spec::sequence::{
    Appliance, ApplianceKind, Condition, Facts, GuardLimits, HeatingElement, MeasuredAt,
    PlateEntry, ProtectionClass, RoleNeed, Sequence, ThermalLink,
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

fn appliance(field: Field<'_>) -> Option<Appliance> {
    let fields = field.fields()?;
    let model = fields.required("model", located_name);
    let kind = fields.required("kind", choice(KINDS));
    let protection_class = fields.required("protection class", choice(CLASSES));
    let highest_ambient = fields.required("highest ambient", temperature);
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
    })
}

fn measured_at(field: Field<'_>) -> Option<MeasuredAt> {
    if let NodeKind::Scalar(words) = &field.node.kind {
        return match words.as_str() {
            "link body" => Some(MeasuredAt::LinkBody),
            _ => field.wrong(
                "`measured at` is neither `link body` nor a mapping",
                "write `link body`, or `{place: ..., allowance: 3 K, allowance source: ...}`",
            ),
        };
    }
    let fields = field.fields()?;
    let place = fields.required("place", text);
    let allowance = fields.optional("allowance", quantity::<Kelvins>(Allowed::NotNegative));
    let source = fields.optional("allowance source", text);
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
    let kind = choice(ROLE_KINDS)(field)?;
    Some(RoleNeed { name, kind })
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
