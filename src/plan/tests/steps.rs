//! The order of steps, their intervals and their names.

use super::*;

const ENERGISE: &str = "        - energise\n";
const INRUSH: &str = "        - inrush: {for: 2 min, every: 100 ms}\n";

#[test]
fn a_position_that_is_not_known_is_pointed_at_wherever_it_is_named() {
    for (from, to) in [
        (
            "      positions: [low, high]",
            "      positions: [low, hihg]",
        ),
        ("{position: high, voltage", "{position: hihg, voltage"),
        ("    fan: yes", "    fan: yes\n    diode in position: hihg"),
        (
            "  - power: plate\n",
            "  - power: plate\n    position: hihg\n",
        ),
    ] {
        let resolved = cross(&changed(dryer(), from, to), BENCH);
        resolved.refuses(
            "hihg",
            "there is no position `hihg`",
            "mean `high`? known: low, high",
        );
    }
    cross(
        &changed(FLAT, "  - position: high", "  - position: hihg"),
        BENCH,
    )
    .refuses("hihg", "there is no position `hihg`", "mean `high`");
}

#[test]
fn a_condition_that_is_not_declared_is_pointed_at_wherever_it_is_named() {
    for (from, to) in [
        (
            "conditions: [refill full, dry]",
            "conditions: [refill full, dyr]",
        ),
        (
            "  - power: plate\n",
            "  - power: plate\n    condition: dyr\n",
        ),
        ("  - each:", "  - condition: dyr\n  - each:"),
    ] {
        let resolved = cross(&changed(dryer(), from, to), BENCH);
        resolved.refuses(
            "dyr",
            "there is no condition `dyr`",
            "mean `dry`? known: refill full, dry",
        );
    }
}

#[test]
fn a_hint_lists_only_some_of_many_names() {
    let positions: String = (0..40).map(|n| format!(", p{n}")).collect();
    let text = changed(
        dryer(),
        "positions: [low, high]",
        &format!("positions: [low, high{positions}]"),
    );
    let text = changed(
        &text,
        "      positions: [low, high]",
        "      positions: [low, quite elsewhere]",
    );
    cross(&text, BENCH).refuses(
        "quite elsewhere",
        "no position",
        "known: low, high, p0, p1, p2, p3, p4, p5, p6, p7, p8, p9 and 30 more",
    );
}

#[test]
fn names_and_supplies_listed_twice_are_refused() {
    let line = "        - {voltage: 230 V, frequency: 50 Hz}\n";
    let text = changed(dryer(), line, &format!("{line}{line}"));
    cross(&text, BENCH)
        .refuses(
            "{voltage: 230 V, frequency: 50 Hz}",
            "this supply is listed twice",
            "take one out",
        )
        .only();
}

#[test]
fn energising_twice_is_refused() {
    let text = changed(dryer(), ENERGISE, &format!("{ENERGISE}{ENERGISE}"));
    cross(&text, BENCH)
        .refuses("energise", "energised already", "take this `energise` out")
        .only();
}

#[test]
fn what_is_measured_while_off_is_refused_once_for_all_cells() {
    let resolved = cross(&changed(dryer(), ENERGISE, ""), BENCH);
    for verb in ["inrush", "soak", "measure"] {
        resolved.refuses(
            verb,
            &format!("`{verb}` comes while the unit is not energised"),
            "put `energise` before it",
        );
    }
    assert_eq!(resolved.problems.len(), 3);
    let run_in = changed(
        dryer(),
        ENERGISE,
        "        - run in: {for: 5 min, every: 5 s}\n        - energise\n",
    );
    cross(&run_in, BENCH)
        .refuses(
            "run in",
            "while the unit is not energised",
            "put `energise`",
        )
        .only();
}

#[test]
fn touching_steps_while_energised_are_refused_and_a_question_is_not() {
    let after = |step: &str| {
        changed(
            FLAT,
            "  - energise\n",
            &format!("  - energise\n  - {step}\n"),
        )
    };
    for (step, at, verb) in [
        ("instruct: Touch it.", "instruct", "instruct"),
        ("position: high", "high", "position"),
        (
            "acclimatise: {at most: 5 min, every: 5 s}",
            "acclimatise",
            "acclimatise",
        ),
        (
            "supply: {voltage: 240 V, frequency: 50 Hz}",
            "{voltage: 240 V, frequency: 50 Hz}",
            "supply",
        ),
    ] {
        let message = format!("`{verb}` comes while the unit is energised");
        cross(&after(step), BENCH).refuses(at, &message, "put `de-energise` or a `rest` before it");
    }
    let declared = changed(
        &after("condition: bare"),
        "steps:\n",
        "conditions: {bare: Take it off.}\nsteps:\n",
    );
    cross(&declared, BENCH).refuses(
        "bare",
        "`condition` comes while the unit is energised",
        "`de-energise`",
    );
    let asked = after("ask: {text: Does it hum?, answer: yes or no}");
    cross(&asked, BENCH).is_clean();
}

#[test]
fn a_position_is_not_switched_while_energised_even_by_the_switch() {
    let text = changed(FLAT, "roles: {", "roles: {switch: position switch, ");
    let text = changed(
        &text,
        "  - energise\n",
        "  - energise\n  - position: high\n",
    );
    cross(&text, BENCH)
        .refuses(
            "high",
            "`position` comes while the unit is energised",
            "`de-energise`",
        )
        .only();
}

#[test]
fn de_energising_what_is_off_is_refused() {
    let text = changed(FLAT, "  - energise\n", "  - de-energise\n  - energise\n");
    cross(&text, BENCH)
        .refuses("de-energise", "not energised here", "take this")
        .only();
}

#[test]
fn a_block_does_not_begin_while_energised() {
    let flat = "  - supply: {voltage: 230 V, frequency: 50 Hz}\n  - position: low\n  - energise\n  - each:";
    let resolved = cross(&changed(dryer(), "  - each:", flat), BENCH);
    resolved.refuses(
        "each",
        "`each` begins while the unit is energised",
        "put `de-energise`",
    );
}

#[test]
fn energising_before_position_or_supply_is_set_is_refused() {
    let supply = "  - supply: {voltage: 230 V, frequency: 50 Hz}\n";
    let late = changed(FLAT, supply, "");
    let late = changed(
        &late,
        "  - position: high\n",
        &format!("{supply}  - position: high\n"),
    );
    let no_position = changed(FLAT, "  - position: low\n", "");
    for text in [late, no_position] {
        let resolved = cross(&text, BENCH);
        resolved.refuses(
            "energise",
            "before position and supply are set",
            "or use `each`",
        );
    }
}

#[test]
fn an_axis_is_not_set_within_a_block() {
    for (step, verb) in [
        ("position: high", "position"),
        ("supply: {voltage: 230 V, frequency: 50 Hz}", "supply"),
        ("condition: dry", "condition"),
    ] {
        let text = changed(dryer(), ENERGISE, &format!("        - {step}\n{ENERGISE}"));
        let message = format!("`{verb}` stands in an `each` block");
        cross(&text, BENCH)
            .refuses(verb, &message, "name it in the block's")
            .only();
    }
}

#[test]
fn a_sequence_that_never_energises_is_refused() {
    let from = dryer().find("  - each:").unwrap();
    let to = dryer().find("rules:").unwrap();
    let text = format!(
        "{}rules:\n  - order of positions: rising\n",
        &dryer()[..from]
    );
    assert!(from < to);
    cross(&text, BENCH).refuses(TITLE, "no step energises the unit", "write `energise`");
}

#[test]
fn an_inrush_that_is_not_first_is_warned_of() {
    let text = changed(dryer(), INRUSH, "");
    let text = changed(
        &text,
        "        - measure:",
        &format!("{INRUSH}        - measure:"),
    );
    cross(&text, BENCH)
        .warns("inrush", "has passed", "right after `energise`")
        .only();
}

#[test]
fn polling_slower_than_ten_seconds_while_energised_is_refused_and_ten_seconds_are_not() {
    let every = |s: &str| {
        changed(
            dryer(),
            "            every: 2 s",
            &format!("            every: {s}"),
        )
    };
    cross(&every("10.001 s"), BENCH)
        .refuses(
            "soak",
            "polled every 10.001 s while energised: a guard would trip too late",
            "10 s",
        )
        .only();
    cross(&every("10 s"), BENCH).is_clean();
    // Off, nothing has to trip.
    let rest = changed(
        dryer(),
        "at most: 90 min, every: 5 s",
        "at most: 90 min, every: 60 s",
    );
    cross(&rest, BENCH).is_clean();
}

#[test]
fn polling_faster_than_the_meter_updates_is_warned_of_at_its_step() {
    let text = changed(dryer(), "every: 100 ms", "every: 99 ms");
    cross(&text, BENCH)
        .warns(
            "inrush",
            "`inrush` asks every 99 ms, and the power meter has a new value every 100 ms",
            "`every: 100 ms`",
        )
        .only();
    let slow = Crossing::of(dryer(), BENCH).driver("scpi-power-meter", |driver| {
        driver.update_interval = crate::quantity::Seconds::of(1.5);
    });
    let resolved = slow.resolve();
    resolved
        .warns("inrush", "every 100 ms", "1.5 s")
        .warns("measure", "every 1 s", "1.5 s");
    assert_eq!(resolved.problems.len(), 2);
}

#[test]
fn a_soak_shorter_than_its_criterions_window_is_warned_of_or_refused() {
    let soak = |least: &str, most: &str, window: &str| {
        let text = changed(dryer(), "at least: 10 min", &format!("at least: {least}"));
        let text = changed(&text, "at most: 45 min", &format!("at most: {most}"));
        cross(
            &changed(&text, "window: 5 min", &format!("window: {window}")),
            BENCH,
        )
    };
    soak("10 min", "45 min", "10 min").is_clean();
    soak("10 min", "45 min", "11 min")
        .warns(
            "soak",
            "window of 11 min is longer than `at least`, 10 min",
            "`at least: 11 min`",
        )
        .only();
    soak("10 min", "45 min", "45 min")
        .warns("soak", "longer than", "at least")
        .only();
    soak("10 min", "45 min", "46 min")
        .refuses(
            "soak",
            "window of 46 min does not fit into `at most`, 45 min",
            "well above 46 min",
        )
        .only();
    let within = "{criterion: change within, interval: 12 min, power change: 2 %}";
    let three = "{criterion: three readings, power change: 2 %}";
    cross(&changed(FLAT, three, within), BENCH)
        .warns("soak", "interval of 12 min", "at least")
        .only();
    cross(
        &changed(
            FLAT,
            "at most: 30 min, every: 2 s, until",
            "at most: 10 min, every: 2 s, until",
        ),
        BENCH,
    )
    .is_clean();
    let short = changed(
        FLAT,
        "at least: 10 min, at most: 30 min",
        "at least: 5 min, at most: 9 min",
    );
    cross(&short, BENCH)
        .refuses("soak", "three readings of 10 min does not fit", "at most")
        .only();
}

#[test]
fn a_slope_whose_window_holds_too_few_readings_is_refused() {
    let soak = |window: &str, every: &str| {
        let slope = format!("{{criterion: slope, window: {window}, power change: 2 %}}");
        let text = changed(
            FLAT,
            "{criterion: three readings, power change: 2 %}",
            &slope,
        );
        cross(
            &changed(&text, "every: 2 s", &format!("every: {every}")),
            BENCH,
        )
    };
    soak("60 s", "10 s").is_clean();
    soak("59 s", "10 s")
        .refuses("soak", "leaves 5 means", "widen the `window`")
        .only();
    soak("20 s", "2 s")
        .refuses(
            "soak",
            "and a slope needs 6: it can never settle",
            "three readings",
        )
        .only();
}

#[test]
fn a_sampling_method_s_log_fits_into_3_h() {
    let soak = |most: &str| {
        let text = changed(
            FLAT,
            "{at least: 10 min, at most: 30 min, every: 2 s, until: {criterion: three readings, power change: 2 %}}",
            &format!(
                "{{at least: 15 min, at most: {most}, every: 1 s, until: {{criterion: sampling method}}}}"
            ),
        );
        cross(&text, BENCH)
    };
    soak("3 h").is_clean();
    soak("4 h")
        .warns("soak", "gives up after 3 h", "3 h")
        .only();
}

#[test]
fn problems_are_told_all_at_once_in_the_order_of_their_places() {
    let text = changed(
        dryer(),
        "conditions: [refill full, dry]",
        "conditions: [refill full, dyr]",
    );
    let text = changed(&text, "role: enclosure", "role: enclosur");
    let text = changed(&text, "{position: low, voltage", "{position: lwo, voltage");
    let bench = changed(BENCH, "channel: 3", "channel: 9");
    let resolved = cross(&text, &bench);
    let places: Vec<&str> = resolved
        .problems
        .iter()
        .filter(|p| p.weight == Weight::Error)
        .map(|p| p.place.text())
        .collect();
    assert_eq!(places, ["lwo", "dyr", "temperature", "9"]);
    assert!(resolved.plan.is_none());
}
