//! The tree tests itself: arrows between rooms, where printing happens, how files begin.

use std::collections::{BTreeMap, BTreeSet};
use std::fs;
use std::path::{Path, PathBuf};

fn root() -> PathBuf {
    PathBuf::from(env!("CARGO_MANIFEST_DIR"))
}

fn rust_files(folder: &Path) -> Vec<PathBuf> {
    let mut files = Vec::new();
    for entry in fs::read_dir(folder).unwrap() {
        let path = entry.unwrap().path();
        if path.is_dir() {
            files.extend(rust_files(&path));
        } else if path.extension().is_some_and(|e| e == "rs") {
            files.push(path);
        }
    }
    files.sort();
    files
}

/// The room of a file: its folder below `src`.
fn room_of(path: &Path) -> Option<String> {
    let inside = path.strip_prefix(root().join("src")).unwrap();
    let first = inside.components().next()?.as_os_str().to_str()?;
    (inside.components().count() > 1).then(|| first.to_owned())
}

/// The import table of DEVELOPERS.md: room -> rooms that it may import.
fn table() -> BTreeMap<String, BTreeSet<String>> {
    let text = fs::read_to_string(root().join("DEVELOPERS.md")).unwrap();
    let from = text
        .find("<!-- import table -->")
        .expect("DEVELOPERS.md marks its import table");
    let to = text[from..]
        .find("<!-- end -->")
        .expect("the table's end is marked")
        + from;
    let mut rooms = BTreeMap::new();
    for line in text[from..to]
        .lines()
        .filter(|line| line.starts_with("| `"))
    {
        let cells: Vec<&str> = line.trim_matches('|').split('|').map(str::trim).collect();
        let room = cells[0].trim_matches('`').to_owned();
        let imports = cells[2]
            .split(',')
            .map(|i| i.trim().trim_matches('`').to_owned());
        rooms.insert(
            room,
            imports.filter(|i| !i.is_empty() && i != "-").collect(),
        );
    }
    rooms
}

/// Whether a file holds tests only: `tests.rs`, or anything below a folder `tests`.
fn is_test(path: &Path) -> bool {
    path.components().any(|c| c.as_os_str() == "tests")
        || path.ends_with("tests.rs")
        || path.ends_with("demo_units.rs")
}

/// Code of a file without comments' and tests' lines.
fn code_of(path: &Path) -> String {
    let text = fs::read_to_string(path).unwrap();
    let text = text.split("#[cfg(test)]\nmod tests").next().unwrap();
    let kept = text
        .lines()
        .filter(|line| !line.trim_start().starts_with("//"));
    kept.collect::<Vec<_>>().join("\n")
}

/// Rooms that a text names by `crate::room` (also inside braces of one `use`).
fn imports_of(code: &str) -> BTreeSet<String> {
    let mut found = BTreeSet::new();
    for (at, _) in code.match_indices("crate::") {
        let rest = &code[at + "crate::".len()..];
        if let Some(group) = rest.strip_prefix('{') {
            let group = group.split('}').next().unwrap();
            let firsts = group
                .split(',')
                .filter_map(|part| part.trim().split("::").next());
            found.extend(firsts.map(str::to_owned).filter(|f| !f.is_empty()));
        } else {
            let name: String = rest
                .chars()
                .take_while(|c| c.is_alphanumeric() || *c == '_')
                .collect();
            found.insert(name);
        }
    }
    found
}

#[test]
fn arrows_between_rooms_run_only_as_the_table_says() {
    let table = table();
    let mut wrong = Vec::new();
    for path in rust_files(&root().join("src")) {
        let Some(room) = room_of(&path) else { continue };
        let allowed = table
            .get(&room)
            .unwrap_or_else(|| panic!("room `{room}` is not in the table"));
        for import in imports_of(&code_of(&path)) {
            let every = allowed.contains("every room");
            if import != room
                && !allowed.contains(&import)
                && !(every && table.contains_key(&import))
            {
                wrong.push(format!("{}: `{room}` imports `{import}`", path.display()));
            }
        }
    }
    assert!(wrong.is_empty(), "{}", wrong.join("\n"));
}

#[test]
fn the_table_names_every_room_and_has_no_circle() {
    let table = table();
    let rooms: BTreeSet<String> = rust_files(&root().join("src"))
        .iter()
        .filter_map(|path| room_of(path))
        .collect();
    assert_eq!(rooms, table.keys().cloned().collect());
    // Rooms can be taken away one by one, each when nothing that is left is imported by it.
    let mut left = table.clone();
    left.remove("cli");
    while !left.is_empty() {
        let free = left
            .iter()
            .find(|(_, imports)| imports.iter().all(|i| !left.contains_key(i)));
        let free = free
            .map(|(room, _)| room.clone())
            .expect("a circle among the rooms");
        left.remove(&free);
    }
}

#[test]
fn the_import_reader_sees_every_way_to_name_a_room() {
    let code = "use crate::{plan::Plan, spec};\nfn f(x: crate::bench::Line) {}\nuse crate::run;";
    let expected = ["bench", "plan", "run", "spec"].map(str::to_owned);
    assert_eq!(imports_of(code), BTreeSet::from(expected));
}

#[test]
fn only_cli_prints_only_clock_knows_the_time_only_bench_opens_ports() {
    let rules: [(&[&str], &[&str]); 5] = [
        (
            &[
                "println!",
                "eprintln!",
                "print!(",
                "eprint!(",
                "io::stdout",
                "io::stderr",
            ],
            &["cli"],
        ),
        (
            &["Instant::now", "Utc::now", "SystemTime"],
            &["clock", "cli"],
        ),
        (
            &["serialport::new", "serialport::available_ports"],
            &["bench"],
        ),
        (&["rustix::pty"], &["virtual_bench"]),
        (&["std::process::exit", "process::abort"], &[]),
    ];
    let mut wrong = Vec::new();
    for path in rust_files(&root().join("src")) {
        if is_test(&path) {
            continue;
        }
        let room = room_of(&path).unwrap_or_default();
        // tokio's instant follows the run's own clock, paused or not.
        let code = code_of(&path).replace("tokio::time::Instant", "the run's instant");
        for (words, rooms) in rules {
            for word in words
                .iter()
                .filter(|word| code.contains(**word) && !rooms.contains(&room.as_str()))
            {
                wrong.push(format!("{}: {word}", path.display()));
            }
        }
    }
    assert!(wrong.is_empty(), "{}", wrong.join("\n"));
}

#[test]
fn every_file_opens_with_what_it_is_and_none_is_a_drawer() {
    for folder in ["src", "tests", "benches"] {
        for path in rust_files(&root().join(folder)) {
            let text = fs::read_to_string(&path).unwrap();
            assert!(
                text.starts_with("//!"),
                "{} does not open with //!",
                path.display()
            );
            let name = path.file_stem().unwrap().to_str().unwrap();
            assert!(
                !["util", "utils", "helpers", "common", "misc"].contains(&name),
                "{name}"
            );
        }
    }
}

#[test]
fn no_simulated_code_draws_lots_in_a_select() {
    for path in rust_files(&root().join("src")) {
        if room_of(&path).is_some_and(|room| room == "cli") {
            continue;
        }
        let code = code_of(&path);
        for (at, _) in code.match_indices("select! {") {
            let first = code[at + "select! {".len()..].trim_start();
            assert!(
                first.starts_with("biased;"),
                "{}: a select without `biased;`",
                path.display()
            );
        }
    }
}

#[test]
fn the_profile_never_aborts_on_panic() {
    let text = fs::read_to_string(root().join("Cargo.toml")).unwrap();
    assert!(!text.replace(' ', "").contains("panic=\"abort\""));
}
