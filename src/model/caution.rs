//! Cautions: what must stand beside a figure that can hurt someone.
//!
//! A card declares its [`Caution`]; every value with a step of that card in its history carries it, in every form in which
//! the value is shown. The surprise: nothing takes a caution away, neither arithmetic nor a decision about an assumption.

use crate::model::card::call_of;
use crate::quantity::Quantity;
use crate::record::node;

/// What a figure is that needs a caution.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum Caution {
    AdiabaticTemperature,
    TemperatureRise,
    HeatDuty,
    GasEvolved,
    ClosedVesselPressure,
}

impl Caution {
    pub const ALL: [Caution; 5] = [
        Caution::AdiabaticTemperature,
        Caution::TemperatureRise,
        Caution::HeatDuty,
        Caution::GasEvolved,
        Caution::ClosedVesselPressure,
    ];

    /// What stands in the line of a value, where there is room for no more.
    pub const IN_SHORT: &'static str = "an estimate, not a safety case";

    pub fn text(self) -> String {
        let (figure, not_covered) = match self {
            Caution::AdiabaticTemperature => {
                ("an adiabatic temperature", "decomposition and reactions that were not written are not covered")
            }
            Caution::TemperatureRise => {
                ("a temperature rise", "decomposition that it may set off, and its rate, are not covered")
            }
            Caution::HeatDuty => {
                ("a heat duty", "decomposition, side reactions and the rate of heat release are not covered")
            }
            Caution::GasEvolved => {
                ("an amount of gas evolved", "gas from decomposition, and its rate, are not covered")
            }
            Caution::ClosedVesselPressure => {
                ("a closed-vessel pressure", "decomposition, and how fast the pressure rises, are not covered")
            }
        };
        format!(
            "{figure} computed here is {}; {not_covered}. Confirm it by measurement; local codes and licensed practice decide.",
            Caution::IN_SHORT
        )
    }
}

/// The cautions of every step that a value rests on, each once.
pub fn of(value: &Quantity) -> Vec<Caution> {
    let history = node::history(value.node());
    let mut found: Vec<Caution> = history.iter().filter_map(|node| call_of(node)?.card.caution).collect();
    found.sort_unstable();
    found.dedup();
    found
}

/// The same in words.
pub fn texts(value: &Quantity) -> Vec<String> {
    of(value).into_iter().map(Caution::text).collect()
}
