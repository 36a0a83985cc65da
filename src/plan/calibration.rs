//! Whether the instruments' calibration can be shown.

use chrono::NaiveDate;

use super::notes::Notes;
use crate::spec::bench::Instrument;
use crate::spec::driver::Driver;

/// A due date that has passed is warned of wherever one is stated; due today is not
/// passed. That a certificate is missing matters only where something real is read.
pub(super) fn calibration_stands(
    today: Option<NaiveDate>,
    instrument: &Instrument,
    driver: &Driver,
    is_real: bool,
    notes: &mut Notes,
) {
    let place = &instrument.name.place;
    let name = &instrument.name.value;
    if let (Some(due), Some(today)) = (instrument.due, today)
        && due < today
    {
        notes.warning(
            place,
            format!("the calibration of `{name}` was due on {due}"),
            "have it calibrated; results are only as good as its last certificate",
        );
    }
    if !is_real || driver.readings.is_empty() {
        return;
    }
    if instrument.due.is_none() {
        notes.warning(
            place,
            format!("`{name}` states no due date of its calibration"),
            "add `due: YYYY-MM-DD` and `certificate:`",
        );
    }
    if instrument.certificate.is_none() {
        notes.warning(
            place,
            format!("`{name}` names no calibration certificate"),
            "add `certificate:` with its number",
        );
    }
}
