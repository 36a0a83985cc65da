//! A virtual unit's file.

use crate::quantity::{Ohms, Watts};
use crate::spec::Located;
use crate::spec::fields::{Field, list, named, shown};
use crate::spec::scalars::{
    Allowed, duration, located_name, number, quantity, share, temperature, with_unit, yes_no,
};
use crate::spec::virtual_unit::{
    ConditionEffect, Element, Fan, PositionWiring, Resistance, Thermal, Thermostat, VirtualUnit,
};

/// A whole virtual unit.
pub(in crate::spec) fn virtual_unit(field: Field<'_>) -> Option<VirtualUnit> {
    let fields = field.fields()?;
    let model = fields.required("virtual unit", located_name);
    let elements = fields.required("elements", named(element));
    let positions = fields.required("positions", named(wiring));
    let fan = fields.optional("fan", fan);
    let thermostat = fields.optional("thermostat", thermostat);
    let link_opens_at = fields.required("link opens at", temperature);
    let thermal = fields.required("thermal", thermal);
    let conditions = fields.or("conditions", Vec::new(), named(condition));
    let spread = fields.required(
        "spread",
        quantity::<crate::quantity::Ratio>(Allowed::Within(0.0, 0.5)),
    );
    let wired = match (&elements, &positions) {
        (Some(elements), Some(positions)) => all_wired(field, elements, positions),
        _ => None,
    };
    fields.finish()?;
    wired?;
    Some(VirtualUnit {
        model: model?,
        elements: elements?,
        positions: positions?,
        fan: fan?,
        thermostat: thermostat?,
        link_opens_at: link_opens_at?,
        thermal: thermal?,
        conditions: conditions?,
        spread: spread?,
    })
}

fn element(name: Located<String>, field: Field<'_>) -> Option<Element> {
    let fields = field.fields()?;
    let plain = fields.optional("plain", quantity::<Ohms>(Allowed::Positive));
    let ptc = fields.optional("ptc", ptc);
    let both = fields.finish().and(Some((plain?, ptc?)))?;
    let resistance = match both {
        (Some(ohms), None) => Resistance::Plain(ohms),
        (None, Some(ptc)) => ptc,
        _ => {
            return field.notes.error(
                field.key,
                format!("`{}` must be either plain or ptc", shown(&name)),
                "write `{plain: 500 ohm}`, or `{ptc: {...}}`",
            );
        }
    };
    Some(Element { name, resistance })
}

fn ptc(field: Field<'_>) -> Option<Resistance> {
    let fields = field.fields()?;
    let r_switch = fields.required("R at switch", quantity::<Ohms>(Allowed::Positive));
    let t_switch = fields.required("switch temperature", temperature);
    let steepness = fields.required(
        "steepness",
        with_unit(&["per K"], Allowed::Within(1e-3, 2.0)),
    );
    fields.finish()?;
    Some(Resistance::Ptc {
        r_switch: r_switch?,
        t_switch: t_switch?,
        steepness: steepness?,
    })
}

fn wiring(name: Located<String>, field: Field<'_>) -> Option<PositionWiring> {
    let fields = field.fields()?;
    let elements = fields.required("elements", list(located_name));
    let diode = fields.or("diode", false, yes_no);
    fields.finish()?;
    let elements = elements?;
    crate::spec::fields::all_different(&elements, field.notes)?;
    Some(PositionWiring {
        name,
        elements,
        diode: diode?,
    })
}

fn all_wired(whole: Field<'_>, elements: &[Element], positions: &[PositionWiring]) -> Option<()> {
    let mut good = Some(());
    for name in positions.iter().flat_map(|p| &p.elements) {
        if !elements.iter().any(|e| e.name.value == name.value) {
            let known: Vec<&str> = elements.iter().map(|e| e.name.as_str()).collect();
            good = whole.notes.error(
                &name.place,
                format!("there is no element `{}`", shown(name)),
                format!("known here: {}", known.join(", ")),
            );
        }
    }
    good
}

fn fan(field: Field<'_>) -> Option<Fan> {
    let fields = field.fields()?;
    let power = fields.required("power", quantity::<Watts>(Allowed::Positive));
    let cooling = fields.required("cooling factor", number(Allowed::Within(1.0, 1000.0)));
    fields.finish()?;
    Some(Fan {
        power: power?,
        cooling: cooling?,
    })
}

fn thermostat(field: Field<'_>) -> Option<Thermostat> {
    let fields = field.fields()?;
    let opens_at = fields.required("opens at", temperature);
    let closes_at = fields.required("closes at", temperature);
    let apart = match (opens_at, closes_at) {
        (Some(opens), Some(closes)) if closes >= opens => fields.wrong(
            "closes at",
            format!("it closes at {closes}, not below {opens}"),
            "a thermostat closes some kelvin below where it opens",
        ),
        _ => Some(()),
    };
    fields.finish()?;
    apart?;
    Some(Thermostat {
        opens_at: opens_at?,
        closes_at: closes_at?,
    })
}

fn thermal(field: Field<'_>) -> Option<Thermal> {
    let fields = field.fields()?;
    let capacity = || with_unit(&["J/K"], Allowed::Within(1e-3, 1e6));
    let loss = || with_unit(&["W/K"], Allowed::Within(1e-6, 1e6));
    let block_j_per_k = fields.required("block capacity", capacity());
    let block_w_per_k = fields.required("block loss", loss());
    let link_lag = fields.required("link follows", duration);
    let link_share = fields.required("link share", share);
    let enclosure_j_per_k = fields.required("enclosure capacity", capacity());
    let enclosure_w_per_k = fields.required("enclosure loss", loss());
    let enclosure_share = fields.required("enclosure share", share);
    fields.finish()?;
    Some(Thermal {
        block_j_per_k: block_j_per_k?,
        block_w_per_k: block_w_per_k?,
        link_lag: link_lag?,
        link_share: link_share?,
        enclosure_j_per_k: enclosure_j_per_k?,
        enclosure_w_per_k: enclosure_w_per_k?,
        enclosure_share: enclosure_share?,
    })
}

fn condition(name: Located<String>, field: Field<'_>) -> Option<ConditionEffect> {
    let fields = field.fields()?;
    let loss_factor = fields.required("loss factor", number(Allowed::Within(1e-3, 1e3)));
    fields.finish()?;
    Some(ConditionEffect {
        name,
        loss_factor: loss_factor?,
    })
}

#[cfg(test)]
mod tests {
    use crate::spec::wrong_files::Kind;

    #[test]
    fn each_wrong_value_of_a_virtual_unit_is_one_problem() {
        let (old, new) = (
            "fan: {",
            "thermostat: {opens at: 60 °C, closes at: 60 °C}\nfan: {",
        );
        let (value, problems) =
            Kind::VirtualUnit.load(Kind::VirtualUnit.changed(&[(old, new)]).as_bytes());
        assert!(!value && problems.len() == 1, "{problems:#?}");
        assert!(problems[0].message.contains("not below"), "{problems:#?}");
        assert_eq!(problems[0].place.text(), "60 °C");

        let spread = [("spread: 2 %", "spread: 2")];
        let (_, problems) = Kind::VirtualUnit.load(Kind::VirtualUnit.changed(&spread).as_bytes());
        assert!(
            problems[0].hint.as_deref() == Some("write `2 %`"),
            "{problems:#?}"
        );

        let unwired = [("{elements: [A]}", "{elements: [Z]}")];
        let (_, problems) = Kind::VirtualUnit.load(Kind::VirtualUnit.changed(&unwired).as_bytes());
        assert!(
            problems[0].message.contains("no element `Z`"),
            "{problems:#?}"
        );
    }

    #[test]
    fn heat_has_its_own_units() {
        const UNIT: &str = "virtual unit: X\nelements:\n  a: {plain: 500 ohm}\npositions:\n  on: {elements: [a]}\nlink opens at: 90 °C\nthermal:\n";
        let thermal = |capacity: &str| {
            format!(
                "{UNIT}  block capacity: {capacity}\n  block loss: 1 W/K\n  link follows: 5 s\n  link share: 90 %\n  \
                 enclosure capacity: 9 J/K\n  enclosure loss: 1 W/K\n  enclosure share: 5 %\nspread: 1 %\n"
            )
        };
        let said = |capacity: &str| {
            let (value, problems) = Kind::VirtualUnit.load(thermal(capacity).as_bytes());
            assert_eq!(value, problems.is_empty());
            problems
                .first()
                .map(|p| p.message.clone())
                .unwrap_or_default()
        };
        assert_eq!(said("30 J/K"), "");
        assert_eq!(said("3e1J/K"), "");
        assert!(said("30 W/K").contains("number in J/K"));
        assert!(said("30").contains("number in J/K"));
        assert!(said("inf J/K").contains("number in J/K"));
        assert!(said("-30 J/K").contains("out of range"));
    }
}
