//! A report as text for people and as CSV.

use std::fmt::Write;

use super::coverage::Coverage;
use super::outcomes::Outcomes;
use super::proportion::Proportion;
use super::report::{Report, TIME_SAVED, drawn_words, named};

/// The whole report. It holds nothing that differs between two machines.
pub fn text(report: &Report) -> String {
    let mut out = format!(
        "known truth: {} units in each population, seed {}, {} runs\n",
        report.units, report.seed, report.runs
    );
    let about = [
        (
            "coverage of U, errors drawn as the budget states them (goal: at least 94.5 %)",
            &report.good,
        ),
        (
            "control: the same standard uncertainties, all normal (goal: 95.45 +-1 %)",
            &report.control,
        ),
    ];
    for (title, rows) in about {
        if !rows.is_empty() {
            coverage(&mut out, title, rows);
        }
    }
    limit(&mut out, report);
    places(&mut out, report);
    faults(&mut out, report);
    early(&mut out, report);
    goals(&mut out, report);
    out
}

fn title(out: &mut String, text: &str) {
    let _ = writeln!(out, "\n{text}");
}

fn percent(share: f64) -> String {
    format!("{:.2}", 100.0 * share)
}

fn coverage(out: &mut String, about: &str, rows: &[Coverage]) {
    title(out, about);
    let _ = writeln!(
        out,
        "{:38} {:>6} {:>7} {:>8} {:>15} {:>6} {:>9} {:>7} {:>6}",
        "", "values", "without", "covers %", "interval 95 %", "k", "U", "pull", "sd"
    );
    for row in rows {
        let (low, high) = row.covered.interval();
        let _ = writeln!(
            out,
            "{:38} {:>6} {:>7} {:>8} {:>15} {:>6.3} {:>7.4} {} {:>+7.3} {:>6.3}",
            named(row),
            row.covered.of,
            row.without,
            row.covered.share().map_or("-".to_owned(), percent),
            format!("{} to {}", percent(low), percent(high)),
            row.mean_k(),
            row.mean_expanded(),
            row.quantity.unit(),
            row.mean_pull(),
            row.pull_deviation(),
        );
    }
    let _ = writeln!(
        out,
        "pull: mean of (value - truth) / u; sd: its standard deviation"
    );
}

fn limit(out: &mut String, report: &Report) {
    let Some(first) = report.limit.first() else {
        return;
    };
    let about = format!(
        "false passes of a truth exactly on its limit, w = U, {} draws (goal: at most {} %)",
        first.passes.of,
        percent(first.goal())
    );
    title(out, &about);
    for row in &report.limit {
        let share = row.passes.share().unwrap_or(0.0);
        let (low, high) = row.passes.interval();
        let (of, drawn) = (&row.of, drawn_words(row.drawn));
        let (share, low, high) = (percent(share), percent(low), percent(high));
        let _ = writeln!(out, "{of:40} {drawn:11} {share:>6} % ({low} to {high})");
    }
}

fn outcome_cells(outcomes: &Outcomes) -> String {
    outcomes.counts.iter().fold(String::new(), |mut text, n| {
        let _ = write!(text, " {n:>9}");
        text
    })
}

const OUTCOMES: &str = "      pass cond.pass cond.fail      fail not judged";

fn places(out: &mut String, report: &Report) {
    if report.places.is_empty() {
        return;
    }
    title(out, "verdicts by where the unit's truth lies");
    let _ = writeln!(out, "{:44} {:>6} {OUTCOMES}", "", "units");
    for (place, outcomes) in &report.places {
        let (words, all) = (place.words(), outcomes.all());
        let cells = outcome_cells(outcomes);
        let _ = writeln!(out, "{words:44} {all:>6} {cells}");
    }
}

fn faults(out: &mut String, report: &Report) {
    if report.faults.is_empty() {
        return;
    }
    title(
        out,
        "faults of unit and sensor (goal: none passed, conditionally or not)",
    );
    let _ = writeln!(out, "{:44} {:>6} {OUTCOMES}", "", "units");
    for row in &report.faults {
        let words = format!("{}, {}", row.fault, row.kind.words());
        let (all, cells) = (row.outcomes.all(), outcome_cells(&row.outcomes));
        let _ = writeln!(out, "{words:44} {all:>6} {cells}");
    }
}

fn early(out: &mut String, report: &Report) {
    if report.early.is_empty() {
        return;
    }
    let aim = percent(TIME_SAVED);
    let about = format!(
        "early finish, the same units with and without (aim: {aim} % of the soak time saved, \
         no fail becomes a pass)"
    );
    title(out, &about);
    let _ = writeln!(
        out,
        "{:22} {:>6} {:>10} {:>8} {:>8} {:>8} {:>10} {:>13} {:>12}",
        "",
        "units",
        "soak h",
        "early h",
        "saved %",
        "changed",
        "across",
        "fail to pass",
        "U covers %"
    );
    for row in &report.early {
        let covers = |of: Proportion| of.share().map_or("-".to_owned(), percent);
        let _ = writeln!(
            out,
            "{:22} {:>6} {:>10.1} {:>8.1} {:>8} {:>8} {:>10} {:>13} {:>5} W {:>5} K",
            row.kind.words(),
            row.units,
            row.usual_s / 3600.0,
            row.early_s / 3600.0,
            percent(row.saved()),
            row.changed,
            row.across,
            row.to_pass,
            covers(row.power),
            covers(row.worst),
        );
    }
    let _ = writeln!(
        out,
        "changed: verdicts; across: from a failing outcome to a passing one, conditional ones included"
    );
}

fn goals(out: &mut String, report: &Report) {
    let goals = report.goals();
    let met = goals.iter().filter(|goal| goal.met).count();
    title(out, &format!("goals: {met} of {} met", goals.len()));
    for goal in goals.iter().filter(|goal| !goal.met) {
        let _ = writeln!(out, "NOT MET  {}", goal.what);
    }
}

/// The numbers of the report, a row for each: `part,what,number,value`.
pub fn csv(report: &Report) -> String {
    let mut out = String::from("part,what,number,value\n");
    let mut row = |part: &str, what: &str, number: &str, value: f64| {
        let _ = writeln!(out, "{part},\"{what}\",{number},{value}");
    };
    row("campaign", "", "units", report.units as f64);
    row("campaign", "", "seed", report.seed as f64);
    row("campaign", "", "runs", report.runs as f64);
    for (part, rows) in [("good", &report.good), ("control", &report.control)] {
        for coverage in rows {
            let what = named(coverage);
            let (low, high) = coverage.covered.interval();
            for (number, value) in [
                ("values", coverage.covered.of as f64),
                ("without", coverage.without as f64),
                ("covered", coverage.covered.count as f64),
                ("interval_low", low),
                ("interval_high", high),
                ("mean_k", coverage.mean_k()),
                ("mean_expanded_u", coverage.mean_expanded()),
                ("mean_pull", coverage.mean_pull()),
                ("pull_deviation", coverage.pull_deviation()),
            ] {
                row(part, &what, number, value);
            }
        }
    }
    for at_limit in &report.limit {
        let what = format!("{}, {}", at_limit.of, drawn_words(at_limit.drawn));
        row("limit", &what, "draws", at_limit.passes.of as f64);
        row("limit", &what, "passes", at_limit.passes.count as f64);
    }
    let places = report
        .places
        .iter()
        .map(|(p, o)| ("place", p.words().to_owned(), o));
    let faults = report.faults.iter().map(|f| {
        let what = format!("{}, {}", f.fault, f.kind.words());
        ("fault", what, &f.outcomes)
    });
    for (part, what, outcomes) in places.chain(faults) {
        for outcome in Outcomes::ORDER {
            row(part, &what, outcome.word(), outcomes.of(outcome) as f64);
        }
    }
    for early in &report.early {
        for (number, value) in [
            ("units", early.units as f64),
            ("soaked_s_without", early.usual_s),
            ("soaked_s_with", early.early_s),
            ("verdicts_changed", early.changed as f64),
            ("across", early.across as f64),
            ("fail_to_pass", early.to_pass as f64),
            ("power_values", early.power.of as f64),
            ("power_covered", early.power.count as f64),
            ("worst_case_values", early.worst.of as f64),
            ("worst_case_covered", early.worst.count as f64),
        ] {
            row("early finish", early.kind.words(), number, value);
        }
    }
    out
}
