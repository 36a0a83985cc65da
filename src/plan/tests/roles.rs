//! Roles that a sequence must have.

use super::*;

const BODY: &str = "  body: temperature             # on the link's body\n";
const AMBIENT: &str = "  ambient: temperature          # the bay's own\n";

#[test]
fn without_a_supply_there_is_no_energy_path() {
    let text = changed(dryer(), "  supply: supply\n", "");
    cross(&text, BENCH)
        .refuses(
            TITLE,
            "kind `supply`: without it there is no energy path",
            "`supply: supply`",
        )
        .only();
}

#[test]
fn without_a_meter_nothing_can_be_judged() {
    let text = changed(dryer(), "  meter: power meter\n", "");
    cross(&text, BENCH)
        .refuses(
            TITLE,
            "no role of the kind `power meter`",
            "`meter: power meter`",
        )
        .only();
}

#[test]
fn a_second_supply_meter_or_switch_is_refused() {
    for (kind, name) in [
        ("supply", "supply"),
        ("power meter", "meter"),
        ("position switch", "switch"),
    ] {
        let roles = format!("roles:\n  other: {kind}\n");
        let text = changed(dryer(), "roles:\n", &roles);
        let role = format!("    roles:\n      other: {{instrument: {name}}}\n");
        let bench = changed(BENCH, "    roles:\n", &role);
        let second = format!("a second role of the kind `{kind}`");
        let resolved = cross(&text, &bench);
        assert_eq!(
            resolved
                .problems
                .iter()
                .filter(|p| p.message == second)
                .count(),
            1
        );
        resolved.refuses(name, &second, "take one of the two out");
    }
}

#[test]
fn a_body_is_needed_where_a_link_a_guard_a_wait_or_a_rule_needs_it() {
    cross(&changed(dryer(), BODY, ""), BENCH)
        .refuses(
            "121 °C",
            "no role `body`, which the thermal link's guard needs",
            "`body: temperature`",
        )
        .only();
    let flat = changed(FLAT, "body: temperature, ", "");
    cross(&flat, BENCH)
        .refuses(
            "70 °C",
            "no role `body`, which this guard needs",
            "`body: temperature`",
        )
        .only();
    let flat = changed(&flat, "guards: {body: 70 °C}\n", "");
    cross(&flat, BENCH)
        .refuses(
            "acclimatise",
            "no role `body`, which this wait needs",
            "`body: temperature`",
        )
        .only();
}

#[test]
fn an_ambient_is_needed_where_a_wait_a_soak_or_a_rule_needs_it() {
    cross(&changed(dryer(), AMBIENT, ""), BENCH)
        .refuses(
            "acclimatise",
            "no role `ambient`, which this wait needs",
            "`ambient: temperature`",
        )
        .only();
    let soak = changed(&still(), "power change: 2 %", "temperature change: 3 K");
    cross(&soak, BENCH)
        .refuses(
            "soak",
            "no role `body`, which this soak's criterion needs",
            "`body: temperature`",
        )
        .refuses(
            "soak",
            "no role `ambient`, which this soak's criterion needs",
            "temperature",
        );
    let rise = format!(
        "{}  - temperature: {{role: body, rise at most: 50 K}}\n",
        still()
    );
    cross(&rise, BENCH).refuses(
        "temperature",
        "no role `ambient`, which this rule needs",
        "temperature",
    );
    let abnormal = changed(
        &still(),
        "  - de-energise\n",
        "  - abnormal: {fault: fan held, for: 5 min, every: 1 s, body: 90 °C}\n",
    );
    cross(&abnormal, BENCH).refuses(
        "abnormal",
        "no role `body`, which this step's own trip temperature needs",
        "temperature",
    );
}

/// The flat sequence with nothing that needs a temperature.
fn still() -> String {
    let text = changed(FLAT, ", body: temperature, ambient: temperature}", "}");
    let text = changed(&text, "guards: {body: 70 °C}\n", "");
    let text = changed(
        &text,
        "  - acclimatise: {at most: 60 min, every: 5 s}\n",
        "",
    );
    changed(
        &text,
        "  - rest: {at most: 60 min, every: 5 s}\n",
        "  - de-energise\n",
    )
}

#[test]
fn where_nothing_needs_them_body_and_ambient_may_be_absent() {
    let plan = planned(&still());
    assert_eq!(plan.guards.body, None);
    assert_eq!(plan.bay.roles.len(), 2);
}

#[test]
fn body_and_ambient_must_be_temperatures() {
    let text = changed(dryer(), "  body: temperature", "  body: power meter");
    cross(&text, BENCH).refuses("body", "must be a temperature", "write `body: temperature`");
}

#[test]
fn a_body_without_link_and_guard_has_no_trip_limit_and_is_refused() {
    let text = changed(FLAT, "guards: {body: 70 °C}\n", "");
    cross(&text, BENCH)
        .refuses(
            "body",
            "neither a thermal link nor a guard",
            "below `guards:`",
        )
        .only();
}
