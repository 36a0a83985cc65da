//! The summary: the verdict, every cell's input against its plate, every cell's
//! worst body temperature against the thermal link, and the other findings.

use super::caption::{self, About, Said};
use super::fonts::{Face, SMALL, TEXT};
use super::header::{self, Header, MARGIN, WIDTH};
use super::number::{fixed, short};
use super::sheet::{Align, Sheet};
use super::words::clean;
use super::{DrawError, Picture, Scene, summary_rows};
use crate::judge::Finding;
use crate::spec::sequence::RuleWeight;

/// Cells on one page.
const CELLS_PER_PAGE: usize = 12;
/// Other findings that are listed on the first page.
const MOST_OTHERS: usize = 16;
/// From one finding to the next, in pixels.
const FINDING: f64 = 27.0;
/// The least height of a page.
const LEAST: f64 = 900.0;

/// Draws the summary, on a page for every twelve cells.
///
/// # Errors
/// Those of drawing and encoding.
pub fn draw(scene: &Scene) -> Result<Vec<Picture>, DrawError> {
    let cells: Vec<usize> = (0..scene.plan.cells.len()).collect();
    let mut pages: Vec<&[usize]> = cells.chunks(CELLS_PER_PAGE).collect();
    if pages.is_empty() {
        pages.push(&[]);
    }
    let count = pages.len();
    let drawn = pages.iter().enumerate();
    drawn
        .map(|(n, cells)| page(scene, cells, n, count))
        .collect()
}

fn page(scene: &Scene, cells: &[usize], n: usize, pages: usize) -> Result<Picture, DrawError> {
    let judgement = scene.judgement;
    let (name, title) = if pages == 1 {
        ("summary.png".to_owned(), "Summary".to_owned())
    } else {
        (
            format!("summary-{}.png", n + 1),
            format!("Summary, page {} of {pages}", n + 1),
        )
    };
    let header = Header {
        title,
        record_time: record_time(scene),
        outcome: Some((Some(judgement.verdict), clean(&judgement.because))),
    };
    let others = if n == 0 { others(scene) } else { Vec::new() };
    let power = summary_rows::power(scene, cells);
    let thermal = summary_rows::thermal(scene, cells);
    let listed = others.len().min(MOST_OTHERS + 1);
    let findings = if others.is_empty() {
        0.0
    } else {
        60.0 + FINDING * listed as f64
    };
    let height = 140.0 + power.height() + thermal.height() + findings + 40.0;
    let height = height.max(LEAST).round();
    header::picture(scene, name, height, &header, |sheet| {
        let mut y = 140.0;
        y = power.draw(sheet, y)?;
        y = thermal.draw(sheet, y)?;
        if !others.is_empty() {
            list(sheet, y + 14.0, &others)?;
        }
        let key = "bar: U · shaded: allowed · judged by each rule's own decision rule; \
                   outcomes: pass, conditional pass, conditional fail, fail, not judged";
        header::remark(sheet, height, key)
    })
}

fn record_time(scene: &Scene) -> String {
    let time = |sample: Option<&crate::record::Sample>| sample.map(|s| s.reply.as_secs_f64());
    match (time(scene.samples.first()), time(scene.samples.last())) {
        (Some(from), Some(to)) => format!(
            "record time {} s to {} s; {} samples; {}",
            fixed(from, 1),
            fixed(to, 1),
            scene.samples.len(),
            clean(&scene.plan.bay.name)
        ),
        _ => "the record holds no samples".to_owned(),
    }
}

/// Findings that the rows above do not show.
fn others<'a>(scene: &Scene<'a>) -> Vec<&'a Finding> {
    let shown = |finding: &Finding| {
        About::of(finding).is_some_and(|about| {
            (0..scene.plan.cells.len()).any(|cell| {
                matches!(Said::of(scene, cell, about), Some(Said::Here(f)) if std::ptr::eq(f, finding))
            })
        })
    };
    let all = scene.judgement.findings.iter();
    let mut rest: Vec<&Finding> = all.filter(|finding| !shown(finding)).collect();
    // The gravest first, and what decides before what only informs; otherwise in order.
    rest.sort_by_key(|finding| {
        let informs = finding.weight == RuleWeight::Information;
        (informs, std::cmp::Reverse(finding.outcome.rank()))
    });
    rest
}

fn list(sheet: &mut Sheet, top: f64, findings: &[&Finding]) -> Result<(), DrawError> {
    header::head(sheet, top + 18.0, "Other findings", "")?;
    let mut y = top + 50.0;
    for finding in findings.iter().take(MOST_OTHERS) {
        let (marker, ink) = caption::looks(finding.outcome);
        sheet.marker((MARGIN + 8.0, y - 6.0), 6.0, marker, ink)?;
        let word = Face::bold(TEXT.em, ink);
        sheet.text(
            (MARGIN + 24.0, y),
            finding.outcome.word(),
            word,
            Align::Left,
        )?;
        let rule = TEXT.fit(&rule(finding), 480.0);
        sheet.text((MARGIN + 200.0, y), &rule, TEXT, Align::Left)?;
        let value = TEXT.fit(&value(finding), 260.0);
        sheet.text((MARGIN + 700.0, y), &value, TEXT, Align::Left)?;
        let why = SMALL.fit(&clean(&finding.reason), WIDTH - 2.0 * MARGIN - 980.0);
        sheet.text((MARGIN + 980.0, y), &why, SMALL, Align::Left)?;
        y += FINDING;
    }
    if findings.len() > MOST_OTHERS {
        let more = format!("and {} more in the record", findings.len() - MOST_OTHERS);
        sheet.text((MARGIN + 24.0, y), &more, SMALL, Align::Left)?;
    }
    Ok(())
}

fn rule(finding: &Finding) -> String {
    let mut words = clean(&finding.rule);
    for part in [&finding.position, &finding.condition]
        .into_iter()
        .flatten()
    {
        if !finding.rule.contains(part.as_str()) {
            words = format!("{words}, {}", clean(part));
        }
    }
    match finding.weight {
        RuleWeight::Required => words,
        RuleWeight::Information => format!("{words} (information)"),
    }
}

fn value(finding: &Finding) -> String {
    let unit = clean(&finding.unit);
    let Some(value) = finding.value else {
        return String::new();
    };
    let limit = match (finding.at_least, finding.at_most) {
        (_, Some(most)) => format!(", at most {} {unit}", short(most, 4)),
        (Some(least), None) => format!(", at least {} {unit}", short(least, 4)),
        (None, None) => String::new(),
    };
    format!("{} {unit}{limit}", short(value, 4))
        .trim()
        .to_owned()
}
