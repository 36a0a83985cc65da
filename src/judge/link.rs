//! Findings about the thermal link.

use crate::analysis::{CellResult, Figure, Opening};
use crate::plan::PlannedLink;
use crate::quantity::{Celsius, Volts};
use crate::spec::sequence::{MeasuredAt, RuleKind};

use super::finding::{Draft, grouped};
use super::rules::{Ask, certainly_above, doubt, said_extrapolated, upper};
use super::types::{Finding, Outcome};

/// Findings of a rule about the link.
pub(super) fn findings(ask: &Ask, draft: Draft) -> Vec<Finding> {
    match &ask.rule.kind {
        RuleKind::LinkHolding => ask.link(draft, |link| link.th, "Th, its holding temperature"),
        RuleKind::LinkHouse { below_tf } => {
            let limit = |link: &PlannedLink| {
                let below = link.tf.get() - below_tf.get();
                link.th.map(|th| Celsius::of(th.get().min(below)))
            };
            ask.link(draft, limit, "the house limit for it")
        }
        RuleKind::LinkMaximum => ask.opening(draft),
        _ => ask.link(draft, |link| Some(link.opens_from), "its earliest opening"),
    }
}

impl Ask<'_> {
    fn link(
        &self,
        draft: Draft,
        limit: impl Fn(&PlannedLink) -> Option<Celsius>,
        what: &str,
    ) -> Vec<Finding> {
        let Some(link) = &self.plan.appliance.link else {
            return vec![draft.not_judged(None, "the sequence declares no thermal link")];
        };
        let Some(limit) = limit(link) else {
            return vec![draft.not_judged(
                None,
                "the sequence states no holding temperature from the link's data sheet",
            )];
        };
        if let MeasuredAt::OutsideOnly { place, limit } = &link.measured_at {
            return self.outside_only(draft, place, *limit);
        }
        let means = format!("the link's body would exceed {what}");
        let draft = draft.compares(upper(limit.get()), "°C", &means);
        let mut findings = self.each(&draft, body);
        findings.extend(self.ends_not_run(&draft));
        findings
    }

    /// The link itself cannot be reached: a house limit for the outside, which says so.
    fn outside_only(&self, draft: Draft, place: &str, limit: Celsius) -> Vec<Finding> {
        let mut draft = draft.compares(
            upper(limit.get()),
            "°C",
            &format!("{place} exceeds the house limit; the link itself was not measured"),
        );
        draft.rule = format!("{place}, in place of the thermal link");
        draft.source = "house limit; the link was not measured".to_owned();
        self.each(&draft, body)
    }

    /// A fan runs slower at one end of the supply range and the heater hotter at the
    /// other: each position of such a unit is run at both, or it is not judged.
    fn ends_not_run(&self, draft: &Draft) -> Vec<Finding> {
        if !self.plan.appliance.fan {
            return Vec::new();
        }
        let groups = grouped(
            self.analysis,
            |cell| self.is_for(cell),
            |cell| (cell.position.clone(), cell.condition.clone()),
        );
        groups
            .into_iter()
            .filter_map(|group| {
                let position = &group.first()?.cell.position;
                let appliance = &self.plan.appliance;
                let (low, high) = appliance.supply_ends(position);
                let is_run = |end: Volts| {
                    let mut cells = group.iter().map(|result| &result.cell);
                    cells.any(|cell| appliance.is_at_end(cell, end))
                };
                let ends = if low == high { vec![low] } else { vec![low, high] };
                let missing: Vec<String> = ends
                    .into_iter()
                    .filter(|end| !is_run(*end))
                    .map(|end| end.to_string())
                    .collect();
                let why = format!(
                    "a unit with a fan is run at both ends of its supply range, and it is not run at {}",
                    missing.join(" and ")
                );
                (!missing.is_empty()).then(|| draft.not_judged(Some(&group[0].cell), &why))
            })
            .collect()
    }

    /// The link that opened in an `abnormal` step, against Tm.
    fn opening(&self, draft: Draft) -> Vec<Finding> {
        let tm = self.plan.appliance.link.as_ref().and_then(|link| link.tm);
        let Some(tm) = tm else {
            let why = "the sequence states no maximum limit Tm from the link's data sheet";
            return vec![draft.not_judged(None, why)];
        };
        let draft = draft.compares(upper(tm.get()), "°C", "the opened link exceeded Tm");
        if self.analysis.openings.is_empty() {
            return vec![draft.not_judged(None, "the sequence runs no `abnormal` step")];
        }
        self.analysis
            .openings
            .iter()
            .map(|opening| opened(&draft, opening))
            .collect()
    }
}

/// A link that opened, or did not, in one `abnormal` step.
fn opened(draft: &Draft, opening: &Opening) -> Finding {
    let mut draft = draft.clone();
    draft.rule = format!("{}, {}", draft.rule, opening.fault);
    match (&opening.peak_degc, &opening.closed_again_s) {
        (Figure::Known(_), Some(after)) => draft.plainly(
            None,
            Outcome::Fail,
            &format!("the link closed again {after:.0} s after it had opened"),
        ),
        (Figure::Known(peak), None) => draft.decided(None, peak),
        (Figure::Absent(reason), _) => draft.not_judged(None, reason),
    }
}

/// The worst case; where there is none, what was seen still fails if it lies above
/// the limit with certainty, because it can only be lower than the worst case.
fn body(draft: &Draft, result: &CellResult) -> Finding {
    let cell = Some(&result.cell);
    if let Some(doubt) = doubt(result) {
        return draft.not_judged(cell, &doubt);
    }
    let reason = match &result.body_worst {
        Figure::Known(worst) => return said_extrapolated(draft.decided(cell, worst), result),
        Figure::Absent(reason) => reason,
    };
    match result.body_peak.known() {
        Some(peak) if certainly_above(&peak.temperature_degc, draft.limits) => {
            let seen = draft.decided(cell, &peak.temperature_degc);
            Finding {
                reason: format!("{}, by what was seen alone", draft.fail_means),
                outcome: Outcome::Fail,
                ..seen
            }
        }
        _ => draft.not_judged(cell, reason),
    }
}
