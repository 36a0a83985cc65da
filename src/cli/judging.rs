//! Judging a closed record: read, analyse, judge, draw, and write an annex.

use std::path::{Path, PathBuf};

use super::exit::Exit;
use super::files;
use super::say::{complain, say};
use super::table::verdict_table;
use crate::analysis::{self, Analysis};
use crate::chart::{self, Scene};
use crate::judge::{self, Judgement};
use crate::plan::{PlannedRule, other_rules};
use crate::record::{
    Folder, RecordError, RunOutcome, newest_judgement, sha256_of, write_judgement,
};
use crate::spec::{self, shipped};

/// Why a record could not be judged.
#[derive(Debug, thiserror::Error)]
pub enum JudgingError {
    /// It can't be read.
    #[error(transparent)]
    Record(#[from] RecordError),
    /// The judgement can't be written.
    #[error("{}: the judgement can't be written: {source}", record.display())]
    Write {
        /// The record.
        record: PathBuf,
        /// Why.
        source: std::io::Error,
    },
    /// A chart can't be drawn.
    #[error("the charts can't be drawn: {0}")]
    Draw(#[from] chart::DrawError),
}

/// A record that was judged.
#[derive(Debug)]
pub struct Judged {
    /// The record.
    pub folder: Folder,
    /// Its analysis.
    pub analysis: Analysis,
    /// Its judgement.
    pub judgement: Judgement,
    /// The annex that was written.
    pub annex: PathBuf,
    /// The verdict of the judgement before, where there is one.
    pub before: Option<Judgement>,
}

/// Judges the record at `path` from what the folder holds, and writes the judgement
/// beside the others.
///
/// # Errors
/// [`JudgingError`]; a record that was never closed is not judged.
pub fn judge_record(path: &Path) -> Result<Judged, JudgingError> {
    judged(Folder::open(path)?, None)
}

/// Other rules than those that the record's plan holds.
struct OtherRules {
    rules: Vec<PlannedRule>,
    whose: String,
}

fn judged(mut folder: Folder, other: Option<OtherRules>) -> Result<Judged, JudgingError> {
    let path = folder.path().to_owned();
    let path = path.as_path();
    let whose = other.map(|other| {
        folder.plan.rules = other.rules;
        other.whose
    });
    let analysis = analysis::analyse(&analysis::Input {
        plan: &folder.plan,
        samples: &folder.samples,
        happenings: &folder.happenings,
        waveforms: &folder.waveforms,
        outcome: &folder.manifest.outcome,
    });
    let judgement = Judgement {
        other_rules: whose,
        ..judge::judge(&folder.plan, &folder.manifest.outcome, &analysis)
    };
    let before = newest_judgement(path, "judgement.json")
        .ok()
        .flatten()
        .and_then(|(_, bytes)| serde_json::from_slice(&bytes).ok());
    let annex = write_annex(&folder, &analysis, &judgement)?;
    Ok(Judged {
        folder,
        analysis,
        judgement,
        annex,
        before,
    })
}

fn write_annex(
    folder: &Folder,
    analysis: &Analysis,
    judgement: &Judgement,
) -> Result<PathBuf, JudgingError> {
    let virtual_bench = folder.manifest.virtual_bench.clone();
    let scene = Scene {
        plan: &folder.plan,
        analysis,
        judgement,
        samples: &folder.samples,
        unit: &folder.manifest.unit,
        virtual_bench: virtual_bench.is_some(),
    };
    let mut files: Vec<(String, Vec<u8>)> = chart::draw(&scene)?
        .into_iter()
        .map(|p| (p.name, p.png))
        .collect();
    let failed = |source| JudgingError::Write {
        record: folder.path().to_owned(),
        source,
    };
    let json =
        |bytes: serde_json::Result<Vec<u8>>| bytes.map_err(|e| failed(std::io::Error::other(e)));
    files.push((
        "analysis.json".to_owned(),
        json(serde_json::to_vec_pretty(analysis))?,
    ));
    files.push((
        "judgement.json".to_owned(),
        json(serde_json::to_vec_pretty(judgement))?,
    ));
    let csv =
        |bytes: Result<Vec<u8>, csv::Error>| bytes.map_err(|e| failed(std::io::Error::other(e)));
    files.push((
        "results.csv".to_owned(),
        csv(analysis::results_csv(analysis))?,
    ));
    files.push((
        "budgets.csv".to_owned(),
        csv(analysis::budgets_csv(analysis))?,
    ));
    files.push((
        "budgets.txt".to_owned(),
        analysis::budgets_text(analysis).into_bytes(),
    ));
    files.push((
        "findings.csv".to_owned(),
        csv(judge::findings_csv(judgement))?,
    ));
    write_judgement(folder.path(), virtual_bench, folder.seal()?, &files).map_err(failed)
}

/// `judge`: the table, what changed since the judgement before, the exit code.
pub fn judge_again(path: &Path, rules: Option<&Path>) -> Exit {
    let opened = Folder::open(path).map_err(JudgingError::from);
    let found = match (opened, rules) {
        (Ok(folder), Some(rules)) => match rules_of(&folder, rules) {
            Ok(other) => judged(folder, Some(other)),
            Err(exit) => return exit,
        },
        (Ok(folder), None) => judged(folder, None),
        (Err(error), _) => Err(error),
    };
    match found {
        Ok(judged) => {
            print_judged(&judged);
            exit_of(&judged)
        }
        Err(error) => {
            complain(&format!("error: {error}"));
            Exit::Record
        }
    }
}

/// The rules of another sequence, for the plan of a record.
fn rules_of(folder: &Folder, path: &Path) -> Result<OtherRules, Exit> {
    let document = files::read(path, shipped::SEQUENCES)?;
    let loaded = spec::load_sequence(&document.name, &document.bytes);
    let Some(sequence) = loaded.value else {
        complain(spec::render(&loaded.problems).trim_end());
        return Err(Exit::BadInput);
    };
    let rules = other_rules(&sequence, &folder.plan).map_err(|problems| {
        complain(spec::render(&problems).trim_end());
        Exit::BadInput
    })?;
    Ok(OtherRules {
        rules,
        whose: format!(
            "not those fixed before the run (edition {}), but those of {}, edition {}, SHA-256 {}",
            folder.plan.edition,
            plain_name(path),
            sequence.edition.value,
            sha256_of(&document.bytes)
        ),
    })
}

/// A file's name without its folder, on one line.
fn plain_name(path: &Path) -> String {
    let name = path.file_name().unwrap_or_default().to_string_lossy();
    name.chars()
        .map(|c| if c.is_control() { '_' } else { c })
        .collect()
}

/// Prints the verdict table and where everything is.
pub fn print_judged(judged: &Judged) {
    say(&verdict_table(
        &judged.folder,
        &judged.analysis,
        &judged.judgement,
    ));
    if let Some(before) = &judged.before {
        say(&compared(before, &judged.judgement));
    }
    say(&format!("record     {}", judged.folder.path().display()));
    say(&format!("judgement  {}", judged.annex.display()));
}

fn compared(before: &Judgement, now: &Judgement) -> String {
    if before == now {
        return "the same as the judgement before, finding by finding".to_owned();
    }
    let changed = now
        .findings
        .iter()
        .filter(|finding| !before.findings.contains(finding))
        .count();
    format!(
        "the judgement before said {}, this one says {}; {changed} of {} findings differ",
        before.verdict.word(),
        now.verdict.word(),
        now.findings.len()
    )
}

/// The verdict's code; a run that was cut short without a fail says so.
pub fn exit_of(judged: &Judged) -> Exit {
    match (
        Exit::of(judged.judgement.verdict),
        &judged.folder.manifest.outcome,
    ) {
        (Exit::NotJudged, outcome) if *outcome != RunOutcome::Complete => Exit::CutShort,
        (exit, _) => exit,
    }
}
