//! Verdicts of played records.

use super::*;
use crate::analysis::fixture::{Now, Played, Seen, good, noise, plan, play, play_until, rule};
use crate::plan::{Action, PlannedRule};
use crate::quantity::{Amps, Celsius, Kelvins, Volts};
use crate::record::{Event, Sample, TripOf};
use crate::spec::sequence::{Decision, FindingClass, RuleKind};

fn judged(played: &Played) -> Judgement {
    judge(&played.plan, &played.outcome, &played.analysis())
}

fn find<'a>(judgement: &'a Judgement, rule: &str, position: Option<&str>) -> &'a Finding {
    judgement
        .findings
        .iter()
        .find(|f| {
            f.rule.starts_with(rule) && (position.is_none() || f.position.as_deref() == position)
        })
        .unwrap_or_else(|| panic!("no finding {rule} {position:?}: {:#?}", judgement.findings))
}

fn assert_reasons(judgement: &Judgement) {
    for finding in &judgement.findings {
        assert!(!finding.reason.is_empty(), "{finding:?}");
    }
    assert!(!judgement.because.is_empty());
}

/// A run with one rule only.
fn with_rule(rule: PlannedRule, unit: impl Fn(Now) -> Seen) -> Judgement {
    let mut plan = plan(&["full"]);
    plan.rules = vec![rule];
    judged(&play(plan, unit))
}

#[test]
fn a_good_unit_passes() {
    let judgement = judged(&play(plan(&["full", "dry"]), good));
    assert_eq!(judgement.verdict, Outcome::Pass, "{}", judgement.because);
    assert_reasons(&judgement);
    assert!(
        judgement.because.contains("times U: "),
        "{}",
        judgement.because
    );
    let text = serde_json::to_string(&judgement).unwrap();
    assert_eq!(serde_json::from_str::<Judgement>(&text).unwrap(), judgement);
    for rule in [
        "works at all",
        "sensors believable",
        "power against the plate",
        "thermal link, holding",
        "thermal link, earliest",
        "inrush",
        "order of positions",
        "temperature rise, enclosure",
        "Is the plate legible?",
    ] {
        assert_eq!(
            find(&judgement, rule, None).outcome,
            Outcome::Pass,
            "{rule}"
        );
    }
    let power = find(&judgement, "power against", Some("high"));
    assert_eq!(power.at_least, None);
    assert!((power.at_most.unwrap() - 10.8).abs() < 1e-9);
    assert!((power.margin.unwrap() - 2.2).abs() < 0.02);
}

#[test]
fn the_worst_condition_is_reported_and_named() {
    let unit = |now: Now| {
        let mut seen = good(now);
        if now.cell.is_some_and(|cell| cell >= 2) && now.on.is_some() {
            seen.watts *= 1.05;
        }
        seen
    };
    let judgement = judged(&play(plan(&["full", "dry"]), unit));
    let power = find(&judgement, "power against", Some("high"));
    assert_eq!(power.condition.as_deref(), Some("dry"));
    let of_rule = |f: &&Finding| f.rule.starts_with("power against");
    assert_eq!(judgement.findings.iter().filter(of_rule).count(), 2);
}

#[test]
fn a_rule_for_one_condition_or_position_judges_only_that() {
    let mut only = rule(RuleKind::PlatePower);
    only.position = Some("low".to_owned());
    only.condition = Some("dry".to_owned());
    let mut plan = plan(&["full", "dry"]);
    plan.rules = vec![only.clone()];
    let judgement = judged(&play(plan.clone(), good));
    let found: Vec<&Finding> = judgement
        .findings
        .iter()
        .filter(|f| f.rule.starts_with("power"))
        .collect();
    assert_eq!(found.len(), 1);
    assert_eq!(found[0].condition.as_deref(), Some("dry"));
    only.condition = Some("upside down".to_owned());
    plan.rules = vec![only];
    let judgement = judged(&play(plan, good));
    assert_eq!(find(&judgement, "power", None).outcome, Outcome::NotJudged);
    assert_eq!(judgement.verdict, Outcome::NotJudged);
}

#[test]
fn a_unit_that_draws_too_much_fails() {
    let judgement = judged(&play(plan(&["full"]), |now| {
        let seen = good(now);
        Seen {
            watts: seen.watts * 1.4,
            ..seen
        }
    }));
    assert_eq!(judgement.verdict, Outcome::Fail);
    assert_eq!(
        find(&judgement, "power against", Some("high")).outcome,
        Outcome::Fail
    );
    assert!(
        judgement.because.contains("power against the plate"),
        "{}",
        judgement.because
    );
}

#[test]
fn a_dead_unit_does_not_pass() {
    let judgement = judged(&play(plan(&["full"]), |now| Seen {
        watts: 0.0,
        body: 23.0 + 0.06 * noise(3, now.t),
        enclosure: 23.0,
        ..good(now)
    }));
    assert_eq!(judgement.verdict, Outcome::Fail);
    let works = find(&judgement, "works at all", Some("low"));
    assert_eq!(works.outcome, Outcome::Fail);
    // A tenth of 4.5 W (house default).
    assert!((works.at_least.unwrap() - 0.45).abs() < 1e-9);
    assert_reasons(&judgement);
}

#[test]
fn a_link_that_opens_mid_soak_fails() {
    let judgement = judged(&play(plan(&["full"]), |now| {
        let seen = good(now);
        let open = now.on.is_some_and(|on| on > 400.0) && now.position == "high";
        Seen {
            watts: if open { 0.0 } else { seen.watts },
            ..seen
        }
    }));
    let works = find(&judgement, "works at all", Some("high"));
    assert_eq!(works.outcome, Outcome::Fail);
    assert!(works.reason.contains("vanished"), "{}", works.reason);
    assert_eq!(
        find(&judgement, "works at all", Some("low")).outcome,
        Outcome::Pass
    );
}

#[test]
fn swapped_positions_are_found() {
    let judgement = judged(&play(plan(&["full"]), |now| {
        let position = if now.position == "low" { "high" } else { "low" };
        good(Now { position, ..now })
    }));
    let order = find(&judgement, "order of positions, low before high", None);
    assert_eq!(order.outcome, Outcome::Fail);
    assert!((order.value.unwrap() + 4.3).abs() < 0.02);
    assert_eq!(judgement.verdict, Outcome::Fail);
}

#[test]
fn doubtful_sensors_leave_the_thermal_findings_unjudged() {
    let judgement = judged(&play(plan(&["full"]), |now| Seen {
        body: 23.0 + 0.06 * noise(3, now.t),
        ..good(now)
    }));
    assert_eq!(judgement.verdict, Outcome::NotJudged);
    for rule in [
        "sensors believable",
        "thermal link, holding",
        "thermal link, earliest",
        "temperature rise",
    ] {
        let finding = find(&judgement, rule, None);
        assert_eq!(finding.outcome, Outcome::NotJudged, "{rule}");
        assert!(finding.reason.contains("rose by"), "{}", finding.reason);
    }
    assert_eq!(
        find(&judgement, "power against", None).outcome,
        Outcome::Pass
    );
}

/// A unit whose settled body in position high rises by `rise` K.
fn hot(rise: f64) -> impl Fn(Now) -> Seen {
    move |now| {
        let mut seen = good(now);
        if now.position == "high" {
            seen.body = seen.ambient + (seen.body - seen.ambient) * rise / 60.0;
        }
        seen
    }
}

#[test]
fn the_link_is_judged_at_the_highest_ambient() {
    // At 35 °C ambient: 35 + rise against Th 100 °C with U about 1.3 K (computed).
    for (rise, outcome) in [
        (60.0, Outcome::Pass),
        (64.2, Outcome::ConditionalPass),
        (65.5, Outcome::ConditionalFail),
        (70.0, Outcome::Fail),
    ] {
        let judgement = with_rule(rule(RuleKind::LinkHolding), hot(rise));
        let holding = find(&judgement, "thermal link, holding", Some("high"));
        assert_eq!(holding.outcome, outcome, "{rise}: {holding:?}");
        assert_eq!(judgement.verdict, outcome);
    }
}

#[test]
fn a_link_without_its_data_sheets_temperature_is_not_judged() {
    let mut plan = plan(&["full"]);
    plan.appliance.link.as_mut().unwrap().th = None;
    let judgement = judged(&play(plan.clone(), good));
    let holding = find(&judgement, "thermal link, holding", None);
    assert_eq!(holding.outcome, Outcome::NotJudged);
    plan.appliance.link = None;
    let judgement = judged(&play(plan, good));
    assert_eq!(
        find(&judgement, "thermal link, earliest", None).outcome,
        Outcome::NotJudged
    );
}

#[test]
fn a_body_that_trips_the_guard_fails_and_leaves_the_rest_unjudged() {
    let played = play_until(plan(&["full"]), hot(100.0), |step, _| {
        let high = step.cell == Some(1);
        (high && matches!(step.action, Action::Measure(_))).then(|| RunOutcome::Tripped {
            reason: "body 111.2 °C, limit 111 °C".to_owned(),
            speaks_of: TripOf::Unit,
        })
    });
    let judgement = judged(&played);
    assert_eq!(
        find(&judgement, "guard tripped", None).outcome,
        Outcome::Fail
    );
    assert_eq!(judgement.verdict, Outcome::Fail);
    // What was seen alone lies above Th.
    let holding = find(&judgement, "thermal link, holding", Some("high"));
    assert_eq!(holding.outcome, Outcome::Fail);
    assert_reasons(&judgement);
}

#[test]
fn another_trip_judges_nothing() {
    let played = play_until(plan(&["full"]), good, |step, _| {
        (step.cell == Some(1)).then(|| RunOutcome::Tripped {
            reason: "meter silent for 2 s".to_owned(),
            speaks_of: TripOf::Bench,
        })
    });
    let judgement = judged(&played);
    assert_eq!(
        find(&judgement, "guard tripped", None).outcome,
        Outcome::NotJudged
    );
    assert_eq!(
        find(&judgement, "power against", Some("low")).outcome,
        Outcome::Pass
    );
    assert_eq!(
        find(&judgement, "power against", Some("high")).outcome,
        Outcome::NotJudged
    );
    assert_eq!(judgement.verdict, Outcome::NotJudged);
    assert_reasons(&judgement);
}

#[test]
fn a_run_that_is_not_complete_never_passes_and_still_fails() {
    for outcome in [
        RunOutcome::Stopped,
        RunOutcome::Interrupted,
        RunOutcome::Failed {
            reason: "meter lost".to_owned(),
        },
        RunOutcome::Tripped {
            reason: "input".to_owned(),
            speaks_of: TripOf::Bench,
        },
    ] {
        let mut played = play(plan(&["full"]), good);
        played.outcome = outcome.clone();
        let judgement = judged(&played);
        assert_eq!(judgement.verdict, Outcome::NotJudged, "{outcome:?}");
        assert_reasons(&judgement);
        let mut played = play(plan(&["full"]), |now| {
            let seen = good(now);
            Seen {
                watts: seen.watts * 1.5,
                ..seen
            }
        });
        played.outcome = outcome;
        assert_eq!(judged(&played).verdict, Outcome::Fail);
    }
}

#[test]
fn inrush_is_judged_only_from_a_cold_start() {
    let limit = RuleKind::Inrush {
        at_most: Amps::of(0.1),
    };
    let judgement = with_rule(rule(limit.clone()), good);
    // 4 x 8.6 W at 230 V is 0.15 A (computed).
    assert_eq!(
        find(&judgement, "inrush", Some("high")).outcome,
        Outcome::Fail
    );
    assert_eq!(
        find(&judgement, "inrush", Some("low")).outcome,
        Outcome::Pass
    );
    let judgement = with_rule(rule(limit), |now| {
        let mut seen = good(now);
        if now.cell.is_none() {
            seen.body += 8.0;
        }
        seen
    });
    let warm = find(&judgement, "inrush", Some("low"));
    assert_eq!(warm.outcome, Outcome::NotJudged);
    assert!(warm.reason.contains("no cold start"), "{}", warm.reason);
}

#[test]
fn a_lower_bound_can_exceed_a_limit_and_never_meet_it() {
    let spike = |now: Now| {
        let mut seen = good(now);
        if now.on.is_some_and(|on| on < 0.15) {
            seen.watts = 60.0;
        }
        seen
    };
    for (limit, outcome) in [(0.5, Outcome::NotJudged), (0.2, Outcome::Fail)] {
        let rule = rule(RuleKind::Inrush {
            at_most: Amps::of(limit),
        });
        let judgement = with_rule(rule, spike);
        assert_eq!(
            find(&judgement, "inrush", Some("high")).outcome,
            outcome,
            "{limit}"
        );
    }
}

#[test]
fn an_inrush_that_the_supply_limits_is_not_judged() {
    let sags = |now: Now| {
        let mut seen = good(now);
        if now.on.is_some_and(|on| on < 5.0) {
            seen.volts *= 0.95;
        }
        seen
    };
    let judgement = with_rule(
        rule(RuleKind::Inrush {
            at_most: Amps::of(0.5),
        }),
        sags,
    );
    assert!(find(&judgement, "inrush", None).reason.contains("sagged"));
}

#[test]
fn operators_findings_fail_unless_they_are_minor() {
    for (class, verdict) in [
        (FindingClass::Critical, Outcome::Fail),
        (FindingClass::Major, Outcome::Fail),
        (FindingClass::Minor, Outcome::Pass),
    ] {
        let mut played = play(plan(&["full"]), good);
        for step in &mut played.plan.steps {
            if let Action::Ask(question) = &mut step.action {
                question.finding.as_mut().unwrap().class = class;
            }
        }
        for happening in &mut played.happenings {
            if let Event::Answered {
                answer, finding, ..
            } = &mut happening.event
            {
                *answer = "no".to_owned();
                *finding = Some(class);
            }
        }
        let judgement = judged(&played);
        assert_eq!(
            find(&judgement, "Is the plate", None).outcome,
            Outcome::Fail
        );
        assert_eq!(judgement.verdict, verdict, "{class:?}");
    }
}

#[test]
fn a_question_that_was_not_answered_is_not_judged() {
    let mut played = play(plan(&["full"]), good);
    played
        .happenings
        .retain(|h| !matches!(h.event, Event::Answered { .. }));
    assert_eq!(judged(&played).verdict, Outcome::NotJudged);
}

#[test]
fn a_position_of_the_plate_that_is_not_run_leaves_the_unit_unjudged() {
    let mut plan = plan(&["full"]);
    plan.cells.truncate(1);
    plan.steps.retain(|step| step.cell != Some(1));
    let judgement = judged(&play(plan, good));
    assert_eq!(judgement.verdict, Outcome::NotJudged);
    let missing = find(&judgement, "every position", None);
    assert_eq!(missing.position.as_deref(), Some("high"));
    assert_reasons(&judgement);
}

#[test]
fn a_wide_voltage_range_is_judged_at_both_ends_and_only_where_it_is_run() {
    let mut plan = plan(&["full"]);
    for entry in &mut plan.appliance.plate {
        entry.voltage.low = Volts::of(110.0);
    }
    let judgement = judged(&play(plan, good));
    let found: Vec<(Outcome, String)> = judgement
        .findings
        .iter()
        .filter(|f| f.rule.starts_with("power against") && f.position.as_deref() == Some("high"))
        .map(|f| (f.outcome, f.reason.clone()))
        .collect();
    assert_eq!(found.len(), 2);
    assert_eq!(found[0].0, Outcome::NotJudged);
    assert!(found[0].1.contains("110 V"), "{}", found[0].1);
    // 230 V is within 6 % of 240 V.
    assert_eq!(found[1].0, Outcome::Pass);
}

#[test]
fn information_decides_nothing() {
    let mut inform = rule(RuleKind::TemperatureRise {
        role: "enclosure".to_owned(),
        at_most: Kelvins::of(1.0),
    });
    inform.weight = RuleWeight::Information;
    let judgement = with_rule(inform, good);
    assert_eq!(
        find(&judgement, "temperature rise", None).outcome,
        Outcome::Fail
    );
    assert_eq!(judgement.verdict, Outcome::Pass);
}

#[test]
fn explicit_limits_are_judged_in_every_cell() {
    let limits = RuleKind::PowerLimits {
        at_least: Some(Watts::of(5.0)),
        at_most: Some(Watts::of(10.0)),
    };
    for decision in [
        Decision::Simple,
        Decision::FourOutcomes,
        Decision::Guarded { ratio: 1.0 },
    ] {
        let one = PlannedRule {
            decision,
            ..rule(limits.clone())
        };
        let judgement = with_rule(one, good);
        assert_eq!(
            find(&judgement, "power", Some("low")).outcome,
            Outcome::Fail
        );
        assert_eq!(
            find(&judgement, "power", Some("high")).outcome,
            Outcome::Pass
        );
    }
}

// IEC 60335-1 clause 10.1: the same numbers as in `spec::plate`.
#[test]
fn plate_limits_are_those_of_the_plate() {
    let rated = Span {
        low: Watts::of(1500.0),
        high: Watts::of(1500.0),
    };
    let (least, most) = plate_limits(ApplianceKind::Heating, rated);
    assert!((least.unwrap().get() - 1350.0).abs() < 1e-9 && (most.get() - 1575.0).abs() < 1e-9);
}

#[test]
fn rows_of_other_roles_between_change_nothing() {
    // Rows of one role stay in order; rows of different roles may come in any.
    let played = play(plan(&["full"]), good);
    let mut other = played.clone();
    for round in other.samples.chunks_mut(4) {
        round.reverse();
    }
    assert_eq!(judged(&played), judged(&other));
}

#[test]
fn a_hollow_record_judges_nothing_and_says_why() {
    let lose = |keep: fn(&Sample) -> bool| {
        let mut played = play(plan(&["full"]), good);
        played.samples.retain(keep);
        judged(&played)
    };
    for keep in [
        (|_: &Sample| false) as fn(&Sample) -> bool,
        |row| row.role != 1,
        |row| row.role != 2,
        |row| row.role != 3,
        |row| !row.energised,
        |row| row.energised,
    ] {
        let judgement = lose(keep);
        assert_eq!(
            judgement.verdict,
            Outcome::NotJudged,
            "{}",
            judgement.because
        );
        assert_reasons(&judgement);
    }
}

#[test]
fn a_cooler_guard_changes_no_verdict_of_a_complete_run() {
    let mut plan = plan(&["full"]);
    plan.guards.body = Some(Celsius::of(50.0));
    assert_eq!(judged(&play(plan, good)).verdict, Outcome::Pass);
}

/// A good unit whose rises are scaled, so that its body comes to a wanted temperature.
fn warmed(now: Now, factor: f64) -> Seen {
    let seen = good(now);
    Seen {
        body: 23.0 + factor * (seen.body - 23.0),
        ..seen
    }
}

#[test]
fn a_unit_with_a_fan_is_judged_only_when_both_ends_of_its_range_are_run() {
    let mut with_fan = plan(&["full"]);
    with_fan.appliance.fan = true;
    with_fan.rules = vec![rule(RuleKind::LinkHolding)];
    let range = |low: f64, high: f64| crate::spec::sequence::Span {
        low: Volts::of(low),
        high: Volts::of(high),
    };
    with_fan.appliance.supply_range = Some(range(230.0, 230.0));
    let run = |plan: &Plan| judged(&play(plan.clone(), good));
    assert_eq!(run(&with_fan).verdict, Outcome::Pass);
    with_fan.appliance.supply_range = Some(range(220.0, 240.0));
    let judgement = run(&with_fan);
    assert_eq!(judgement.verdict, Outcome::NotJudged);
    assert!(
        judgement.because.contains("220 V and 240 V"),
        "{}",
        judgement.because
    );
}

#[test]
fn a_house_rule_takes_the_lower_of_th_and_a_distance_below_tf() {
    // Tf 121, Th 100: 25 K below Tf is 96; the body at 35 °C ambient comes to 95.
    let with = |below: f64| {
        let house = RuleKind::LinkHouse {
            below_tf: Kelvins::of(below),
        };
        find(
            &with_rule(rule(house), good),
            "thermal link, house",
            Some("high"),
        )
        .clone()
    };
    assert_eq!(with(25.0).at_most, Some(96.0));
    assert_eq!(with(5.0).at_most, Some(100.0));
    assert_eq!(with(30.0).outcome, Outcome::Fail);
}

#[test]
fn where_only_the_outside_is_measured_a_house_limit_says_so() {
    let mut plan = plan(&["full"]);
    plan.rules = vec![rule(RuleKind::LinkHolding)];
    plan.appliance.link.as_mut().unwrap().measured_at =
        crate::spec::sequence::MeasuredAt::OutsideOnly {
            place: "outlet grille".to_owned(),
            limit: Celsius::of(110.0),
        };
    let judgement = judged(&play(plan, good));
    let finding = find(&judgement, "outlet grille", Some("high"));
    assert_eq!(finding.outcome, Outcome::Pass);
    assert!(finding.source.contains("the link was not measured"));
}

#[test]
fn a_body_above_th_marks_the_unit_and_a_marked_unit_is_not_judged_as_good() {
    let judgement = judged(&play(plan(&["full"]), good));
    assert_eq!(judgement.marks, Vec::new());
    let judgement = judged(&play(plan(&["full"]), |now| warmed(now, 1.3)));
    assert!(matches!(judgement.marks[..], [Mark::LinkStressed { .. }]));
    let mut marked = play(plan(&["full"]), good);
    marked.happenings[0].event = Event::Marked {
        mark: "link stressed".to_owned(),
        by: "its body reached 105 °C".to_owned(),
        record: "r1".to_owned(),
    };
    let judgement = judged(&marked);
    assert_eq!(judgement.verdict, Outcome::NotJudged);
    assert!(
        judgement.because.contains("link stressed"),
        "{}",
        judgement.because
    );
}

#[test]
fn a_measurement_that_is_too_coarse_for_its_limits_is_not_judged() {
    let coarse = |digit: f64, floor: f64| {
        let mut plan = plan(&["full"]);
        plan.rules = vec![rule(RuleKind::PlatePower)];
        let meter = &mut plan.instruments[1].driver.accuracy;
        let power = meter
            .iter_mut()
            .find(|a| a.reading == crate::quantity::Reading::Power)
            .unwrap();
        (power.resolution, power.floor) = (digit, floor);
        find(&judged(&play(plan, good)), "power against", Some("low")).clone()
    };
    // 4.5 W + 20 % leaves 0.9 W.
    assert_eq!(coarse(0.08, 0.005).outcome, Outcome::Pass);
    let found = coarse(0.1, 0.005);
    assert_eq!(found.outcome, Outcome::NotJudged);
    assert!(
        found.reason.contains("more than a tenth"),
        "{}",
        found.reason
    );
    let found = coarse(0.001, 0.9);
    assert_eq!(found.outcome, Outcome::NotJudged);
    assert!(
        found.reason.contains("that the limit leaves"),
        "{}",
        found.reason
    );
}

#[test]
fn a_simple_decision_judges_nothing_beyond_its_largest_u() {
    let with = |largest: f64| {
        let simple = PlannedRule {
            decision: Decision::SimpleUpTo { largest },
            ..rule(RuleKind::LinkHolding)
        };
        find(&with_rule(simple, good), "thermal link", Some("high")).clone()
    };
    let judged = with(3.0);
    assert_eq!(judged.outcome, Outcome::Pass);
    assert!(judged.decision.unwrap().contains("U at most 3 K") || judged.unit == "°C");
    let refused = with(0.5);
    assert_eq!(refused.outcome, Outcome::NotJudged);
    assert!(
        refused.reason.contains("stated for U up to"),
        "{}",
        refused.reason
    );
}

// JCGM 106:2012 9.5, resistors: y0 1500, u0 0.12, limits 1499.8 and 1500.2, accepted from
// 1499.82 to 1500.18, um 0.04 ohm: 0.9044 conform, consumer's risk 0.0099, producer's 0.0690.
#[test]
fn the_risks_for_a_stated_process_are_those_of_jcgm_106() {
    let draft = super::finding::Draft {
        decision: Decision::Guarded { ratio: 0.25 },
        limits: Limits {
            at_least: Some(1499.8),
            at_most: Some(1500.2),
        },
        process: Some(crate::spec::sequence::ProcessSpread {
            mean: 1500.0,
            spread: 0.12,
        }),
        ..super::finding::Draft::house("resistance", "")
    };
    let line = crate::analysis::Share::normal("meter", 0.04, "ohm");
    let value = crate::analysis::Estimate::combined(1500.05, vec![line]);
    let risks = draft.decided(None, &value).risks.unwrap();
    assert!((risks.conforming - 0.9044).abs() < 5e-5, "{risks:?}");
    assert!((risks.consumer - 0.0099).abs() < 5e-5, "{risks:?}");
    assert!((risks.producer - 0.0690).abs() < 5e-5, "{risks:?}");
}
