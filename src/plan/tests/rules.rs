//! Rules that nothing feeds.

use super::*;
use crate::spec::sequence::CyclingRule;

const INRUSH: &str = "        - inrush: {for: 2 min, every: 100 ms}\n";

#[test]
fn a_rule_for_a_role_that_is_no_temperature_is_pointed_at() {
    let text = changed(dryer(), "role: enclosure", "role: enclosur");
    cross(&text, BENCH)
        .refuses(
            "temperature",
            "no temperature role `enclosur`",
            "did you mean `enclosure`",
        )
        .only();
    let text = changed(dryer(), "role: enclosure", "role: meter");
    cross(&text, BENCH)
        .refuses(
            "temperature",
            "no temperature role `meter`",
            "known: body, ambient, enclosure",
        )
        .only();
}

#[test]
fn a_link_rule_without_a_link_is_refused() {
    let rules = format!("{FLAT}  - thermal link: holding\n  - thermal link: earliest opening\n");
    let resolved = cross(&rules, BENCH);
    let found = resolved.problems.iter().filter(|p| {
        p.place.text() == "thermal link" && p.message == "the appliance states no thermal link"
    });
    assert_eq!(found.count(), 2);
    assert_eq!(resolved.problems.len(), 2);
}

#[test]
fn holding_without_th_is_refused_and_earliest_opening_is_not() {
    let th = "    Th: 100 °C                  # from the part's data sheet\n";
    let text = changed(dryer(), th, "");
    cross(&text, BENCH)
        .refuses("121 °C", "states no Th", "data sheet")
        .only();
    cross(&changed(&text, "  - thermal link: holding\n", ""), BENCH).is_clean();
}

#[test]
fn a_link_measured_elsewhere_without_an_allowance_is_warned_of() {
    let text = changed(
        dryer(),
        "measured at: link body",
        "measured at: {place: the outlet, self-heating: {rise: 7 K, at: 10 A}}",
    );
    cross(&text, BENCH)
        .warns("121 °C", "measured at the outlet", "add `allowance:`")
        .only();
    let allowance =
        "measured at: {place: the outlet, allowance: 5 K, allowance source: a trial of ours}";
    let text = changed(dryer(), "measured at: link body", allowance);
    cross(&text, BENCH)
        .warns(
            "121 °C",
            "how far the link heats itself",
            "add `self-heating:",
        )
        .only();
    let both = allowance.replace("ours}", "ours, self-heating: {rise: 7 K, at: 10 A}}");
    let text = changed(dryer(), "measured at: link body", &both);
    cross(&text, BENCH).is_clean();
}

#[test]
fn an_inrush_rule_without_an_inrush_step_is_refused() {
    cross(&changed(dryer(), INRUSH, ""), BENCH)
        .refuses(
            "inrush",
            "no step captures the inrush",
            "right after `energise`",
        )
        .only();
}

#[test]
fn a_power_rule_without_a_soak_is_refused_even_where_something_is_measured() {
    let from = dryer().find("        - soak:").unwrap();
    let to = dryer().find("        - measure:").unwrap();
    let text = format!("{}{}", &dryer()[..from], &dryer()[to..]);
    cross(&text, BENCH)
        .refuses(
            "power",
            "its settled power is never known",
            "add a `soak` step",
        )
        .warns(
            "order of positions",
            "their order will be not judged",
            "one `each` block",
        );
}

#[test]
fn a_stretch_without_what_its_rule_needs_is_warned_of() {
    let soak = "  - soak: {at least: 10 min, at most: 30 min, every: 2 s, until: {criterion: three readings, power change: 2 %}}\n";
    let text = changed(FLAT, soak, "  - run in: {for: 5 min, every: 5 s}\n");
    cross(&text, BENCH)
        .warns(
            "power",
            "no step soaks the unit in low, 230 V, 50 Hz",
            "add a `soak`",
        )
        .warns("order of positions", "not judged", "one `each` block");
}

#[test]
fn a_rule_for_what_is_never_run_is_warned_of() {
    let text = changed(
        dryer(),
        "      conditions: [refill full, dry]",
        "      conditions: [refill full]",
    );
    let text = changed(
        &text,
        "  - power: plate\n",
        "  - power: plate\n    condition: dry\n",
    );
    cross(&text, BENCH)
        .warns(
            "power",
            "no step runs what this rule is for",
            "run its position and condition",
        )
        .warns(
            "dry",
            "no step is run in the condition `dry`",
            "take it out",
        );
}

#[test]
fn an_order_of_one_position_is_refused() {
    let text = format!("{}  - order of positions: rising\n", shipped_as("towel"));
    cross(&text, BENCH)
        .refuses(
            "order of positions",
            "only one position",
            "take this rule out",
        )
        .only();
}

#[test]
fn a_position_that_no_step_runs_is_warned_of() {
    let text = changed(
        dryer(),
        "      positions: [low, high]",
        "      positions: [high]",
    );
    cross(&text, BENCH)
        .warns(
            "low",
            "no step runs the position `low`: the unit will be not judged",
            "add it",
        )
        .warns("order of positions", "not judged", "`each`");
}

#[test]
fn a_wide_plate_range_must_be_run_at_both_ends() {
    let entry = "{position: high, voltage: 230 V, frequency: 50 Hz, power: 80 W}";
    let text = changed(
        FLAT,
        entry,
        "{position: high, voltage: 120 V to 230 V, frequency: 50 Hz, power: 80 W}",
    );
    cross(&text, BENCH)
        .warns(
            "120 V to 230 V",
            "no step runs the position `high` near 120 V",
            "a supply of 120 V",
        )
        .only();
}

#[test]
fn a_supply_within_six_per_cent_of_the_plate_is_near_enough() {
    let at = |volts: &str| {
        cross(
            &changed(
                FLAT,
                "  - supply: {voltage: 230 V",
                &format!("  - supply: {{voltage: {volts}"),
            ),
            BENCH,
        )
    };
    at("243.8 V").is_clean();
    let beyond = at("243.9 V");
    assert_eq!(beyond.problems.len(), 2);
    for problem in &beyond.problems {
        assert_eq!(problem.place.text(), "230 V");
        assert!(problem.message.contains("near 230 V"));
    }
}

#[test]
fn a_representative_period_is_for_a_load_that_cycles() {
    let chosen = changed(
        FLAT,
        "  - power: plate",
        "  - power: plate\n    cycling: representative period",
    );
    let resolved = cross(&chosen, BENCH);
    resolved
        .warns("power", "no thermostat is declared", "`thermostat: yes`")
        .only();
    let cycling = changed(
        &chosen,
        "heating element: resistor",
        "heating element: resistor, thermostat: yes",
    );
    let resolved = cross(&cycling, BENCH);
    resolved.is_clean();
    let rules = &resolved.plan.as_ref().unwrap().rules;
    assert_eq!(rules[0].cycling, CyclingRule::RepresentativePeriod);
    assert_eq!(rules[1].cycling, CyclingRule::OnState);
}

#[test]
fn an_early_finish_does_not_follow_other_temperatures() {
    let early = changed(
        dryer(),
        "            every: 2 s\n            until",
        "            every: 2 s\n            early finish: yes\n            until",
    );
    cross(&early, BENCH)
        .warns("temperature", "not followed to its end", "early finish")
        .only();
}

#[test]
fn a_house_limit_needs_th_and_the_rule_after_opening_needs_tm_and_an_abnormal_step() {
    let th = "    Th: 100 °C                  # from the part's data sheet\n";
    let house = changed(
        dryer(),
        "  - thermal link: holding\n",
        "  - thermal link: {below Tf: 25 K}\n",
    );
    cross(&house, BENCH).is_clean();
    cross(&changed(&house, th, ""), BENCH)
        .refuses("121 °C", "states no Th", "data sheet")
        .only();
    let after = changed(
        dryer(),
        "  - thermal link: holding\n",
        "  - thermal link: after opening\n",
    );
    cross(&after, BENCH)
        .warns(
            "thermal link",
            "no step runs the unit with a fault",
            "abnormal",
        )
        .only();
    cross(&changed(&after, "    Tm: 175 °C\n", ""), BENCH).refuses(
        "121 °C",
        "states no Tm",
        "data sheet",
    );
}
