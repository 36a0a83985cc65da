//! What the bench must have for the roles.

use super::*;

#[test]
fn a_role_that_the_bay_does_not_fill_is_pointed_at_with_the_nearest() {
    let text = changed(
        dryer(),
        "  enclosure: temperature\n",
        "  enclosur: temperature\n",
    );
    let text = changed(&text, "role: enclosure", "role: enclosur");
    cross(&text, BENCH)
        .refuses(
            "enclosur",
            "bay `bay 1` has no instrument for the role `enclosur`",
            "mean `enclosure`?",
        )
        .only();
    let text = changed(
        dryer(),
        "  enclosure: temperature\n",
        "  enclosure: temperature\n  outlet: temperature\n",
    );
    cross(&text, BENCH)
        .refuses(
            "outlet",
            "no instrument for the role",
            "the bay fills: supply, meter, body",
        )
        .only();
}

#[test]
fn names_in_the_bench_that_lead_nowhere_are_pointed_at() {
    for (from, to, at, message, hint) in [
        (
            "meter: {instrument: meter}",
            "meter: {instrument: metre}",
            "metre",
            "no instrument `metre`",
            "did you mean `meter`",
        ),
        (
            "driver: scpi-power-meter",
            "driver: scpi-powermeter",
            "scpi-powermeter",
            "no driver `scpi-powermeter`",
            "did you mean `scpi-power-meter`",
        ),
        (
            "line: meter line",
            "line: metre line",
            "metre line",
            "no line `metre line`",
            "did you mean `meter line`",
        ),
    ] {
        cross(dryer(), &changed(BENCH, from, to))
            .refuses(at, message, hint)
            .only();
    }
}

#[test]
fn a_bay_that_does_not_exist_is_told_with_the_nearest() {
    let mut crossing = Crossing::of(dryer(), BENCH);
    crossing.bay = Some("bay 2");
    crossing
        .resolve()
        .refuses("Virtual demo bench", "no bay `bay 2`", "mean `bay 1`?")
        .only();
    crossing.bay = Some("bay 1");
    crossing.resolve().is_clean();
}

#[test]
fn of_several_bays_the_first_counts_and_another_is_chosen_by_name() {
    let bays = BENCH.split_once("bays:\n").unwrap().1;
    let second = bays
        .replace("bay 1", "bay 2")
        .replace("channel: 3", "channel: 6");
    let mut crossing = Crossing::of(dryer(), &format!("{BENCH}{second}"));
    let enclosure = |crossing: &Crossing| {
        let plan = crossing.resolve().plan.unwrap();
        let (_, role) = plan.role("enclosure").unwrap();
        (plan.bay.name.clone(), role.channel)
    };
    assert_eq!(enclosure(&crossing), ("bay 1".to_owned(), Some(3)));
    crossing.bay = Some("bay 2");
    assert_eq!(enclosure(&crossing), ("bay 2".to_owned(), Some(6)));
}

#[test]
fn only_lines_and_instruments_that_the_roles_need_are_planned() {
    let plan = planned(FLAT);
    let names: Vec<&str> = plan.instruments.iter().map(|i| i.name.as_str()).collect();
    assert_eq!(names, ["supply", "meter", "scanner"]);
    assert_eq!(plan.lines.len(), 3);
}

#[test]
fn a_channel_above_the_drivers_is_refused_and_its_last_is_not() {
    let bench = changed(BENCH, "channel: 3", "channel: 9");
    cross(dryer(), &bench)
        .refuses("9", "`scanner` has no channel 9", "1 to 8")
        .only();
    cross(dryer(), &changed(BENCH, "channel: 3", "channel: 8")).is_clean();
}

#[test]
fn a_missing_channel_and_one_too_many_are_pointed_at() {
    let bench = changed(
        BENCH,
        "{instrument: scanner, channel: 2}",
        "{instrument: scanner}",
    );
    cross(dryer(), &bench)
        .refuses(
            "scanner",
            "role `ambient` names no channel",
            "add `channel: 1`",
        )
        .only();
    let bench = changed(
        BENCH,
        "meter: {instrument: meter}",
        "meter: {instrument: meter, channel: 4}",
    );
    cross(dryer(), &bench)
        .refuses("4", "`meter` has no channels", "take the channel out")
        .only();
}

#[test]
fn one_channel_for_two_roles_is_refused() {
    let bench = changed(BENCH, "channel: 2", "channel: 1");
    cross(dryer(), &bench)
        .refuses(
            "ambient",
            "`body` and `ambient` are filled by the same channel",
            "of its own",
        )
        .only();
}

#[test]
fn an_instrument_of_another_kind_can_not_fill_a_role() {
    let bench = changed(
        BENCH,
        "meter: {instrument: meter}",
        "meter: {instrument: supply}",
    );
    cross(dryer(), &bench)
        .refuses(
            "supply",
            "can't fill the role `meter`, a power meter",
            "it fills: supply",
        )
        .only();
}

#[test]
fn what_a_driver_lacks_for_its_role_is_named() {
    use crate::quantity::Reading;
    type Change = fn(&mut Driver);
    let cases: [(&str, Change, &str, &str); 9] = [
        (
            "supply",
            |d| d.settings.voltage = None,
            "supply",
            "settings: voltage",
        ),
        (
            "supply",
            |d| d.settings.output_on = None,
            "supply",
            "settings: output on",
        ),
        (
            "supply",
            |d| d.settings.output_off = None,
            "supply",
            "settings: output off",
        ),
        (
            "supply",
            |d| d.settings.output_state = None,
            "supply",
            "settings: output state",
        ),
        (
            "switch",
            |d| d.settings.position = None,
            "switch",
            "settings: position",
        ),
        (
            "meter",
            |d| lose(d, Reading::Power),
            "meter",
            "a reading of power",
        ),
        (
            "meter",
            |d| lose(d, Reading::Current),
            "meter",
            "a reading of current",
        ),
        (
            "meter",
            |d| lose(d, Reading::Voltage),
            "meter",
            "a reading of voltage",
        ),
        (
            "scanner",
            |d| lose(d, Reading::Temperature),
            "scanner",
            "a reading of temperature",
        ),
    ];
    for (driver, change, at, lacks) in cases {
        let name = shipped_drivers()
            .into_iter()
            .map(|d| d.name)
            .find(|name| name.ends_with(driver))
            .unwrap();
        let resolved = Crossing::of(dryer(), BENCH).driver(&name, change).resolve();
        let found = resolved.problems.iter().filter(|p| {
            p.weight == Weight::Error
                && p.place.text() == at
                && p.message.contains(&format!("lacks {lacks}"))
                && p.hint.as_ref().is_some_and(|h| h.contains("manual"))
        });
        // A scanner fills three roles, each at its own place.
        let expected = if driver == "scanner" { 3 } else { 1 };
        assert_eq!(
            found.count(),
            expected,
            "{}",
            spec::render(&resolved.problems)
        );
        assert_eq!(resolved.problems.len(), expected);
    }
}

fn lose(driver: &mut Driver, reading: crate::quantity::Reading) {
    for query in &mut driver.readings {
        query.gives.retain(|given| *given != reading);
    }
}

#[test]
fn a_driver_without_accuracy_is_warned_of() {
    let resolved = Crossing::of(dryer(), BENCH)
        .driver("scpi-power-meter", |driver| driver.accuracy.clear())
        .resolve();
    for reading in ["voltage", "current", "power"] {
        resolved.warns(
            "meter",
            &format!("no accuracy of {reading}:"),
            "`accuracy:`",
        );
    }
    assert!(resolved.plan.is_some());
}

#[test]
fn two_lines_on_one_port_are_warned_of() {
    let bench = BENCH.replace("port: virtual", "port: /dev/ttyS9");
    let resolved = cross(dryer(), &bench);
    resolved
        .warns(
            "meter line",
            "`supply line` and `meter line` name the same port, /dev/ttyS9",
            "of its own",
        )
        .warns("switch line", "name the same port", "of its own");
}

/// The demo bench on real ports.
fn real() -> String {
    let mut bench = BENCH.to_owned();
    for n in 0..4 {
        bench = changed(&bench, "port: virtual", &format!("port: /dev/ttyS{n}"));
    }
    bench
}

#[test]
fn a_due_date_that_has_passed_is_warned_of_and_one_of_today_is_not() {
    for bench in [real(), BENCH.to_owned()] {
        let late = changed(&bench, "due: 2099-12-31", "due: 2026-11-30");
        cross(dryer(), &late)
            .warns(
                "meter",
                "the calibration of `meter` was due on 2026-11-30",
                "have it calibrated",
            )
            .only();
        let today = changed(&bench, "due: 2099-12-31", "due: 2026-12-01");
        cross(dryer(), &today).is_clean();
        let mut timeless = Crossing::of(dryer(), &late);
        timeless.today = None;
        timeless.resolve().is_clean();
    }
}

#[test]
fn a_certificate_and_a_due_date_are_asked_for_on_real_lines_only() {
    for line in ["    certificate: none, virtual\n", "    due: 2099-12-31\n"] {
        cross(dryer(), &changed(BENCH, line, "")).is_clean();
    }
    let bench = changed(&real(), "    certificate: none, virtual\n", "");
    cross(dryer(), &bench)
        .warns(
            "meter",
            "`meter` names no calibration certificate",
            "add `certificate:`",
        )
        .only();
    let bench = changed(&real(), "    due: 2099-12-31\n", "");
    cross(dryer(), &bench)
        .warns("meter", "`meter` states no due date", "add `due:")
        .only();
    // Supply and switch read nothing.
    cross(dryer(), &real()).is_clean();
}
