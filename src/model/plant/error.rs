//! Why a balance of streams cannot be drawn up.

use thiserror::Error;

use crate::fault::Explain;

/// What does not fit, with its figures in words where they carry a unit.
#[derive(Clone, Debug, PartialEq, Error)]
pub enum PlantError {
    #[error("`{species}` in the stream `{stream}` is given in {given}, which is no amount of it")]
    NotAnAmount { stream: String, species: String, given: String },
    #[error(
        "`{species}` in the stream `{stream}` is given as {given}, which is neither a quantity nor a text that reads as one"
    )]
    NotAQuantity { stream: String, species: String, given: String },
    #[error("`{species}` in the stream `{stream}` is given in {given}, of another substance")]
    OtherEntity { stream: String, species: String, given: String },
    #[error("`{species}` in the stream `{stream}` is negative, {amount}")]
    Negative { stream: String, species: String, amount: String },
    #[error("`{first}` is given as a flow and `{second}` as an amount")]
    FlowAndAmount { first: String, second: String },
    #[error("the fractions of the stream `{stream}` add up to {sum}, not to 1")]
    Fractions { stream: String, sum: String },
    #[error("the stream `{stream}` has nothing in it")]
    Empty { stream: String },
    #[error("`{function}` wants feeds, and none are given")]
    NoFeeds { function: &'static str },
    #[error("{what} does not balance: {fed} fed and {leaving} leaving")]
    Elements { what: String, fed: String, leaving: String },
    #[error("both products and reactions are given, and each says what leaves")]
    ProductsAndReactions,
    #[error("neither products nor the temperature of an outlet are given, so it is not known what leaves")]
    NoOutlet,
    #[error("an outlet temperature is given beside products that have their own")]
    OutletAndProducts,
    #[error("the extent of {reaction} is given in {given}, and the feeds are {feeds}")]
    Extent { reaction: String, given: String, feeds: &'static str },
    #[error("both an extent and a conversion are given for {reaction}")]
    ExtentAndConversion { reaction: String },
    #[error("a conversion in {reaction} is given, but not of which species")]
    ConversionOfNothing { reaction: String, known: String },
    #[error("`{species}` is not a reactant of {reaction} that is fed, so it has no conversion there")]
    ConversionOf { species: String, reaction: String, known: String },
    #[error("a conversion of {given} is not between 0 and 1")]
    ConversionRange { given: String },
    #[error("the reactions use up {used} of {species}, and {fed} is fed or formed")]
    Overdrawn { species: String, fed: String, used: String },
    #[error(
        "{first} and {second} are both to be complete and share {species}, so it is not determined how far each goes"
    )]
    SharedReactant { first: String, second: String, species: String },
    #[error("the balance would close {side} {t_k} K, where the data for {species} end")]
    BeyondData { side: &'static str, t_k: f64, species: String },
    #[error("no heat capacity of {species} is at hand, so the temperature of the contents cannot be found")]
    NoCapacity { species: String },
    #[error("the balance closes within a change of phase at {t_k:.2} K, with part of the contents on either side")]
    WithinTransition { t_k: f64 },
    #[error(
        "the contents of a batch start at one temperature, and `{first}` is at {first_k} K and `{second}` at {second_k} K"
    )]
    SeveralTemperatures { first: String, first_k: f64, second: String, second_k: f64 },
    #[error("a flow has no constant volume, and `{stream}` is given as a flow")]
    FlowAtConstantVolume { stream: String },
    #[error("the heat loss is given in {given}, and the feeds are {feeds}")]
    HeatLoss { given: String, feeds: &'static str },
    #[error("{given} is no pressure above zero")]
    Pressure { given: String },
    #[error("{enthalpy} over {capacity} is no temperature difference")]
    NotARise { enthalpy: String, capacity: String },
    #[error("a heat capacity of {given} is not positive")]
    CapacityNotPositive { given: String },
    #[error("a limit of {given} for the closure is not between 0 and 1")]
    Closure { given: f64 },
}

impl Explain for PlantError {
    fn code(&self) -> &'static str {
        match self {
            PlantError::NotAnAmount { .. } => "stream-not-an-amount",
            PlantError::NotAQuantity { .. } => "stream-not-a-quantity",
            PlantError::OtherEntity { .. } => "stream-of-another-substance",
            PlantError::Negative { .. } => "stream-negative",
            PlantError::FlowAndAmount { .. } => "flow-and-amount",
            PlantError::Fractions { .. } => "fractions-do-not-add-up",
            PlantError::Empty { .. } => "stream-empty",
            PlantError::NoFeeds { .. } => "feeds-missing",
            PlantError::Elements { .. } => "streams-not-balanced",
            PlantError::ProductsAndReactions => "products-and-reactions",
            PlantError::NoOutlet => "outlet-missing",
            PlantError::OutletAndProducts => "outlet-and-products",
            PlantError::Extent { .. } => "extent-not-an-amount",
            PlantError::ExtentAndConversion { .. } => "extent-and-conversion",
            PlantError::ConversionOfNothing { .. } => "conversion-of-nothing",
            PlantError::ConversionOf { .. } => "conversion-of-another-species",
            PlantError::ConversionRange { .. } => "conversion-out-of-range",
            PlantError::Overdrawn { .. } => "more-used-than-fed",
            PlantError::SharedReactant { .. } => "complete-reactions-share-a-reactant",
            PlantError::BeyondData { .. } => "balance-beyond-the-data",
            PlantError::NoCapacity { .. } => "capacity-of-contents-missing",
            PlantError::WithinTransition { .. } => "balance-within-a-transition",
            PlantError::SeveralTemperatures { .. } => "batch-of-several-temperatures",
            PlantError::FlowAtConstantVolume { .. } => "flow-at-constant-volume",
            PlantError::HeatLoss { .. } => "heat-loss-unit",
            PlantError::Pressure { .. } => "balance-pressure-not-positive",
            PlantError::NotARise { .. } => "not-a-temperature-rise",
            PlantError::CapacityNotPositive { .. } => "heat-capacity-not-positive",
            PlantError::Closure { .. } => "closure-out-of-range",
        }
    }

    fn hint(&self) -> String {
        match self {
            PlantError::NotAnAmount { .. } => {
                "give mol, kg, mol/s, kmol/h, kg/h or the like; a gas volume has no amount without its conditions"
                    .to_owned()
            }
            PlantError::NotAQuantity { species, .. } => {
                format!("write it with its unit, as in `#{{ \"{species}\": \"120 kmol/h\" }}`")
            }
            PlantError::OtherEntity { species, .. } => {
                format!("name what is in the stream by the same substance, or write plain moles of {species}")
            }
            PlantError::Negative { .. } => {
                "put what is drawn off among the products, as a stream of its own".to_owned()
            }
            PlantError::FlowAndAmount { .. } => {
                "give all streams per time, as in \"120 kmol/h\", or all as totals, as in \"120 mol\"".to_owned()
            }
            PlantError::Fractions { .. } => {
                "give all species of the stream, or amounts instead: `stream(name, T, #{ \"CO(g)\": \"120 kmol/h\" })`"
                    .to_owned()
            }
            PlantError::Empty { .. } => "name its species, as in `#{ \"CO(g)\": \"120 kmol/h\" }`".to_owned(),
            PlantError::NoFeeds { .. } => "give them as in `#{ feeds: [stream(\"feed\", T, amounts)] }`".to_owned(),
            PlantError::Elements { .. } => {
                "complete the streams, or give feeds and reactions, from which the products follow; measured flows \
                 that do not close may be let pass by a relative limit, as in `#{ closure: 0.001 }`"
                    .to_owned()
            }
            PlantError::ProductsAndReactions => {
                "give reactions and `outlet: \"260 degC\"`, or products alone".to_owned()
            }
            PlantError::NoOutlet => {
                "add `outlet: \"260 degC\"` for what leaves after the reactions, or give `products`".to_owned()
            }
            PlantError::OutletAndProducts => "leave `outlet` out; each product stream has its temperature".to_owned(),
            PlantError::Extent { feeds, .. } => match *feeds {
                "flows" => "give it per time, in moles of reaction, as in \"30 kmol/h\"".to_owned(),
                _ => "give it in moles of reaction, as in \"30 mol\"".to_owned(),
            },
            PlantError::ExtentAndConversion { .. } => "leave one of the two out".to_owned(),
            PlantError::ConversionOfNothing { known, .. } => format!("add `of:` with one of {known}"),
            PlantError::ConversionOf { known, .. } if known.is_empty() => {
                "give an extent, as in `extent: \"30 kmol/h\"`".to_owned()
            }
            PlantError::ConversionOf { known, .. } => format!("choose one of {known}, or give an extent"),
            PlantError::ConversionRange { .. } => {
                "give the fraction of what is fed that reacts, such as 0.35 or \"35 %\"".to_owned()
            }
            PlantError::Overdrawn { .. } => "lower the extents or conversions, or feed more".to_owned(),
            PlantError::SharedReactant { .. } => "give each an `extent`, or a `conversion` with `of`".to_owned(),
            PlantError::BeyondData { .. } => {
                "check amounts and feed temperatures; beyond the data nothing can be said of the contents".to_owned()
            }
            PlantError::NoCapacity { .. } => {
                "choose a phase that has one, or compute the heat at 298.15 K with `heat_balance`".to_owned()
            }
            PlantError::WithinTransition { .. } => {
                "take the temperature of the transition, and the heat that is left from `heat_balance` at either side"
                    .to_owned()
            }
            PlantError::SeveralTemperatures { .. } => {
                "mix them first: `adiabatic_temperature(#{ feeds: [...] })` without reactions gives the start"
                    .to_owned()
            }
            PlantError::FlowAtConstantVolume { .. } => {
                "give the contents of the vessel as amounts, as in \"120 mol\"".to_owned()
            }
            PlantError::HeatLoss { feeds, .. } => match *feeds {
                "flows" => "give it as a power, as in \"2 kW\"".to_owned(),
                _ => "give it as an energy, as in \"2 kJ\"".to_owned(),
            },
            PlantError::Pressure { .. } => "give the absolute pressure, as in \"50 bar\"".to_owned(),
            PlantError::NotARise { .. } => {
                "give both of the same contents: a heat in kJ over J/K, or kJ/kg over kJ/(kg K)".to_owned()
            }
            PlantError::CapacityNotPositive { .. } => "give the heat capacity of the contents, all of it".to_owned(),
            PlantError::Closure { .. } => "give the relative limit, such as 0.001".to_owned(),
        }
    }
}
