//! What earlier records say of a unit: marks that stay with it.

use std::fs;
use std::path::{Path, PathBuf};

use crate::judge::{Judgement, Mark};
use crate::record::{Event, Manifest, newest_judgement};

/// The marks that the newest judgements of a unit's records left on it, as events for
/// the next record; a replaced link takes `link stressed` away. Records of a virtual
/// bench say nothing of a real unit, and the other way round.
pub fn of_unit(reports: &Path, unit: &str, virtual_bench: bool, link_replaced: bool) -> Vec<Event> {
    let mut records: Vec<(Manifest, PathBuf)> = match fs::read_dir(reports) {
        Ok(entries) => entries
            .flatten()
            .filter_map(|entry| Some((manifest_of(&entry.path())?, entry.path())))
            .collect(),
        Err(_) => Vec::new(),
    };
    records.retain(|(manifest, _)| {
        manifest.unit == unit && manifest.virtual_bench.is_some() == virtual_bench
    });
    records.sort_by(|a, b| (&a.0.started, &a.0.record).cmp(&(&b.0.started, &b.0.record)));
    let mut found: Vec<(String, Mark)> = Vec::new();
    let stressed = |mark: &Mark| matches!(mark, Mark::LinkStressed { .. });
    for (manifest, folder) in &records {
        if says_replaced(folder) {
            found.retain(|(_, mark)| !stressed(mark));
        }
        let marks = marks_of(folder).into_iter();
        found.extend(marks.map(|mark| (manifest.record.clone(), mark)));
    }
    let mut events: Vec<Event> = Vec::new();
    if link_replaced {
        found.retain(|(_, mark)| !stressed(mark));
        events.push(Event::LinkReplaced);
    }
    events.extend(found.into_iter().map(|(record, mark)| Event::Marked {
        mark: mark.word().to_owned(),
        by: mark.by().to_owned(),
        record,
    }));
    events
}

/// Whether a record's run began with a new link.
fn says_replaced(folder: &Path) -> bool {
    let Ok(mut reader) = csv::Reader::from_path(folder.join("run").join("events.csv")) else {
        return false;
    };
    reader
        .records()
        .flatten()
        .any(|row| row.iter().any(|field| field == "link-replaced"))
}

fn manifest_of(folder: &Path) -> Option<Manifest> {
    let bytes = fs::read(folder.join("run").join("manifest.json")).ok()?;
    serde_json::from_slice(&bytes).ok()
}

fn marks_of(folder: &Path) -> Vec<Mark> {
    let newest = newest_judgement(folder, "judgement.json").ok().flatten();
    newest
        .and_then(|(_, bytes)| serde_json::from_slice::<Judgement>(&bytes).ok())
        .map(|judgement| judgement.marks)
        .unwrap_or_default()
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::record::{FileHash, RunOutcome};

    fn record(folder: &Path, number: u32, unit: &str, replaced: bool, stressed: bool) {
        let record = folder.join(format!("record-{number}"));
        let run = record.join("run");
        let annex = record.join("judgements").join("0001");
        fs::create_dir_all(&run).unwrap();
        fs::create_dir_all(&annex).unwrap();
        let manifest = Manifest {
            format: 1,
            program: "test".to_owned(),
            record: format!("r{number}"),
            unit: unit.to_owned(),
            operator: "test".to_owned(),
            virtual_bench: None,
            seed: None,
            started: format!("2026-12-0{number}T08:00:00+00:00"),
            length_us: 0,
            outcome: RunOutcome::Complete,
            samples: 0,
            files: Vec::<FileHash>::new(),
        };
        let write = |at: std::path::PathBuf, text: &str| fs::write(at, text).unwrap();
        write(
            run.join("manifest.json"),
            &serde_json::to_string(&manifest).unwrap(),
        );
        let event = if replaced { "link-replaced" } else { "started" };
        write(
            run.join("events.csv"),
            &format!("seq,at_us,event,detail\n1,0,{event},{{}}\n"),
        );
        let marks = if stressed {
            "[{\"mark\":\"link-stressed\",\"by\":\"its body reached 105 °C\"}]"
        } else {
            "[]"
        };
        let judgement =
            format!("{{\"verdict\":\"fail\",\"because\":\"\",\"findings\":[],\"marks\":{marks}}}");
        write(annex.join("judgement.json"), &judgement);
        write(annex.join("manifest.json"), "{}");
    }

    #[test]
    fn a_mark_stays_with_its_unit_until_the_link_is_replaced() {
        let folder = tempfile::tempdir().unwrap();
        let of = |unit: &str, replaced| of_unit(folder.path(), unit, false, replaced);
        record(folder.path(), 1, "A", false, true);
        record(folder.path(), 2, "B", false, false);
        let marked = of("A", false);
        assert!(
            matches!(&marked[..], [Event::Marked { mark, record, .. }] if mark == "link stressed" && record == "r1"),
            "{marked:?}"
        );
        assert_eq!(of("B", false), Vec::new());
        assert_eq!(of("A", true), vec![Event::LinkReplaced]);
        // A virtual record says nothing of a real unit.
        assert_eq!(of_unit(folder.path(), "A", true, false), Vec::new());
        record(folder.path(), 3, "A", true, false);
        assert_eq!(of("A", false), Vec::new());
        record(folder.path(), 4, "A", false, true);
        assert_eq!(of("A", false).len(), 1);
    }

    #[test]
    fn a_folder_that_is_not_there_says_nothing() {
        let none = of_unit(Path::new("there-is-no-such-folder"), "A", false, false);
        assert_eq!(none, Vec::new());
    }
}
