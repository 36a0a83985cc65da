//! What pictures must show whatever the record holds.

use super::example::{self, Behaviour, DRYER, Staged, estimate, finding, sample};
use super::{Picture, draw, power_panels};
use crate::analysis::Figure;
use crate::judge::Outcome;
use crate::quantity::Celsius;

/// Leaves the pictures to be looked at where the environment asks for it.
fn look(name: &str, pictures: &[Picture]) {
    if std::env::var_os("RATEPLATE_LOOK").is_none() {
        return;
    }
    let folder = std::path::Path::new(env!("CARGO_MANIFEST_DIR"))
        .join("target/chart-looks")
        .join(name);
    std::fs::create_dir_all(&folder).unwrap();
    for picture in pictures {
        std::fs::write(folder.join(&picture.name), &picture.png).unwrap();
    }
}

fn drawn(name: &str, staged: &Staged) -> Vec<Picture> {
    let pictures = draw(&staged.scene()).unwrap();
    look(name, &pictures);
    for picture in &pictures {
        let (width, height, rgb) = decoded(picture);
        assert_eq!(width, 1600, "{}", picture.name);
        assert!((900..2200).contains(&height), "{}", picture.name);
        assert_eq!(rgb.len(), 3 * width * height);
        let stem = picture.name.strip_suffix(".png").unwrap();
        let safe = |c: char| c.is_ascii_lowercase() || c.is_ascii_digit() || c == '-';
        assert!(stem.chars().all(safe) && stem.len() < 80, "{stem}");
    }
    pictures
}

fn decoded(picture: &Picture) -> (usize, usize, Vec<u8>) {
    let decoder = png::Decoder::new(std::io::Cursor::new(&picture.png));
    let mut reader = decoder.read_info().unwrap();
    let mut rgb = vec![0; reader.output_buffer_size().unwrap()];
    let info = reader.next_frame(&mut rgb).unwrap();
    (info.width as usize, info.height as usize, rgb)
}

fn dryer() -> Staged {
    let low = Behaviour {
        peak: 12.0,
        settled: 4.4,
        rise: 46.0,
        ..DRYER
    };
    let dry = Behaviour {
        rise: 61.0,
        ..DRYER
    };
    example::stage(
        "Nordlicht CD-9",
        &[
            (Some("refill full"), "low", 4.5, low),
            (Some("refill full"), "high", 9.0, DRYER),
            (Some("dry"), "low", 4.5, low),
            (Some("dry"), "high", 9.0, dry),
        ],
    )
}

fn one_cell() -> Staged {
    example::stage("Nordlicht CD-9", &[(None, "high", 9.0, DRYER)])
}

fn heater() -> Staged {
    let low = Behaviour {
        peak: 1400.0,
        settled: 742.0,
        fall: 9.0,
        noise: 4.0,
        ..DRYER
    };
    let high = Behaviour {
        peak: 2650.0,
        settled: 1620.0,
        ..low
    };
    let mut staged = example::stage(
        "Sturmhut FH-1500",
        &[(None, "low", 750.0, low), (None, "high", 1500.0, high)],
    );
    staged.virtual_bench = false;
    staged
}

fn towel_warmer() -> Staged {
    let cycling = Behaviour {
        peak: 62.0,
        settled: 60.0,
        fall: 30.0,
        rise: 44.0,
        after_heat: 0.0,
        cycle: Some((70.0, 62.0)),
        noise: 0.3,
    };
    let mut staged = example::stage(
        "Lindenhof TW-60",
        &[
            (Some("towel on"), "on", 60.0, cycling),
            (Some("bare"), "on", 60.0, cycling),
        ],
    );
    staged.plan.appliance.link = None;
    staged.plan.appliance.thermostat = true;
    staged
}

#[test]
fn a_judged_dryer() {
    let pictures = drawn("dryer", &dryer());
    let names: Vec<&str> = pictures.iter().map(|p| p.name.as_str()).collect();
    assert_eq!(
        names[..3],
        [
            "summary.png",
            "power-01-refill-full-low-230v-50hz.png",
            "temperature-01-refill-full-low-230v-50hz.png",
        ]
    );
    assert_eq!(names.len(), 9);
}

#[test]
fn a_heater_above_its_band_and_a_cycling_load_without_a_link() {
    assert_eq!(drawn("heater", &heater()).len(), 5);
    assert_eq!(drawn("towel", &towel_warmer()).len(), 5);
}

#[test]
fn the_same_scene_gives_the_same_bytes() {
    let staged = one_cell();
    assert_eq!(
        draw(&staged.scene()).unwrap(),
        draw(&staged.scene()).unwrap()
    );
}

#[test]
fn a_virtual_bench_marks_every_part_of_every_picture() {
    let mut staged = one_cell();
    let marked = drawn("marked", &staged);
    staged.virtual_bench = false;
    for (marked, plain) in marked.iter().zip(drawn("plain", &staged)) {
        let (width, height, with) = decoded(marked);
        let (_, _, without) = decoded(&plain);
        let needle: &[u8] = b"VIRTUAL BENCH";
        let says = |png: &[u8]| png.windows(needle.len()).any(|bytes| bytes == needle);
        assert!(says(&marked.png) && !says(&plain.png));
        // No crop of this size is without the mark.
        for top in (0..height - 200).step_by(100) {
            for left in (0..width - 320).step_by(80) {
                let differs = (top..top + 200).any(|y| {
                    let row = 3 * (y * width + left)..3 * (y * width + left + 320);
                    with[row.clone()] != without[row]
                });
                assert!(differs, "{} at {left}, {top}", marked.name);
            }
        }
    }
}

/// One sample of many stands out, in the switch-on and in the soak: the line climbs
/// through the panel there, and only there.
#[test]
fn ink_stands_where_the_peak_is() {
    let (fast, slow) = (power_panels::SWITCH_ON_SIDES, power_panels::SOAK_SIDES);
    for (t, step, share, sides) in [
        (30.0, 2, (30.0 + 1.2) / 61.2, fast),
        (600.0, 3, 600.3 / 1260.0, slow),
    ] {
        let mut staged = one_cell();
        staged.virtual_bench = false;
        let spike = sample(0, step, example::METER, 412.3 + t, Some(40.0));
        let place = staged
            .samples
            .partition_point(|row| row.reply < spike.reply);
        staged.samples.insert(place, spike);
        let (width, height, rgb) = decoded(&drawn("spike", &staged)[1]);
        let column = (sides.0 + share * (sides.1 - sides.0)) as usize;
        let dark = |x: usize| {
            let rows = height / 3..height / 2;
            rows.filter(|y| {
                let at = 3 * (y * width + x);
                u32::from(rgb[at]) + u32::from(rgb[at + 2]) < 300
            })
            .count()
        };
        let near = (column - 3..column + 4).map(dark).max();
        assert!(near > Some(100), "{t}: {near:?}");
        assert!(dark(column + 25) < 20, "{t}");
    }
}

/// Pixels of the power's colour in the soak panel's column at `t` seconds.
fn power_ink(picture: &Picture, t: f64) -> usize {
    let (width, height, rgb) = decoded(picture);
    let (left, right) = power_panels::SOAK_SIDES;
    let column = (left + (right - left) * (t + 0.3) / 1260.0) as usize;
    let is_power = |y: &usize| {
        let at = 3 * (y * width + column);
        i32::from(rgb[at + 2]) - i32::from(rgb[at]) > 70
    };
    (300..height - 80).filter(is_power).count()
}

#[test]
fn where_samples_are_missing_or_bad_the_line_has_a_gap() {
    let mut whole = one_cell();
    whole.virtual_bench = false;
    let whole = &drawn("whole", &whole)[1];
    let (_, mut staged) = degenerate()
        .into_iter()
        .find(|(name, _)| *name == "gaps")
        .unwrap();
    staged.virtual_bench = false;
    let gaps = &drawn("gaps", &staged)[1];
    for (t, is_gap) in [(300.0, false), (450.0, true), (600.0, false), (730.0, true)] {
        assert!(power_ink(whole, t) > 0, "{t}");
        assert_eq!(power_ink(gaps, t) == 0, is_gap, "{t}");
    }
}

/// Every way in which a record can be poor.
fn degenerate() -> Vec<(&'static str, Staged)> {
    let mut all = Vec::new();
    let mut add = |name, change: &dyn Fn(&mut Staged)| {
        let mut staged = one_cell();
        change(&mut staged);
        all.push((name, staged));
    };
    let unknown = |staged: &mut Staged| {
        let cell = &mut staged.analysis.cells[0];
        let why = "the run was stopped by the operator after 3 min, before the soak was settled";
        cell.inrush = Figure::Absent("the first current was not seen: the meter was lost".into());
        cell.settled_s = Figure::Absent(why.into());
        cell.steady = Figure::Absent(why.into());
        cell.body_peak = Figure::Absent("the body's sensor has fallen off".into());
        cell.body_worst = Figure::Absent("the body's sensor has fallen off".into());
        cell.disbelief = vec!["the body fell by 20 K while the power was steady".into()];
        staged.judgement.verdict = Outcome::NotJudged;
        staged.judgement.because = why.into();
    };
    add("absent", &unknown);
    add("not-run", &|staged| {
        unknown(staged);
        staged.samples.clear();
        staged.analysis.cells[0].energised_s = Figure::Absent("not run".into());
        staged.analysis.cells[0].off_s = Figure::Absent("not run".into());
    });
    add("empty", &|staged| {
        staged.samples.clear();
        staged.analysis.cells.clear();
        staged.judgement.findings.clear();
        staged.plan.rules.clear();
        staged.plan.bay.roles.clear();
        staged.plan.steps.clear();
        staged.plan.appliance.plate.clear();
        staged.plan.appliance.link = None;
    });
    add("no-cells", &|staged| {
        staged.plan.cells.clear();
        staged.analysis.cells.clear();
    });
    add("one-sample", &|staged| staged.samples.truncate(1));
    add("two-samples", &|staged| {
        staged.samples = vec![
            sample(0, 2, example::METER, 412.3, Some(9.0)),
            sample(0, 2, example::BODY, 412.3, Some(22.0)),
        ];
    });
    add("all-equal", &|staged| {
        for row in &mut staged.samples {
            *row = sample(0, row.step, row.role, row.request.as_secs_f64(), Some(0.0));
        }
    });
    add("nothing-but-failures", &|staged| {
        for row in &mut staged.samples {
            *row = sample(0, row.step, row.role, row.request.as_secs_f64(), None);
        }
    });
    add("huge", &|staged| {
        for (n, row) in staged.samples.iter_mut().enumerate() {
            let value = if n % 2 == 0 { 1e308 } else { -1e308 };
            *row = sample(
                0,
                row.step,
                row.role,
                row.request.as_secs_f64(),
                Some(value),
            );
        }
        let cell = &mut staged.analysis.cells[0];
        if let Figure::Known(steady) = &mut cell.steady {
            steady.power_w = estimate(1e300, f64::INFINITY);
            steady.from_s = f64::NEG_INFINITY;
        }
        cell.body_worst = Figure::Known(estimate(f64::NAN, f64::NAN));
        cell.energised_s = Figure::Known(f64::NAN);
        cell.off_s = Figure::Known(1e300);
    });
    add("gaps", &|staged| {
        for row in &mut staged.samples {
            let t = row.request.as_secs_f64() - 412.0;
            if (400.0..500.0).contains(&t) {
                *row = sample(0, row.step, row.role, row.request.as_secs_f64(), None);
            }
        }
        let gone = |t: f64| (700.0..760.0).contains(&(t - 412.0));
        staged
            .samples
            .retain(|row| !gone(row.request.as_secs_f64()));
    });
    add("out-of-order", &|staged| staged.samples.reverse());
    add("hostile-words", &|staged| {
        staged.unit = "../../x\u{0}\u{1b}[2J\u{202e}".repeat(60);
        staged.plan.title = "漢字 \n\r\t".repeat(100);
        staged.plan.appliance.model = "x".repeat(5000);
        staged.plan.cells[0].position = "../up\\down \u{7}".repeat(30);
        staged.plan.cells[0].condition = Some("C:\\con|?*".to_owned());
        staged.judgement.because = "because ".repeat(500);
        staged.plan.bay.roles[4].name = "a very long role's name that has no end at all".into();
    });
    add("near-limits", &|staged| {
        let link = staged.plan.appliance.link.as_mut().unwrap();
        link.th = Some(Celsius::of(110.0));
        let cell = &mut staged.analysis.cells[0];
        cell.body_worst = Figure::Known(estimate(110.5, 1.9));
        for n in 0..12 {
            let mut role = staged.plan.bay.roles[4].clone();
            role.name = format!("shell {n}");
            staged.plan.bay.roles.push(role);
        }
        let rows: Vec<_> = staged
            .samples
            .iter()
            .filter(|row| row.role == 4)
            .cloned()
            .collect();
        for (n, row) in rows.iter().enumerate() {
            let mut row = row.clone();
            row.role = 5 + n % 12;
            staged.samples.push(row);
        }
        staged.samples.sort_by_key(|row| row.reply);
    });
    all
}

#[test]
fn no_record_is_too_poor_to_be_drawn() {
    for (name, staged) in degenerate() {
        let pictures = drawn(name, &staged);
        assert_eq!(pictures.len(), 1 + 2 * staged.plan.cells.len(), "{name}");
    }
}

#[test]
fn many_cells_have_names_and_rows_of_their_own() {
    let positions = ["low", "mid", "high"];
    let conditions = ["refill full", "dry", "upside down", "towel on"];
    let mut cells = Vec::new();
    for condition in conditions {
        for (n, position) in positions.into_iter().enumerate() {
            let settled = [3.1, 4.6, 9.3][n];
            let unit = Behaviour { settled, ..DRYER };
            cells.push((Some(condition), position, [3.0, 4.5, 9.0][n], unit));
        }
    }
    cells.push((Some("dry!"), "high", 9.0, DRYER));
    let mut staged = example::stage("Nordlicht CD-9", &cells);
    for n in 0..30 {
        let outcome = if n == 7 {
            Outcome::Fail
        } else {
            Outcome::NotJudged
        };
        staged
            .judgement
            .findings
            .push(finding("looked", None, outcome));
    }
    let pictures = drawn("many", &staged);
    assert_eq!(pictures[0].name, "summary-1.png");
    assert_eq!(pictures[1].name, "summary-2.png");
    let mut names: Vec<&str> = pictures.iter().map(|p| p.name.as_str()).collect();
    names.sort_unstable();
    names.dedup();
    assert_eq!(names.len(), 2 + 2 * 13);
}
