//! Cells: blocks of condition x position x supply, and steps written flat.

use super::*;

fn cells(plan: &Plan) -> Vec<String> {
    plan.cells.iter().map(Cell::words).collect()
}

/// Verbs of the steps of one cell.
fn verbs(plan: &Plan, cell: Option<usize>) -> Vec<&'static str> {
    let steps = plan.steps.iter().filter(|step| step.cell == cell);
    steps.map(|step| step.action.verb()).collect()
}

#[test]
fn each_expands_condition_outermost_then_position_then_supply() {
    let line = "        - {voltage: 230 V, frequency: 50 Hz}\n";
    let two = format!("{line}        - {{voltage: 240 V, frequency: 50 Hz}}\n");
    let plan = planned(&changed(dryer(), line, &two));
    assert_eq!(
        cells(&plan),
        [
            "refill full, low, 230 V, 50 Hz",
            "refill full, low, 240 V, 50 Hz",
            "refill full, high, 230 V, 50 Hz",
            "refill full, high, 240 V, 50 Hz",
            "dry, low, 230 V, 50 Hz",
            "dry, low, 240 V, 50 Hz",
            "dry, high, 230 V, 50 Hz",
            "dry, high, 240 V, 50 Hz",
        ]
    );
}

#[test]
fn a_cell_sets_its_condition_only_when_it_changes_and_ends_off() {
    let plan = planned(dryer());
    let block = [
        "supply", "position", "energise", "inrush", "soak", "measure",
    ];
    let rest = ["de-energise", "rest"];
    let plain = [&block[..], &rest[..]].concat();
    let with_condition = [&["condition"][..], &plain[..]].concat();
    assert_eq!(verbs(&plan, Some(0)), with_condition);
    assert_eq!(verbs(&plan, Some(1)), plain);
    assert_eq!(verbs(&plan, Some(2)), with_condition);
    assert_eq!(verbs(&plan, Some(3)), plain);
    assert_eq!(verbs(&plan, None), ["ask", "ask", "acclimatise"]);
}

#[test]
fn steps_are_numbered_from_one() {
    for text in [dryer(), FLAT] {
        let plan = planned(text);
        let numbers: Vec<u32> = plan.steps.iter().map(|step| step.number).collect();
        assert_eq!(numbers, (1..=plan.steps.len() as u32).collect::<Vec<_>>());
    }
}

#[test]
fn without_conditions_a_cell_names_none() {
    let plan = planned(shipped_as("boot"));
    assert_eq!(cells(&plan), ["low, 230 V, 50 Hz", "high, 230 V, 50 Hz"]);
}

#[test]
fn a_condition_set_before_the_block_holds_in_it() {
    let text = changed(dryer(), "      conditions: [refill full, dry]\n", "");
    let text = changed(&text, "  - each:", "  - condition: dry\n  - each:");
    let resolved = cross(&text, BENCH);
    resolved
        .warns(
            "refill full",
            "no step is run in the condition",
            "take it out",
        )
        .only();
    let plan = resolved.plan.unwrap();
    assert_eq!(
        cells(&plan),
        ["dry, low, 230 V, 50 Hz", "dry, high, 230 V, 50 Hz"]
    );
}

#[test]
fn positions_are_set_by_the_switch_where_there_is_one_and_numbered_in_their_order() {
    let set = |text: &str| -> Vec<(u32, bool)> {
        let steps = planned(text).steps;
        let set = steps.iter().filter_map(|step| match step.action {
            Action::SetPosition {
                number, by_switch, ..
            } => Some((number, by_switch)),
            _ => None,
        });
        set.collect()
    };
    assert_eq!(set(shipped_as("boot")), [(1, true), (2, true)]);
    let by_hand = changed(shipped_as("boot"), "  switch: position switch\n", "");
    assert_eq!(set(&by_hand), [(1, false), (2, false)]);
}

#[test]
fn flat_steps_make_a_cell_of_what_was_set_last_when_energised() {
    let plan = planned(FLAT);
    assert_eq!(cells(&plan), ["low, 230 V, 50 Hz", "high, 230 V, 50 Hz"]);
    // The rest after the first stretch holds its after-heat.
    let first = ["energise", "soak", "de-energise", "rest"];
    assert_eq!(verbs(&plan, Some(0)), first);
    assert_eq!(verbs(&plan, Some(1)), ["energise", "soak", "de-energise"]);
    let before = ["acclimatise", "supply", "position", "position"];
    assert_eq!(verbs(&plan, None), before);
}

#[test]
fn an_end_without_off_is_given_one() {
    let text = changed(FLAT, "  - de-energise\n", "");
    assert_eq!(planned(&text).steps, planned(FLAT).steps);
}

#[test]
fn energising_again_with_nothing_set_in_between_stays_in_its_cell() {
    let again = "  - de-energise\n  - energise\n  - run in: {for: 5 min, every: 5 s}\n";
    let plan = planned(&changed(FLAT, "  - de-energise\n", again));
    assert_eq!(plan.cells.len(), 2);
    assert_eq!(verbs(&plan, Some(1)).len(), 6);
}

#[test]
fn every_energised_stretch_ends_before_the_unit_is_touched_or_rests() {
    let shipped = shipped::SEQUENCES.iter().map(|file| file.text);
    for text in shipped.chain([FLAT]) {
        let mut on = false;
        for step in planned(text).steps {
            match &step.action {
                Action::Energise => on = true,
                Action::Deenergise => on = false,
                Action::Inrush(_) | Action::Soak { .. } | Action::Measure(_) => assert!(on),
                Action::Ask(_) => {}
                _ => assert!(!on, "step {}", step.number),
            }
        }
        assert!(!on);
    }
}

#[test]
fn a_block_that_multiplies_beyond_any_use_is_refused_at_once() {
    let supplies: String = (0..2000)
        .map(|n| {
            format!(
                "        - {{voltage: {}.{n:04} V, frequency: 50 Hz}}\n",
                230
            )
        })
        .collect();
    let text = changed(
        dryer(),
        "        - {voltage: 230 V, frequency: 50 Hz}\n",
        &supplies,
    );
    cross(&text, BENCH)
        .refuses("each", "makes 8000 cells", "fewer")
        .only();
}

#[test]
fn the_largest_block_is_just_let_through() {
    // One position and condition; 5 steps of the block, 4 that a cell adds, 3 before.
    let count = |n: usize| {
        let supplies: String = (0..n)
            .map(|n| format!("        - {{voltage: 230.{n:04} V, frequency: 50 Hz}}\n"))
            .collect();
        let text = changed(
            dryer(),
            "        - {voltage: 230 V, frequency: 50 Hz}\n",
            &supplies,
        );
        let text = changed(&text, "conditions: [refill full, dry]", "conditions: [dry]");
        let text = changed(
            &text,
            "      positions: [low, high]",
            "      positions: [low]",
        );
        cross(&text, BENCH).plan.is_some()
    };
    // (20,000 - 3) / (5 + 4) = 2221.9
    assert!(count(2221));
    assert!(!count(2222));
}
