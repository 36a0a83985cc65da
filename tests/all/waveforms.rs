//! Waveforms from the meter through the record to the findings.

use std::path::Path;

use rateplate::analysis::waveform::HalfWave;
use rateplate::analysis::{Analysis, Input, analyse};
use rateplate::clock::Clock;
use rateplate::judge::{Finding, Outcome, judge};
use rateplate::plan::Plan;
use rateplate::quantity::Seconds;
use rateplate::record::{Event, Folder, FolderStore, RunOutcome};
use rateplate::spec::shipped;
use rateplate::virtual_bench::VirtualBench;

use crate::bench_of_tests::{Setup, bay, paused, plan_of, run_bay, virtual_bench};

/// The shipped boot warmer with short soaks and every rule that a waveform feeds.
fn boots() -> Plan {
    let shipped = shipped::SEQUENCES
        .iter()
        .find(|file| file.path.contains("boot-warmer"))
        .unwrap();
    let text = format!(
        "{}  - inrush: {{at most: 2 A}}\n  - inrush: {{momentary at most: 3 A}}\n  - harmonics: class A\n  \
         - voltage change: {{dmax: 4 %, dc: 3.3 %, time above 3.3 %: 500 ms}}\n",
        shipped.text
    );
    plan_of(&text)
}

/// Runs a plan on a bench and reads the record back.
fn run(plan: &Plan, bench: &VirtualBench, folder: &Path) -> Folder {
    paused().block_on(async {
        let clock = Clock::simulated();
        let store = FolderStore::create(&folder.join("run")).unwrap();
        let (_stop, stopped) = tokio::sync::watch::channel(false);
        let setup = Setup::willing(bench, &clock, stopped);
        run_bay(bay(plan, bench, Box::new(store), &clock, setup).unwrap()).await
    });
    Folder::open(folder).unwrap()
}

fn analysed(record: &Folder) -> Analysis {
    analyse(&Input {
        plan: &record.plan,
        samples: &record.samples,
        happenings: &record.happenings,
        waveforms: &record.waveforms,
        outcome: &record.manifest.outcome,
    })
}

fn findings(record: &Folder, analysis: &Analysis) -> Vec<Finding> {
    judge(&record.plan, &record.manifest.outcome, analysis).findings
}

fn find<'a>(findings: &'a [Finding], rule: &str, position: &str) -> &'a Finding {
    let found = findings
        .iter()
        .find(|f| f.rule.starts_with(rule) && f.position.as_deref() == Some(position));
    found.unwrap_or_else(|| panic!("no finding {rule}, {position}: {findings:#?}"))
}

fn near(found: f64, wanted: f64, share: f64) {
    assert!(
        (found / wanted - 1.0).abs() < share,
        "{found} is not {wanted}"
    );
}

#[test]
fn a_switch_on_is_taken_stored_and_judged() {
    let folder = tempfile::tempdir().unwrap();
    let plan = boots();
    let record = run(&plan, &virtual_bench(&plan, 1, &[]), folder.path());
    assert_eq!(record.manifest.outcome, RunOutcome::Complete);
    assert_eq!(record.waveforms.len(), 2);
    let names: Vec<&str> = record
        .manifest
        .files
        .iter()
        .map(|f| f.name.as_str())
        .collect();
    assert!(names.contains(&"waveform-cell-1.csv") && names.contains(&"waveform-cell-2.csv"));
    let analysis = analysed(&record);
    let [low, high] = &analysis.cells[..] else {
        panic!("two cells");
    };
    assert_eq!((&low.dc_lost, &high.dc_lost), (&None, &None));
    let (half, whole) = (
        low.waveform.known().unwrap(),
        high.waveform.known().unwrap(),
    );
    assert_eq!(half.shape.half_wave, HalfWave::Seen);
    assert_eq!(whole.shape.half_wave, HalfWave::None);
    // 588 ohm at 230 V: peak 0.5532 A; behind the diode DC 0.1761 A, RMS 0.2766 A,
    // factor 0.7071 (computed), the unit within 1 % of spread.
    near(whole.momentary_peak_a.value, 0.5532, 0.04);
    near(half.momentary_peak_a.value, 0.5532, 0.04);
    near(half.shape.tail.dc_a, 0.1761, 0.04);
    near(half.shape.tail.rms_a, 0.2766, 0.04);
    near(
        half.shape.tail.power_factor.unwrap(),
        std::f64::consts::FRAC_1_SQRT_2,
        0.01,
    );
    near(whole.shape.tail.power_factor.unwrap(), 1.0, 0.003);
    // The rows say the same as the waveform.
    let steady = high.steady.known().unwrap();
    near(whole.shape.tail.rms_a, steady.current_a.unwrap(), 0.01);
    near(whole.shape.tail.power_w, steady.power_w.value, 0.01);
    // d = 0.3912 A x 0.40 ohm / 230 V (computed).
    near(
        whole.change.known().unwrap().dmax.value,
        0.3912 * 0.4 / 230.0,
        0.04,
    );
    let inrush = high.inrush.known().unwrap();
    assert_eq!(
        (inrush.source_ohm, inrush.lower_bound.len()),
        (Some(0.0), 0)
    );
    assert!(inrush.switching_angle_deg.is_some());
    let findings = findings(&record, &analysis);
    for position in ["low", "high"] {
        for rule in ["inrush", "momentary inrush", "voltage change, dmax"] {
            let finding = find(&findings, rule, position);
            assert_eq!(finding.outcome, Outcome::Pass, "{finding:?}");
        }
        for rule in ["voltage change, dc", "voltage change, time above"] {
            let finding = find(&findings, rule, position);
            assert_eq!(finding.outcome, Outcome::Pass, "{finding:?}");
        }
    }
    // IEC 61000-3-2 class A: no limits up to 75 W (read).
    assert_eq!(find(&findings, "harmonics", "high").outcome, Outcome::Pass);
    let free = find(&findings, "harmonics", "low");
    assert!(free.reason.contains("no limits up to 75 W"), "{free:?}");
}

#[test]
fn a_waveform_that_was_changed_or_lacks_a_row_is_refused() {
    let folder = tempfile::tempdir().unwrap();
    let plan = boots();
    run(&plan, &virtual_bench(&plan, 1, &[]), folder.path());
    let file = folder.path().join("run/waveform-cell-1.csv");
    let text = std::fs::read_to_string(&file).unwrap();
    std::fs::write(&file, text.replacen("\n200,", "\n201,", 1)).unwrap();
    let error = Folder::open(folder.path()).unwrap_err().to_string();
    assert!(
        error.contains("waveform-cell-1.csv") && error.contains("was changed"),
        "{error}"
    );
    std::fs::remove_file(&file).unwrap();
    assert!(Folder::open(folder.path()).is_err());
}

#[test]
fn a_meter_that_loses_the_dc_part_is_found_and_its_power_stands() {
    let folder = tempfile::tempdir().unwrap();
    let plan = boots();
    let bench = virtual_bench(&plan, 2, &["meter-loses-dc"]);
    let record = run(&plan, &bench, folder.path());
    let mut analysis = analysed(&record);
    let low = &analysis.cells[0];
    let why = low.dc_lost.clone().unwrap();
    assert!(why.contains("loses the DC part"), "{why}");
    assert_eq!(low.steady.known().unwrap().current_a, None);
    assert_eq!(analysis.cells[1].dc_lost, None);
    let judged = findings(&record, &analysis);
    for rule in [
        "inrush",
        "momentary inrush",
        "harmonics",
        "voltage change, dmax",
    ] {
        let finding = find(&judged, rule, "low");
        assert_eq!(finding.outcome, Outcome::NotJudged, "{finding:?}");
        assert!(finding.reason.contains("DC part"), "{finding:?}");
        assert_eq!(find(&judged, rule, "high").outcome, Outcome::Pass);
    }
    assert_eq!(find(&judged, "power", "low").outcome, Outcome::Pass);
    // Without a waveform the power factor gives it away.
    analysis = analyse(&Input {
        plan: &record.plan,
        samples: &record.samples,
        happenings: &record.happenings,
        waveforms: &[],
        outcome: &record.manifest.outcome,
    });
    let why = analysis.cells[0].dc_lost.clone().unwrap();
    assert!(why.contains("power factor of 0.9"), "{why}");
}

#[test]
fn a_waveform_that_can_t_be_fetched_is_an_event_and_no_trip() {
    let mut plan = boots();
    let meter = plan
        .instruments
        .iter_mut()
        .find(|i| i.driver.waveform.is_some());
    let waveform = meter.unwrap().driver.waveform.as_mut().unwrap();
    // A block of 12 kB takes longer on this line.
    waveform.reply_within = Seconds::of(0.5);
    let folder = tempfile::tempdir().unwrap();
    let record = run(&plan, &virtual_bench(&plan, 1, &[]), folder.path());
    assert_eq!(record.manifest.outcome, RunOutcome::Complete);
    assert!(record.waveforms.is_empty());
    let failed = record.happenings.iter().filter_map(|h| match &h.event {
        Event::WaveformFailed { reason, .. } => Some(reason),
        _ => None,
    });
    let failed: Vec<&String> = failed.collect();
    assert_eq!(failed.len(), 2);
    let analysis = analysed(&record);
    let judged = findings(&record, &analysis);
    for rule in ["momentary inrush", "harmonics", "voltage change, dmax"] {
        let finding = find(&judged, rule, "high");
        assert_eq!(finding.outcome, Outcome::NotJudged);
        assert!(finding.reason.contains("was not fetched"), "{finding:?}");
    }
    // What rests on rows is judged all the same.
    assert_eq!(
        find(&judged, "power against", "high").outcome,
        Outcome::Pass
    );
}

#[test]
fn a_meter_that_dies_before_its_waveform_is_fetched_leaves_the_unit_off() {
    let plan = boots();
    let folder = tempfile::tempdir().unwrap();
    let bench = virtual_bench(&plan, 1, &["disconnect@8s"]);
    let record = run(&plan, &bench, folder.path());
    assert_ne!(record.manifest.outcome, RunOutcome::Complete);
    assert!(record.waveforms.is_empty());
    assert!(!bench.output_is_on());
}
