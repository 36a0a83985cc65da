//! A small share of the campaign, and proof that it can fail.

use super::*;
use crate::judge::Outcome;

fn campaign(units: u64, parts: &[Part]) -> Campaign {
    Campaign {
        units,
        seed: 1,
        parts: parts.to_vec(),
        draws: 20_000,
        claimed: 1.0,
    }
}

fn measured(campaign: &Campaign) -> Report {
    measure(campaign, &mut |_, _| {}).unwrap()
}

fn unmet(report: &Report) -> Vec<String> {
    let goals = report.goals().into_iter();
    goals.filter(|g| !g.met).map(|g| g.what).collect()
}

#[test]
fn sixty_units_are_covered_and_judged_by_their_truth() {
    let report = measured(&campaign(60, &[Part::Good]));
    let table = text(&report);
    assert_eq!(unmet(&report), Vec::<String>::new(), "{table}");
    for (place, outcomes) in &report.places {
        match place {
            Place::Clear => assert_eq!(outcomes.of(Outcome::Pass), outcomes.all(), "{table}"),
            Place::Near => assert_eq!(outcomes.of(Outcome::Fail), 0, "{table}"),
            Place::Beyond => assert_eq!(outcomes.of(Outcome::Pass), 0, "{table}"),
            Place::FarBeyond => assert_eq!(outcomes.passed(), 0, "{table}"),
        }
        assert!(outcomes.all() > 0, "{table}");
    }
}

/// A budget that states half of the true errors is found out.
#[test]
fn a_driver_that_claims_half_of_its_error_fails_the_goal() {
    let mut half = campaign(60, &[Part::Good]);
    half.claimed = 0.5;
    let report = measured(&half);
    let unmet = unmet(&report);
    assert!(unmet.len() >= 4, "{}", text(&report));
    let worst = report.good.iter().map(|row| row.covered.share().unwrap());
    assert!(worst.fold(1.0, f64::min) < 0.8, "{}", text(&report));
}

#[test]
fn the_same_seed_gives_the_same_table_and_another_one_another() {
    let table = |seed| {
        let mut small = campaign(8, &[Part::Good]);
        small.seed = seed;
        let report = measured(&small);
        (text(&report), csv(&report))
    };
    assert_eq!(table(1), table(1));
    assert_ne!(table(1).1, table(2).1);
}

#[test]
fn false_passes_on_the_limit_are_as_few_as_the_guard_band_promises() {
    let report = measured(&campaign(1, &[Part::Limit]));
    assert_eq!(report.limit.len(), 8);
    assert_eq!(unmet(&report), Vec::<String>::new(), "{}", text(&report));
    // The control shows that the draws reach the guard band at all.
    let normal = report
        .limit
        .iter()
        .filter(|row| row.drawn == crate::virtual_bench::Drawn::Normal);
    for row in normal {
        assert!(row.passes.share().unwrap() > 0.019, "{}", text(&report));
    }
}

#[test]
fn one_unit_with_each_fault_is_never_passed() {
    let report = measured(&campaign(1, &[Part::Faults]));
    assert_eq!(unmet(&report), Vec::<String>::new(), "{}", text(&report));
    let all: u64 = report.faults.iter().map(|row| row.outcomes.all()).sum();
    assert_eq!(all, 24, "{}", text(&report));
}

/// The committed table was not written by another campaign than its head says, and
/// what it says of its goals is so.
#[test]
fn the_committed_table_is_of_four_thousand_units() {
    let table = include_str!("../../tests/data/known-truth.txt");
    assert!(table.starts_with("known truth: 4000 units in each population, seed 1,"));
    let unmet = table
        .lines()
        .filter(|line| line.starts_with("NOT MET"))
        .count();
    let goals = table.lines().find_map(|line| line.strip_prefix("goals: "));
    let words: Vec<&str> = goals.unwrap().split(' ').collect();
    let [met, all]: [usize; 2] = [words[0], words[2]].map(|n| n.parse().unwrap());
    assert_eq!(all - met, unmet, "{table}");
}
