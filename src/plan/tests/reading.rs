//! The shipped sequences, the plan as JSON and as text.

use super::*;

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
        assert!(resolved.plan.is_some());
    }
}

#[test]
fn a_plan_reads_back_from_json_as_it_was() {
    let shipped = shipped::SEQUENCES.iter().map(|file| file.text);
    for text in shipped.chain([FLAT]) {
        let plan = planned(text);
        let json = serde_json::to_string_pretty(&plan).unwrap();
        assert_eq!(serde_json::from_str::<Plan>(&json).unwrap(), plan);
        assert_eq!(plan.format, PLAN_FORMAT);
    }
}

#[test]
fn the_text_of_every_plan_fits_into_eighty_columns_and_names_what_matters() {
    let shipped = shipped::SEQUENCES.iter().map(|file| file.text);
    for text in shipped.chain([FLAT]) {
        let plan = planned(text);
        let lines = plan.lines_of_text();
        for line in &lines {
            assert!(line.chars().count() <= 80, "{line}");
            assert_eq!(line.trim_end(), line);
        }
        let text = lines.join("\n");
        for name in [
            &plan.title,
            &plan.edition,
            &plan.appliance.model,
            &plan.bench,
        ] {
            assert!(text.contains(name.as_str()), "{name}");
        }
        for instrument in &plan.instruments {
            assert!(text.contains(&instrument.identity), "{text}");
        }
        let numbers = plan
            .steps
            .iter()
            .map(|step| format!("  {:>3} ", step.number));
        for number in numbers {
            let at_start = lines.iter().filter(|line| line.starts_with(&number));
            assert_eq!(at_start.count(), 1, "{number:?}");
        }
    }
}

#[test]
fn the_text_of_the_dryer_says_guards_cells_limits_sources_and_times() {
    // However the lines break.
    let text = planned(dryer()).lines_of_text().join(" ");
    let text = text.split_whitespace().collect::<Vec<_>>().join(" ");
    for part in [
        "Cupboard dryer, incoming qualification, edition 1",
        "Nordlicht CD-9: combined, class II, fan, used up to 35 °C",
        "low: 4.5 W, 220 V to 240 V, 50 Hz",
        "Tf 121 °C, Th 100 °C, Tm 175 °C",
        "fills body (channel 1, clamped), ambient (channel 2), enclosure (channel 3, taped); RATEPLATE,VIRTUAL-SCANNER",
        "calibration due 2099-12-31",
        "111 °C, Tf - 10 K (house default)",
        "low: 7.02 W, high: 14.04 W; from 5 min",
        "2 s beyond the polling interval",
        "-- refill full, low, 230 V, 50 Hz",
        "by the switch",
        "Is the rating plate legible and complete? (yes or no; no is major)",
        "until slope over 5 min, power 2 % per hour",
        "low, 4.5 W at 230 V: at most 5.40 W, no lower limit",
        "source: IEC 60335-1 clause 10.1 (from memory of later editions, check against your copy)",
        "at most Th, 100 °C; required, four outcomes",
        "source: IEC 60691: Tf - 10 K, earliest opening",
        "enclosure at most 50 K above ambient; information",
        // 60 min / 2 + 4 x (2 min + 27.5 min + 2 min + 90 min / 2), and the longest.
        "expected about 5 h 36 min",
        "at the longest 10 h 16 min",
    ] {
        assert!(text.contains(part), "{part:?} is not in\n{text}");
    }
}

#[test]
fn expected_is_half_way_through_soaks_and_waits() {
    let plan = planned(FLAT);
    // 30 min + 20 min + 30 min + 20 min, and 60 + 30 + 60 + 30.
    assert_eq!(plan.expected.get(), 100.0 * 60.0);
    assert_eq!(plan.longest().get(), 180.0 * 60.0);
}

#[test]
fn sources_are_filled_where_the_sequence_is_silent() {
    let plan = planned(dryer());
    let sources: Vec<&str> = plan.rules.iter().map(|rule| rule.source.as_str()).collect();
    assert_eq!(
        sources,
        [
            "IEC 60335-1 clause 10.1 (from memory of later editions, check against your copy)",
            "IEC 60691: holding temperature Th of the part's data sheet",
            "IEC 60691: Tf - 10 K, earliest opening",
            "the declared order of positions",
            "house limit",
            "house limit",
        ]
    );
    let boot = planned(shipped_as("boot"));
    assert_eq!(boot.rules[1].source, "house limit");
}
