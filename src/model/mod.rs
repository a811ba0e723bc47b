//! Formulas: one file per family, each with its doc, its function, its cards and its tests.
//!
//! [`CARDS`] is the one list of what the program can compute. Script binding, help, catalogue and checks read it.

pub mod answer;
pub mod argument;
pub mod association;
pub mod basis;
pub mod budget;
pub mod card;
pub mod caution;
pub mod check_line;
pub mod claims;
pub mod compare;
pub mod conditions;
pub mod curve;
pub mod curve_card;
pub mod cycle;
pub mod decomposition;
pub mod derivation;
pub mod equilibrium;
pub mod expanded;
pub mod first_order;
pub mod fit;
pub mod fit_card;
pub mod fit_error;
pub mod function;
pub mod gap;
pub mod gather;
pub mod given;
pub mod grid;
pub mod heat_capacity;
pub mod linearity;
pub mod mass;
pub mod molecule;
pub mod monte_carlo;
pub mod origin;
pub mod path;
pub mod plant;
pub mod pressure;
pub mod property;
pub mod property_card;
pub mod quantities;
pub mod reaction;
pub mod readings;
pub mod refusal;
pub mod remedy;
pub mod review;
pub mod shortcut;
pub mod solid;
mod stated;
pub mod statmech;
pub mod substance;
pub mod sweep;
pub mod symbols;
pub mod table;
pub mod table_card;
pub mod tabulated;
pub mod terms;
pub mod thermo;
pub mod tolerance;
pub mod van_t_hoff;
pub mod vapour;
pub mod vessel;
pub mod virial;
pub mod volume;

use card::Card;

/// Every formula the program offers, in the order the catalogue prints them.
pub const CARDS: &[&Card] = &[
    &reaction::REACTION,
    &reaction::BALANCE,
    &substance::SUBSTANCE,
    &substance::SUBSTANCES,
    &property_card::ENTHALPY,
    &property_card::INTERNAL_ENERGY,
    &property_card::GIBBS_ENERGY,
    &property_card::HELMHOLTZ_ENERGY,
    &property_card::ENTROPY,
    &property_card::HEAT_CAPACITY,
    &property_card::EQUILIBRIUM_CONSTANT,
    &cycle::CYCLE,
    &property_card::SUBSTANCE_ENTHALPY,
    &property_card::SUBSTANCE_INTERNAL_ENERGY,
    &property_card::SUBSTANCE_GIBBS_ENERGY,
    &property_card::SUBSTANCE_HELMHOLTZ_ENERGY,
    &property_card::SUBSTANCE_ENTROPY,
    &property_card::SUBSTANCE_HEAT_CAPACITY,
    &equilibrium::EQUILIBRIUM_TEMPERATURE,
    &equilibrium::REACTION_QUOTIENT,
    &equilibrium::DIRECTION,
    &vessel::TO_OPEN_VESSEL,
    &vessel::TO_CLOSED_VESSEL,
    &vessel::GAS_EVOLVED,
    &vessel::VESSEL_PRESSURE,
    &volume::MOLAR_VOLUME,
    &volume::HEAT_CAPACITY_V,
    &volume::HEAT_CAPACITY_DIFFERENCE,
    &van_t_hoff::CONSTANT_AT,
    &van_t_hoff::ENTHALPY_FROM_CONSTANTS,
    &van_t_hoff::GIBBS_FROM_CONSTANT,
    &van_t_hoff::GIBBS_AT,
    &van_t_hoff::VAPORISATION_FROM_PRESSURES,
    &van_t_hoff::VAPOUR_PRESSURE_AT,
    &van_t_hoff::BOILING_POINT_AT,
    &fit_card::FIT_HEAT_CAPACITY,
    &fit_card::INTERPOLATE_HEAT_CAPACITY,
    &vapour::VAPOUR_PRESSURE,
    &vapour::BOILING_POINT,
    &vapour::VAPORISATION_ENTHALPY,
    &substance::ENTHALPY_INCREMENT,
    &substance::REACTION_INCREMENT,
    &molecule::limits::MOLECULE,
    &molecule::limits::MOLECULE_TABLE,
    &molecule::limits::TAKEN,
    &molecule::answers::HEAT_CAPACITY,
    &molecule::answers::HEAT_CAPACITY_V,
    &molecule::answers::ENTROPY,
    &molecule::answers::ENTHALPY_INCREMENT,
    &molecule::answers::GIBBS_ENERGY,
    &molecule::shares::CONTRIBUTIONS,
    &molecule::limits::CLASSICAL_LIMIT,
    &molecule::limits::EQUIPARTITION_TEMPERATURE,
    &molecule::torsion_levels::TORSION_LEVELS,
    &molecule::limits::ZERO_POINT,
    &molecule::limits::GROUND_STATE,
    &molecule::formation::FORMATION_ENTHALPY,
    &molecule::power_fit::POWER_FIT,
    &solid::answers::CRYSTAL,
    &solid::answers::HEAT_CAPACITY,
    &solid::answers::HEAT_CAPACITY_V,
    &solid::answers::ENTROPY,
    &solid::answers::ENTHALPY_INCREMENT,
    &solid::answers::GIBBS_ENERGY,
    &solid::answers::POWER_FIT,
    &solid::answers::CONTRIBUTIONS,
    &solid::answers::CLASSICAL_LIMIT,
    &solid::answers::FORMATION_ENTHALPY,
    &solid::fit::DEBYE_TEMPERATURE,
    &solid::fit::EINSTEIN_TEMPERATURE,
    &solid::estimate::KOPP,
    &solid::estimate::DULONG_PETIT,
    &remedy::CORRECTED,
    &remedy::WIDENED,
    &shortcut::VALID_TO,
    &shortcut::COMPARE_SHORTCUTS,
    &plant::stream::STREAM,
    &plant::balance::HEAT_BALANCE,
    &plant::adiabatic::ADIABATIC_TEMPERATURE,
    &plant::rise::TEMPERATURE_RISE,
    &plant::rise::RISE_OF_FIGURES,
    &grid::GRID,
    &grid::GRID_OF,
    &curve_card::X,
    &curve_card::Y,
    &curve_card::AT,
    &curve_card::TO,
    &curve_card::VALUES,
    &curve_card::UNCERTAINTIES,
    &curve_card::MIN,
    &curve_card::MAX,
    &curve_card::CROSSINGS,
    &table_card::COLUMNS,
    &table_card::COLUMN,
    &table_card::CURVE,
    &basis::PER,
    &mass::PER_MASS,
    &mass::PER_MOLE,
    &mass::PER_KG_OF,
    &mass::WAVENUMBER_ENERGY,
    &mass::MOLAR_MASS,
    &quantities::MEAN,
    &quantities::TO,
    &quantities::VALUE,
    &quantities::UNCERTAINTY,
    &quantities::AGREES,
    &quantities::ASSUME,
    &readings::READINGS,
    &readings::CORRELATION,
    &budget::BUDGET,
    &expanded::EXPANDED,
    &monte_carlo::MONTE_CARLO,
    &linearity::TESTED,
    &derivation::DERIVATION,
    &compare::COMPARE,
    &gap::EXPLAIN_GAP,
];
