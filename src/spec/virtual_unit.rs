//! A virtual appliance: the electro-thermal model that a virtual bay holds.

use crate::quantity::{Celsius, Ohms, Ratio, Seconds, Watts};

use super::Located;

/// A whole virtual appliance file.
#[derive(Debug, Clone, PartialEq)]
pub struct VirtualUnit {
    /// `virtual unit:` the appliance's model, as sequences call it.
    pub model: Located<String>,
    /// `elements:`
    pub elements: Vec<Element>,
    /// `positions:` which elements each position feeds, in the sequence's order.
    pub positions: Vec<PositionWiring>,
    /// `fan:`
    pub fan: Option<Fan>,
    /// `thermostat:`
    pub thermostat: Option<Thermostat>,
    /// `link opens at:` the true opening temperature of the good unit's link.
    pub link_opens_at: Celsius,
    /// `thermal:`
    pub thermal: Thermal,
    /// `conditions:` factors on the loss to ambient while a condition holds.
    pub conditions: Vec<ConditionEffect>,
    /// `spread:` relative standard deviation between good units.
    pub spread: Ratio,
}

/// A heating element.
#[derive(Debug, Clone, PartialEq)]
pub struct Element {
    /// Its name.
    pub name: Located<String>,
    /// How its resistance depends on temperature.
    pub resistance: Resistance,
}

/// Resistance against temperature.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Resistance {
    /// Constant.
    Plain(Ohms),
    /// Self-regulating: R = R_s exp(a (T - T_s)) above the switch temperature, a
    /// smooth minimum below it, a slight rise towards cold.
    Ptc {
        /// `R at switch:` R_s.
        r_switch: Ohms,
        /// `switch temperature:` T_s.
        t_switch: Celsius,
        /// `steepness:` a, per kelvin.
        steepness: f64,
    },
}

/// Which elements a position feeds.
#[derive(Debug, Clone, PartialEq)]
pub struct PositionWiring {
    /// The position.
    pub name: Located<String>,
    /// `elements:` in parallel.
    pub elements: Vec<Located<String>>,
    /// `diode: yes` in series with all of them.
    pub diode: bool,
}

/// A fan on the unit's mains.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Fan {
    /// `power:` at 230 V.
    pub power: Watts,
    /// `cooling factor:` of the block's loss while it runs at 230 V.
    pub cooling: f64,
}

/// A cycling thermostat on the block.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Thermostat {
    /// `opens at:`
    pub opens_at: Celsius,
    /// `closes at:`
    pub closes_at: Celsius,
}

/// Lumped thermal network: elements heat the block; link body and enclosure hang on it.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Thermal {
    /// `block capacity:` J/K.
    pub block_j_per_k: f64,
    /// `block loss:` to the enclosure's inside and ambient, W/K, still air.
    pub block_w_per_k: f64,
    /// `link follows:` time constant of the link's body behind the block.
    pub link_lag: Seconds,
    /// `link share:` of the block's rise that reaches the link's body.
    pub link_share: Ratio,
    /// `enclosure capacity:` J/K.
    pub enclosure_j_per_k: f64,
    /// `enclosure loss:` W/K to ambient.
    pub enclosure_w_per_k: f64,
    /// `enclosure share:` of the block's loss that heats the enclosure.
    pub enclosure_share: Ratio,
}

/// What a condition does to the unit.
#[derive(Debug, Clone, PartialEq)]
pub struct ConditionEffect {
    /// The condition's name.
    pub name: Located<String>,
    /// `loss factor:` on the block's loss.
    pub loss_factor: f64,
}
