//! After a run: what must be said at once, then the judgement.

use std::path::Path;

use super::exit::Exit;
use super::judging::{exit_of, judge_record, print_judged};
use super::say::complain;
use crate::run::Ended;

/// Says whether OFF and the record are as they should be, judges, and prints.
pub fn finish(record: &Path, ended: &Ended) -> Exit {
    if let Some(why) = &ended.off_unconfirmed {
        complain(&format!(
            "OFF WAS NOT CONFIRMED: press the emergency stop or pull the plug before you touch the unit\n  {why}"
        ));
    }
    let exit = match &ended.manifest {
        Ok(_) => judge(record),
        Err(error) => {
            complain(&format!(
                "error: {}: the record could not be closed: {error}\n  what reached the disk is there; a record without run/manifest.json is never judged",
                record.display()
            ));
            Exit::Record
        }
    };
    if ended.off_unconfirmed.is_some() {
        Exit::OffUnconfirmed
    } else {
        exit
    }
}

fn judge(record: &Path) -> Exit {
    match judge_record(record) {
        Ok(judged) => {
            print_judged(&judged);
            exit_of(&judged)
        }
        Err(error) => {
            complain(&format!(
                "error: {error}\n  the run itself is closed; try `rateplate judge {}`",
                record.display()
            ));
            Exit::Record
        }
    }
}
