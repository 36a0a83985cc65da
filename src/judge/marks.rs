//! What stays with a unit after this record.

use crate::analysis::{Analysis, Figure};
use crate::plan::Plan;
use crate::quantity::at_most;
use crate::spec::sequence::MeasuredAt;

use super::types::Mark;

/// The marks that a record leaves on its unit.
pub(super) fn of(plan: &Plan, analysis: &Analysis) -> Vec<Mark> {
    stressed(plan, analysis)
        .into_iter()
        .chain(destroyed(analysis))
        .collect()
}

/// A body that was seen above Th: what the link's data sheet promises ends there. The
/// reading alone counts, whatever its uncertainty; a sensor that is not believed says
/// nothing.
fn stressed(plan: &Plan, analysis: &Analysis) -> Option<Mark> {
    let link = plan.appliance.link.as_ref()?;
    let th = link.th?;
    let allowance = match &link.measured_at {
        MeasuredAt::LinkBody => 0.0,
        MeasuredAt::Elsewhere { allowance, .. } => allowance.map_or(0.0, |kelvins| kelvins.get()),
        MeasuredAt::OutsideOnly { .. } => return None,
    };
    let peaks = analysis
        .cells
        .iter()
        .filter(|cell| cell.disbelief.is_empty())
        .filter_map(|cell| Some((cell, cell.body_peak.known()?)));
    let hottest = peaks.max_by(|a, b| {
        let value = |peak: &crate::analysis::Peak| peak.temperature_degc.value;
        value(a.1).total_cmp(&value(b.1))
    })?;
    let seen = hottest.1.temperature_degc.value + allowance;
    (!at_most(seen, th.get())).then(|| Mark::LinkStressed {
        by: format!(
            "its body reached {seen:.1} °C in {}, above Th, {th}",
            hottest.0.cell.words()
        ),
    })
}

fn destroyed(analysis: &Analysis) -> Option<Mark> {
    let opened = analysis.openings.iter().find(|o| o.opened_s.is_some())?;
    let at = match &opened.at_opening_degc {
        Figure::Known(body) => format!(" at {:.1} °C", body.value),
        Figure::Absent(_) => String::new(),
    };
    Some(Mark::Destroyed {
        by: format!("its thermal link opened{at} with {}", opened.fault),
    })
}
