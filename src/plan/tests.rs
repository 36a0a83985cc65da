//! The plan under test: every shipped sequence, and every kind of problem.

use super::*;
use crate::spec::{self, Weight, shipped};

fn drivers() -> Vec<crate::spec::driver::Driver> {
    shipped::DRIVERS
        .iter()
        .map(|file| {
            spec::load_driver(file.path, file.text.as_bytes())
                .value
                .expect(file.path)
        })
        .collect()
}

/// Crosses texts of a sequence and a bench.
fn cross(sequence: &str, bench: &str) -> Resolved {
    let sequence = spec::load_sequence("s.yaml", sequence.as_bytes());
    let bench = spec::load_bench("b.yaml", bench.as_bytes());
    assert!(
        sequence.problems.is_empty(),
        "{}",
        spec::render(&sequence.problems)
    );
    assert!(
        bench.problems.is_empty(),
        "{}",
        spec::render(&bench.problems)
    );
    let today = chrono::NaiveDate::from_ymd_opt(2026, 12, 1);
    resolve(
        &sequence.value.unwrap(),
        &bench.value.unwrap(),
        &drivers(),
        None,
        today,
    )
}

const BENCH: &str = shipped::VIRTUAL_BENCH.text;

fn dryer() -> &'static str {
    shipped::SEQUENCES
        .iter()
        .find(|file| file.path.contains("cupboard-dryer"))
        .unwrap()
        .text
}

fn changed(text: &str, from: &str, to: &str) -> String {
    assert!(text.contains(from), "{from:?} is not there");
    text.replacen(from, to, 1)
}

/// One problem with all of these words in its message or hint, at this text.
#[track_caller]
fn problem(resolved: &Resolved, weight: Weight, at: &str, words: &[&str]) {
    let found = resolved.problems.iter().any(|p| {
        let text = format!("{} {}", p.message, p.hint.as_deref().unwrap_or(""));
        p.weight == weight && p.place.text() == at && words.iter().all(|word| text.contains(word))
    });
    assert!(
        found,
        "no such problem in:\n{}",
        spec::render(&resolved.problems)
    );
    assert_eq!(
        resolved.plan.is_none(),
        resolved.problems.iter().any(|p| p.weight == Weight::Error)
    );
}

#[test]
fn every_shipped_sequence_resolves_on_the_demo_bench_without_a_problem() {
    for file in shipped::SEQUENCES {
        let resolved = cross(file.text, BENCH);
        assert!(
            resolved.problems.is_empty(),
            "{}: {}",
            file.path,
            spec::render(&resolved.problems)
        );
        let plan = resolved.plan.unwrap();
        assert!(
            plan.lines_of_text()
                .iter()
                .all(|line| line.chars().count() <= 110),
            "{}",
            file.path
        );
        assert!(plan.expected <= plan.longest());
    }
}

#[test]
fn a_plan_reads_back_from_json_as_it_was() {
    for file in shipped::SEQUENCES {
        let plan = cross(file.text, BENCH).plan.unwrap();
        let json = serde_json::to_string_pretty(&plan).unwrap();
        assert_eq!(
            serde_json::from_str::<Plan>(&json).unwrap(),
            plan,
            "{}",
            file.path
        );
    }
}

#[test]
fn each_expands_condition_outermost_and_sets_it_once() {
    let plan = cross(dryer(), BENCH).plan.unwrap();
    let cells: Vec<(Option<&str>, &str)> = plan
        .cells
        .iter()
        .map(|c| (c.condition.as_deref(), c.position.as_str()))
        .collect();
    let expected = [
        ("refill full", "low"),
        ("refill full", "high"),
        ("dry", "low"),
        ("dry", "high"),
    ];
    assert_eq!(cells, expected.map(|(c, p)| (Some(c), p)));
    let conditions = plan
        .steps
        .iter()
        .filter(|s| matches!(s.action, Action::SetCondition { .. }))
        .count();
    assert_eq!(conditions, 2);
    let numbers: Vec<u32> = plan.steps.iter().map(|step| step.number).collect();
    assert_eq!(numbers, (1..=plan.steps.len() as u32).collect::<Vec<_>>());
}

#[test]
fn every_energised_stretch_ends_before_the_unit_is_touched_or_rests() {
    for file in shipped::SEQUENCES {
        let plan = cross(file.text, BENCH).plan.unwrap();
        let mut on = false;
        for step in &plan.steps {
            match &step.action {
                Action::Energise => on = true,
                Action::Deenergise => on = false,
                Action::Inrush(_) | Action::Soak { .. } | Action::Measure(_) => assert!(on),
                Action::Ask(_) => {}
                _ => assert!(!on, "{}: step {}", file.path, step.number),
            }
        }
        assert!(!on, "{}", file.path);
    }
}

#[test]
fn the_guards_are_the_lower_body_limit_and_thirteen_tenths_of_the_upper_input() {
    let plan = cross(dryer(), BENCH).plan.unwrap();
    // min(121 - 10, 115) and 1.3 x 1.2 x (4.5, 9) W.
    assert_eq!(plan.guards.body.unwrap().get(), 111.0);
    let input: Vec<f64> = plan.guards.input.iter().map(|w| w.get()).collect();
    for (found, expected) in input.iter().zip([7.02, 14.04, 7.02, 14.04]) {
        assert!(crate::quantity::near(*found, expected), "{found}");
    }
    assert_eq!(plan.guards.silence.len(), plan.bay.roles.len());
    let lower = changed(dryer(), "body: 115 °C", "body: 90 °C");
    assert_eq!(
        cross(&lower, BENCH)
            .plan
            .unwrap()
            .guards
            .body
            .unwrap()
            .get(),
        90.0
    );
}

#[test]
fn an_explicit_limit_of_a_position_guards_its_input() {
    let boot = shipped::SEQUENCES
        .iter()
        .find(|f| f.path.contains("boot"))
        .unwrap()
        .text;
    let plan = cross(boot, BENCH).plan.unwrap();
    assert!(crate::quantity::near(
        plan.guards.input[0].get(),
        1.3 * 50.0
    ));
}

#[test]
fn a_position_that_is_not_known_is_pointed_at_with_the_nearest() {
    let text = changed(
        dryer(),
        "      positions: [low, high]",
        "      positions: [low, hihg]",
    );
    problem(
        &cross(&text, BENCH),
        Weight::Error,
        "hihg",
        &["no position `hihg`", "did you mean `high`"],
    );
}

#[test]
fn a_position_that_no_step_runs_is_warned_of() {
    let text = changed(
        dryer(),
        "      positions: [low, high]",
        "      positions: [high]",
    );
    problem(
        &cross(&text, BENCH),
        Weight::Warning,
        "low",
        &["not judged"],
    );
}

#[test]
fn a_condition_that_is_not_declared_is_pointed_at() {
    let text = changed(
        dryer(),
        "conditions: [refill full, dry]",
        "conditions: [refill full, dyr]",
    );
    problem(
        &cross(&text, BENCH),
        Weight::Error,
        "dyr",
        &["did you mean `dry`"],
    );
}

#[test]
fn a_role_without_an_instrument_is_pointed_at() {
    let text = changed(
        dryer(),
        "  enclosure: temperature\n",
        "  enclosure: temperature\n  outlet: temperature\n",
    );
    problem(
        &cross(&text, BENCH),
        Weight::Error,
        "outlet",
        &["bay 1", "no instrument"],
    );
}

#[test]
fn a_sequence_without_supply_or_body_is_refused() {
    let text = changed(dryer(), "  supply: supply\n", "");
    let title = "Cupboard dryer, incoming qualification";
    problem(
        &cross(&text, BENCH),
        Weight::Error,
        title,
        &["0 roles of the kind `supply`"],
    );
    let text = changed(
        dryer(),
        "  body: temperature             # on the link's body\n",
        "",
    );
    problem(
        &cross(&text, BENCH),
        Weight::Error,
        title,
        &["no role `body`"],
    );
}

#[test]
fn names_in_the_bench_that_lead_nowhere_are_pointed_at() {
    for (from, to, at, words) in [
        (
            "meter: {instrument: meter}",
            "meter: {instrument: metre}",
            "metre",
            "did you mean `meter`",
        ),
        (
            "driver: scpi-power-meter",
            "driver: scpi-powermeter",
            "scpi-powermeter",
            "did you mean `scpi-power-meter`",
        ),
        (
            "line: meter line",
            "line: metre line",
            "metre line",
            "did you mean `meter line`",
        ),
    ] {
        problem(
            &cross(dryer(), &changed(BENCH, from, to)),
            Weight::Error,
            at,
            &[words],
        );
    }
}

#[test]
fn a_channel_must_be_there_and_be_nobody_elses() {
    let bench = changed(BENCH, "channel: 3", "channel: 9");
    problem(
        &cross(dryer(), &bench),
        Weight::Error,
        "9",
        &["no channel 9", "1 to 8"],
    );
    let bench = changed(BENCH, "channel: 2", "channel: 1");
    problem(
        &cross(dryer(), &bench),
        Weight::Error,
        "ambient",
        &["same channel"],
    );
    let bench = changed(
        BENCH,
        "{instrument: scanner, channel: 2}",
        "{instrument: scanner}",
    );
    problem(
        &cross(dryer(), &bench),
        Weight::Error,
        "scanner",
        &["names no channel"],
    );
}

#[test]
fn an_instrument_of_another_kind_can_not_fill_a_role() {
    let bench = changed(
        BENCH,
        "meter: {instrument: meter}",
        "meter: {instrument: supply}",
    );
    problem(
        &cross(dryer(), &bench),
        Weight::Error,
        "supply",
        &["can't fill the role `meter`"],
    );
}

#[test]
fn steps_out_of_order_are_refused() {
    let soak_first = changed(dryer(), "        - energise\n", "");
    problem(
        &cross(&soak_first, BENCH),
        Weight::Error,
        "inrush",
        &["not energised"],
    );
    let twice = changed(
        dryer(),
        "        - energise\n",
        "        - energise\n        - energise\n",
    );
    problem(
        &cross(&twice, BENCH),
        Weight::Error,
        "energise",
        &["already"],
    );
    let touched = changed(
        dryer(),
        "        - energise\n",
        "        - energise\n        - instruct: Touch it.\n",
    );
    problem(
        &cross(&touched, BENCH),
        Weight::Error,
        "instruct",
        &["while the unit is energised"],
    );
}

#[test]
fn polling_too_slowly_while_energised_is_refused_and_ten_seconds_are_not() {
    let slow = changed(dryer(), "            every: 2 s", "            every: 11 s");
    problem(&cross(&slow, BENCH), Weight::Error, "soak", &["too late"]);
    let just = changed(dryer(), "            every: 2 s", "            every: 10 s");
    assert!(cross(&just, BENCH).plan.is_some());
}

#[test]
fn rules_that_nothing_feeds_are_refused() {
    let no_link = changed(
        dryer(),
        "    Th: 100 °C                  # from the part's data sheet\n",
        "",
    );
    problem(
        &cross(&no_link, BENCH),
        Weight::Error,
        "121 °C",
        &["no Th", "data sheet"],
    );
    let no_inrush = changed(
        dryer(),
        "        - inrush: {for: 60 s, every: 100 ms}\n",
        "",
    );
    let resolved = cross(&no_inrush, BENCH);
    assert!(
        resolved
            .problems
            .iter()
            .any(|p| p.message.contains("no step captures the inrush"))
    );
    let no_role = changed(dryer(), "role: enclosure", "role: enclosur");
    assert!(
        cross(&no_role, BENCH)
            .problems
            .iter()
            .any(|p| p.message.contains("temperature role `enclosur`"))
    );
}

#[test]
fn a_supply_far_from_the_plate_is_warned_of_and_one_listed_twice_refused() {
    let text = changed(
        dryer(),
        "voltage: 230 V, frequency: 50 Hz}\n      steps",
        "voltage: 110 V, frequency: 50 Hz}\n      steps",
    );
    let resolved = cross(&text, BENCH);
    assert!(
        resolved
            .problems
            .iter()
            .any(|p| p.weight == Weight::Warning && p.message.contains("10 %"))
    );
    let line = "        - {voltage: 230 V, frequency: 50 Hz}\n";
    let text = changed(dryer(), line, &format!("{line}{line}"));
    assert!(
        cross(&text, BENCH)
            .problems
            .iter()
            .any(|p| p.message.contains("listed twice"))
    );
}

#[test]
fn a_plate_above_the_bays_rating_is_refused() {
    let bench = changed(BENCH, "rated current: 16 A", "rated current: 6 A");
    let heater = shipped::SEQUENCES
        .iter()
        .find(|f| f.path.contains("fan-heater"))
        .unwrap()
        .text;
    problem(
        &cross(heater, &bench),
        Weight::Error,
        "1.5 kW",
        &["6.5 A", "rated"],
    );
}

#[test]
fn calibration_is_asked_for_only_on_real_lines() {
    let real = BENCH.replace("port: virtual", "port: /dev/ttyS9");
    let resolved = cross(
        dryer(),
        &changed(&real, "due: 2099-12-31", "due: 2026-11-30"),
    );
    problem(&resolved, Weight::Warning, "meter", &["due on 2026-11-30"]);
    let today = changed(&real, "due: 2099-12-31", "due: 2026-12-01");
    assert!(
        !cross(dryer(), &today)
            .problems
            .iter()
            .any(|p| p.message.contains("was due"))
    );
}

#[test]
fn several_problems_are_told_at_once() {
    let text = changed(
        dryer(),
        "conditions: [refill full, dry]",
        "conditions: [refill full, dyr]",
    );
    let text = changed(&text, "role: enclosure", "role: enclosur");
    let bench = changed(BENCH, "channel: 3", "channel: 9");
    let resolved = cross(&text, &bench);
    assert!(
        resolved
            .problems
            .iter()
            .filter(|p| p.weight == Weight::Error)
            .count()
            >= 3
    );
}
