//! The YAML files that the program carries within itself.

/// A file as it is shipped.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Shipped {
    /// Its path in the project, for messages: `drivers/scpi-ac-supply.yaml`.
    pub path: &'static str,
    /// Its text.
    pub text: &'static str,
}

macro_rules! shipped {
    ($path:literal) => {
        Shipped {
            path: $path,
            text: include_str!(concat!("../../", $path)),
        }
    };
}

/// Sequences to run, rehearse, copy and change.
pub const SEQUENCES: &[Shipped] = &[
    shipped!("sequences/cupboard-dryer.yaml"),
    shipped!("sequences/fan-heater.yaml"),
    shipped!("sequences/towel-warmer.yaml"),
    shipped!("sequences/boot-warmer.yaml"),
];

/// Generic drivers, which bench files call by name.
pub const DRIVERS: &[Shipped] = &[
    shipped!("drivers/scpi-ac-supply.yaml"),
    shipped!("drivers/scpi-power-meter.yaml"),
    shipped!("drivers/scpi-temperature-scanner.yaml"),
    shipped!("drivers/scpi-thermocouple-scanner.yaml"),
    shipped!("drivers/scpi-resistance-scanner.yaml"),
    shipped!("drivers/scpi-position-switch.yaml"),
];

/// The virtual bench, which rehearsals use where no other is named.
pub const VIRTUAL_BENCH: Shipped = shipped!("drivers/virtual/demo-bench.yaml");

/// Virtual appliances, one for each shipped sequence.
pub const VIRTUAL_UNITS: &[Shipped] = &[
    shipped!("drivers/virtual/cupboard-dryer.yaml"),
    shipped!("drivers/virtual/fan-heater.yaml"),
    shipped!("drivers/virtual/towel-warmer.yaml"),
    shipped!("drivers/virtual/boot-warmer.yaml"),
];

#[cfg(test)]
mod tests {
    use super::*;
    use crate::spec::{Problem, load_bench, load_driver, load_sequence, load_virtual_unit};

    fn none(path: &str, problems: &[Problem]) {
        assert!(problems.is_empty(), "{path}: {problems:#?}");
    }

    #[test]
    fn every_shipped_file_loads_without_a_problem() {
        for file in SEQUENCES {
            none(
                file.path,
                &load_sequence(file.path, file.text.as_bytes()).problems,
            );
        }
        for file in DRIVERS {
            none(
                file.path,
                &load_driver(file.path, file.text.as_bytes()).problems,
            );
        }
        for file in VIRTUAL_UNITS {
            none(
                file.path,
                &load_virtual_unit(file.path, file.text.as_bytes()).problems,
            );
        }
        let bench = VIRTUAL_BENCH;
        none(
            bench.path,
            &load_bench(bench.path, bench.text.as_bytes()).problems,
        );
    }
}
