//! Before energising: every instrument is the one it should be, the output is off,
//! and the cautions were read. Only this file makes the proof that energising takes.

use super::bay::{Cut, Working};
use super::operator::{Prompt, Want};
use crate::record::Event;
use crate::spec::sequence::RoleKind;

/// Proof that the pre-flight check was passed.
#[derive(Debug)]
pub struct Cleared {
    _only_here: (),
}

/// What a run on a virtual bench may do that one with a real unit may not.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Permissions {
    /// Prompts are answered without a person.
    pub unattended: bool,
    /// Run seconds to a wall second, which virtual instruments must state alike.
    pub speed: f64,
}

/// Passes the pre-flight check, or says what stands in its way.
pub(super) async fn clear(
    bay: &mut Working,
    permissions: Permissions,
    cautions: &str,
) -> Result<Cleared, Cut> {
    let speeds = identify_all(bay).await?;
    let all_virtual = !speeds.is_empty() && speeds.iter().all(Option::is_some);
    // One virtual instrument is enough to make the record worthless as evidence.
    if speeds.iter().any(Option::is_some) {
        bay.mark_virtual();
    }
    hold_to(permissions, all_virtual, &speeds)?;
    prepare_all(bay).await?;
    confirm_off(bay).await?;
    acknowledge(bay, cautions).await?;
    Ok(Cleared { _only_here: () })
}

async fn identify_all(bay: &mut Working) -> Result<Vec<Option<f64>>, Cut> {
    let mut speeds = Vec::new();
    for number in 0..bay.plan.instruments.len() {
        let (line, index) = bay.instrument(number);
        let identity = line.identify(index).await?;
        let instrument = bay.plan.instruments[number].name.clone();
        bay.note(Event::Identified {
            instrument,
            reply: identity.reply.clone(),
        })?;
        speeds.push(identity.virtual_speed);
    }
    Ok(speeds)
}

fn hold_to(permissions: Permissions, all_virtual: bool, speeds: &[Option<f64>]) -> Result<(), Cut> {
    if permissions.unattended && !all_virtual {
        return Err(Cut::Failed(
            "answering without a person (--yes) is refused: not every instrument says that it is VIRTUAL"
                .to_owned(),
        ));
    }
    if permissions.speed != 1.0 && !all_virtual {
        return Err(Cut::Failed(
            "a speed other than 1 is refused: not every instrument says that it is VIRTUAL"
                .to_owned(),
        ));
    }
    match speeds
        .iter()
        .flatten()
        .find(|speed| **speed != permissions.speed)
    {
        Some(speed) => Err(Cut::Failed(format!(
            "the virtual bench runs at speed {speed}, this run at {}; give --speed {speed}",
            permissions.speed
        ))),
        None => Ok(()),
    }
}

async fn prepare_all(bay: &mut Working) -> Result<(), Cut> {
    for number in 0..bay.plan.instruments.len() {
        let (line, index) = bay.instrument(number);
        line.prepare(index).await?;
    }
    Ok(())
}

async fn confirm_off(bay: &mut Working) -> Result<(), Cut> {
    let plan = bay.plan.clone();
    let Some((_, role)) = plan.role_of_kind(RoleKind::Supply) else {
        return Err(Cut::Failed(
            "the plan has no supply: nothing could de-energise the unit".to_owned(),
        ));
    };
    let (line, index) = bay.instrument_of(role);
    bay.off = Some(line.ensure_off(index, "before the run").await?);
    bay.write_told()
}

async fn acknowledge(bay: &mut Working, cautions: &str) -> Result<(), Cut> {
    let name = bay.plan.bay.name.clone();
    let prompt = Prompt::looking(&name, &bay.unit, cautions.to_owned(), Want::Acknowledge);
    bay.ask(&prompt).await?;
    let by = bay.operator_name();
    bay.note(Event::CautionsAcknowledged { by })
}

#[cfg(test)]
mod tests {
    use super::*;

    fn refused(unattended: bool, speed: f64, speeds: &[Option<f64>]) -> bool {
        let all_virtual = speeds.iter().all(Option::is_some);
        hold_to(Permissions { unattended, speed }, all_virtual, speeds).is_err()
    }

    #[test]
    fn a_real_instrument_refuses_unattended_runs_and_any_speed() {
        assert!(!refused(false, 1.0, &[None, None]));
        assert!(refused(true, 1.0, &[None, None]));
        assert!(refused(false, 20.0, &[None, None]));
        assert!(refused(true, 20.0, &[Some(20.0), None]));
        assert!(refused(false, 20.0, &[Some(20.0), None]));
    }

    #[test]
    fn a_virtual_bench_is_run_at_its_own_speed() {
        assert!(!refused(true, 20.0, &[Some(20.0), Some(20.0)]));
        assert!(refused(true, 1.0, &[Some(20.0), Some(20.0)]));
        assert!(refused(true, 20.0, &[Some(20.0), Some(1.0)]));
    }
}
