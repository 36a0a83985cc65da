//! `samples.csv` and `events.csv`: their columns, a row out, a row in.

use csv::ByteRecord;

use super::types::{Event, Happening, Sample, Status};
use crate::plan::{Cell, Plan};
use crate::quantity::{Moment, Reading, Readings, shortest};
use crate::sensor::is_raw;

/// Columns of `samples.csv` before the quantities.
pub const SAMPLE_HEAD: [&str; 11] = [
    "seq",
    "request_us",
    "reply_us",
    "bay",
    "step",
    "position",
    "condition",
    "supply",
    "role",
    "energised",
    "status",
];

/// Columns of `events.csv`.
pub const EVENT_HEAD: [&str; 4] = ["seq", "at_us", "event", "detail"];

/// Why a row of a record can't be taken.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
#[error("column `{column}` holds `{found}`, {wanted} was expected")]
pub struct RowError {
    /// The column.
    pub column: String,
    /// What stands there.
    pub found: String,
    /// What was expected.
    pub wanted: &'static str,
}

/// The names that rows use, taken from the plan once.
#[derive(Debug, Clone)]
pub struct Names {
    bay: String,
    roles: Vec<String>,
    cells: Vec<[String; 3]>,
    readings: Vec<Reading>,
}

impl Names {
    /// The names of a plan.
    pub fn of(plan: &Plan) -> Self {
        Self {
            bay: defused(&plan.bay.name),
            roles: plan
                .bay
                .roles
                .iter()
                .map(|role| defused(&role.name))
                .collect(),
            cells: plan.cells.iter().map(cell_names).collect(),
            readings: columns_of(plan),
        }
    }

    /// The columns of `samples.csv`.
    pub fn head(&self) -> Vec<&'static str> {
        let quantities = self.readings.iter().map(|reading| reading.column());
        SAMPLE_HEAD.into_iter().chain(quantities).collect()
    }

    /// One row of `samples.csv`.
    pub fn write_sample(&self, sample: &Sample, row: &mut ByteRecord) {
        let mut number = NumberText::default();
        row.clear();
        row.push_field(number.integer(sample.seq));
        row.push_field(number.integer(sample.request.as_micros()));
        row.push_field(number.integer(sample.reply.as_micros()));
        row.push_field(self.bay.as_bytes());
        row.push_field(number.integer(u64::from(sample.step)));
        for column in 0..3 {
            let text = sample
                .cell
                .map_or("", |cell| self.cells[cell][column].as_str());
            row.push_field(text.as_bytes());
        }
        row.push_field(self.roles[sample.role].as_bytes());
        row.push_field(if sample.energised { b"1" } else { b"0" });
        row.push_field(sample.status.word().as_bytes());
        for kind in &self.readings {
            row.push_field(
                sample
                    .readings
                    .get(*kind)
                    .map_or(&[][..], |value| number.decimal(value)),
            );
        }
    }

    /// Reads a row of `samples.csv` back.
    ///
    /// # Errors
    /// The first column that does not hold what it should.
    pub fn read_sample(&self, row: &ByteRecord) -> Result<Sample, RowError> {
        let status = text_at(row, 10);
        let status = Status::ALL.into_iter().find(|s| s.word() == status);
        let mut readings = Readings::NONE;
        for (n, kind) in self.readings.iter().copied().enumerate() {
            let column = SAMPLE_HEAD.len() + n;
            let text = text_at(row, column);
            if !text.is_empty() {
                let value: f64 = text
                    .parse()
                    .map_err(|_| wrong(kind.column(), &text, "a number"))?;
                if !value.is_finite() {
                    return Err(wrong(kind.column(), &text, "a finite number"));
                }
                readings.set(kind, value);
            }
        }
        Ok(Sample {
            seq: integer_at(row, 0)?,
            request: Moment::from_micros(integer_at(row, 1)?),
            reply: Moment::from_micros(integer_at(row, 2)?),
            step: integer_at(row, 4)? as u32,
            cell: self.cell_at(row)?,
            role: self.role_at(row)?,
            energised: match text_at(row, 9).as_str() {
                "1" => true,
                "0" => false,
                other => return Err(wrong("energised", other, "1 or 0")),
            },
            status: status.ok_or_else(|| wrong("status", &text_at(row, 10), "a status"))?,
            readings,
        })
    }

    fn role_at(&self, row: &ByteRecord) -> Result<usize, RowError> {
        let name = text_at(row, 8);
        let found = self.roles.iter().position(|role| *role == name);
        found.ok_or_else(|| wrong("role", &name, "a role of the plan"))
    }

    fn cell_at(&self, row: &ByteRecord) -> Result<Option<usize>, RowError> {
        let names = [text_at(row, 5), text_at(row, 6), text_at(row, 7)];
        if names.iter().all(String::is_empty) {
            return Ok(None);
        }
        let found = self.cells.iter().position(|cell| *cell == names);
        found
            .map(Some)
            .ok_or_else(|| wrong("position", &names.join(" / "), "a cell of the plan"))
    }
}

/// Readings that most benches have no use for.
fn is_rare(reading: Reading) -> bool {
    is_raw(reading) || reading == Reading::Energy
}

/// Quantities that a plan's record has a column for. Raw readings of sensors and energy
/// counters are rare, so their columns are there only where a driver of the plan gives them: records
/// without them keep the columns that they always had.
fn columns_of(plan: &Plan) -> Vec<Reading> {
    let given = |reading: Reading| {
        plan.instruments
            .iter()
            .flat_map(|instrument| &instrument.driver.readings)
            .any(|query| query.gives.contains(&reading))
    };
    Reading::ALL
        .into_iter()
        .filter(|reading| !is_rare(*reading) || given(*reading))
        .collect()
}

/// The supply of a cell in words: `230 V 50 Hz`.
pub fn supply_words(cell: &Cell) -> String {
    format!("{} {}", cell.supply.voltage, cell.supply.frequency)
}

fn cell_names(cell: &Cell) -> [String; 3] {
    [
        defused(&cell.position),
        defused(cell.condition.as_deref().unwrap_or("")),
        supply_words(cell),
    ]
}

/// A text from outside that no spreadsheet takes for a formula.
pub fn defused(text: &str) -> String {
    let clean: String = text
        .chars()
        .map(|c| if c.is_control() { ' ' } else { c })
        .collect();
    if clean.starts_with(['=', '+', '-', '@']) {
        format!("'{clean}")
    } else {
        clean
    }
}

/// One row of `events.csv`: the event's name, and the rest of it as JSON.
pub fn write_happening(happening: &Happening) -> Result<[String; 4], serde_json::Error> {
    let mut detail = serde_json::to_value(&happening.event)?;
    let name = detail.as_object_mut().and_then(|map| map.remove("event"));
    let name = name
        .as_ref()
        .and_then(|n| n.as_str())
        .unwrap_or_default()
        .to_owned();
    let seq = happening.seq.to_string();
    let at = happening.at.as_micros().to_string();
    Ok([seq, at, name, serde_json::to_string(&detail)?])
}

/// Reads a row of `events.csv` back.
///
/// # Errors
/// The first column that does not hold what it should.
pub fn read_happening(row: &ByteRecord) -> Result<Happening, RowError> {
    let detail = text_at(row, 3);
    let mut value: serde_json::Value =
        serde_json::from_str(&detail).map_err(|_| wrong("detail", &detail, "JSON"))?;
    let map = value
        .as_object_mut()
        .ok_or_else(|| wrong("detail", &detail, "a JSON object"))?;
    map.insert("event".to_owned(), text_at(row, 2).into());
    let event: Event = serde_json::from_value(value)
        .map_err(|_| wrong("event", &text_at(row, 2), "an event with its detail"))?;
    Ok(Happening {
        seq: integer_event(row, 0, "seq")?,
        at: Moment::from_micros(integer_event(row, 1, "at_us")?),
        event,
    })
}

fn integer_event(row: &ByteRecord, column: usize, name: &'static str) -> Result<u64, RowError> {
    let text = text_at(row, column);
    text.parse()
        .map_err(|_| wrong(name, &text, "a whole number"))
}

fn integer_at(row: &ByteRecord, column: usize) -> Result<u64, RowError> {
    let text = text_at(row, column);
    text.parse()
        .map_err(|_| wrong(SAMPLE_HEAD[column], &text, "a whole number"))
}

fn text_at(row: &ByteRecord, column: usize) -> String {
    String::from_utf8_lossy(row.get(column).unwrap_or_default()).into_owned()
}

fn wrong(column: &str, found: &str, wanted: &'static str) -> RowError {
    let found = found.chars().take(40).collect();
    RowError {
        column: column.to_owned(),
        found,
        wanted,
    }
}

/// Text of one number at a time, without an allocation per cell.
#[derive(Default)]
struct NumberText {
    text: String,
}

impl NumberText {
    fn integer(&mut self, value: u64) -> &[u8] {
        use std::fmt::Write;
        self.text.clear();
        let _ = write!(self.text, "{value}");
        self.text.as_bytes()
    }

    fn decimal(&mut self, value: f64) -> &[u8] {
        self.text.clear();
        self.text.push_str(&shortest(value));
        self.text.as_bytes()
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn an_event_reads_back() {
        let happening = Happening {
            seq: 7,
            at: Moment::from_micros(12),
            event: Event::Off {
                cause: "end, \"normal\"".to_owned(),
                confirmed: true,
            },
        };
        let row = write_happening(&happening).unwrap();
        assert_eq!(row[2], "off");
        assert_eq!(
            read_happening(&ByteRecord::from(row.to_vec())).unwrap(),
            happening
        );
    }

    #[test]
    fn formulas_are_defused() {
        assert_eq!(defused("=1+1"), "'=1+1");
        assert_eq!(defused("a\tb"), "a b");
        assert_eq!(defused("low"), "low");
    }

    fn names(readings: &[Reading]) -> Names {
        Names {
            bay: "bay 1".to_owned(),
            roles: vec!["meter".to_owned()],
            cells: Vec::new(),
            readings: readings.to_vec(),
        }
    }

    fn sample(readings: Readings) -> Sample {
        Sample {
            seq: 1,
            request: Moment::from_micros(10),
            reply: Moment::from_micros(20),
            step: 3,
            cell: None,
            role: 0,
            energised: true,
            status: Status::Ok,
            readings,
        }
    }

    // Records from before there were energy counters have no column for them.
    #[test]
    fn a_counter_has_a_column_only_where_one_is_read() {
        let without = names(&Reading::ALL[..6]);
        let head = without.head();
        assert_eq!(head.last(), Some(&"temperature_degc"));
        let with = names(&Reading::ALL);
        assert!(with.head().contains(&"energy_wh"));
        let mut readings = Readings::one(Reading::Power, 9.5);
        readings.set(Reading::Energy, 0.125);
        let mut row = ByteRecord::new();
        with.write_sample(&sample(readings), &mut row);
        assert_eq!(row.len(), with.head().len());
        assert_eq!(with.read_sample(&row).unwrap(), sample(readings));
        let old = Readings::one(Reading::Power, 9.5);
        without.write_sample(&sample(old), &mut row);
        assert_eq!(row.len(), head.len());
        assert_eq!(without.read_sample(&row).unwrap(), sample(old));
    }
}
