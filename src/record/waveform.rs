//! `waveform-cell-1.csv`: a block of voltage and current out, and in again.

use std::io::Write;

use csv::ByteRecord;

use super::columns::RowError;
use crate::quantity::{Waveform, near, shortest};

/// Its columns; the time counts from the block's first sample.
pub const WAVEFORM_HEAD: [&str; 3] = ["time_us", "voltage_v", "current_a"];

/// A waveform in bytes, numbers as shortest decimals that read back alike.
///
/// # Errors
/// Where a row can't be formed.
pub fn write_waveform(wave: &Waveform) -> std::io::Result<Vec<u8>> {
    let mut out = Vec::with_capacity(32 * wave.len());
    writeln!(out, "{}", WAVEFORM_HEAD.join(","))?;
    let pairs = wave.voltage_v().iter().zip(wave.current_a());
    for (n, (volts, amps)) in pairs.enumerate() {
        let time = n as f64 * wave.interval_us();
        let (time, volts, amps) = (shortest(time), shortest(*volts), shortest(*amps));
        writeln!(out, "{time},{volts},{amps}")?;
    }
    Ok(out)
}

/// The columns of a waveform that is being read back.
#[derive(Debug, Default)]
pub struct WaveformColumns {
    time_us: Vec<f64>,
    voltage_v: Vec<f64>,
    current_a: Vec<f64>,
}

impl WaveformColumns {
    /// Takes a row.
    ///
    /// # Errors
    /// The first column that is no finite number.
    pub fn take(&mut self, row: &ByteRecord) -> Result<(), RowError> {
        let columns = [&mut self.time_us, &mut self.voltage_v, &mut self.current_a];
        for (n, column) in columns.into_iter().enumerate() {
            let text = String::from_utf8_lossy(row.get(n).unwrap_or_default()).into_owned();
            let value = text.parse::<f64>().ok().filter(|value| value.is_finite());
            column.push(value.ok_or_else(|| RowError {
                column: WAVEFORM_HEAD[n].to_owned(),
                found: text.chars().take(40).collect(),
                wanted: "a finite number",
            })?);
        }
        Ok(())
    }

    /// The waveform, where `expected` rows came and they are equally spaced from 0 on.
    ///
    /// # Errors
    /// What is wrong with them, in words.
    pub fn finish(self, expected: u64) -> Result<Waveform, String> {
        let found = self.time_us.len();
        if found as u64 != expected {
            return Err(format!("{found} rows, the event tells of {expected}"));
        }
        // A single sample has no interval of its own; any will do.
        let interval = self.time_us.get(1).copied().unwrap_or(1.0);
        let spaced = |(n, time): (usize, &f64)| {
            let due = n as f64 * interval;
            *time == due || near(*time, due)
        };
        if !self.time_us.iter().enumerate().all(spaced) {
            return Err("its rows are not equally spaced from 0 on".to_owned());
        }
        Waveform::new(interval, self.voltage_v, self.current_a).map_err(|e| e.to_string())
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn read(bytes: &[u8], expected: u64) -> Result<Waveform, String> {
        let mut columns = WaveformColumns::default();
        let mut reader = csv::Reader::from_reader(bytes);
        for row in reader.byte_records() {
            columns
                .take(&row.map_err(|e| e.to_string())?)
                .map_err(|e| e.to_string())?;
        }
        columns.finish(expected)
    }

    #[test]
    fn a_waveform_reads_back_to_the_last_bit() {
        let volts: Vec<f64> = (0..500).map(|n| 325.0 * f64::from(n).sin()).collect();
        let amps: Vec<f64> = (0..500).map(|n| f64::from(n).cos() / 3.0).collect();
        for interval in [200.0, 100.0 / 3.0, 0.1] {
            let wave = Waveform::new(interval, volts.clone(), amps.clone()).unwrap();
            let bytes = write_waveform(&wave).unwrap();
            assert_eq!(read(&bytes, 500).unwrap(), wave);
        }
        let wave = Waveform::new(200.0, vec![0.0, -0.0, 230.5], vec![1.0, 0.25, -3e-7]).unwrap();
        let text = String::from_utf8(write_waveform(&wave).unwrap()).unwrap();
        assert_eq!(
            text,
            "time_us,voltage_v,current_a\n0,0,1\n200,0,0.25\n400,230.5,-0.0000003\n"
        );
    }

    #[test]
    fn what_is_no_waveform_is_refused() {
        let of = |rows: &str| {
            let text = format!("time_us,voltage_v,current_a\n{rows}");
            read(text.as_bytes(), 3).unwrap_err()
        };
        assert!(of("0,1,1\n200,1,1\n").contains("2 rows, the event tells of 3"));
        assert!(of("0,1,1\n200,1,1\n500,1,1\n").contains("not equally spaced"));
        assert!(of("5,1,1\n10,1,1\n15,1,1\n").contains("not equally spaced"));
        assert!(of("0,1,1\n200,x,1\n400,1,1\n").contains("voltage_v"));
        assert!(of("0,1,1\n200,1,inf\n400,1,1\n").contains("current_a"));
        assert!(of("0,1,1\n200,1,\n400,1,1\n").contains("current_a"));
        assert!(of("0,1,1\n0,1,1\n0,1,1\n").contains("interval"));
    }
}
