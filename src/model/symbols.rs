//! The equation behind each formula, with its symbols, as a derivation shows it.
//!
//! [`of`] finds it by the card's id; a card that is not here is explained by its own words and arguments. The surprise:
//! LaTeX stands beside the text, since neither can be made of the other without loss.

use crate::model::card::Card;

/// An equation with what its symbols mean.
#[derive(Debug, PartialEq)]
pub struct Formula {
    pub text: &'static str,
    pub latex: &'static str,
    pub symbols: &'static [Symbol],
}

/// One symbol of an equation.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Symbol {
    pub text: &'static str,
    pub latex: &'static str,
    pub unit: &'static str,
    pub meaning: &'static str,
}

const fn symbol(text: &'static str, latex: &'static str, unit: &'static str, meaning: &'static str) -> Symbol {
    Symbol { text, latex, unit, meaning }
}

const NU: Symbol = symbol("ν", r"\nu", "1", "stoichiometric numbers as written, positive for products");
const FORMATION: Symbol = symbol(
    "ΔfH°",
    r"\Delta_\mathrm{f}H^\circ",
    "kJ/mol",
    "formation enthalpies at 298.15 K, all from one dataset unless another is asked for",
);
const INCREMENT: Symbol = symbol(
    "H(T) - H(298.15 K)",
    r"H(T)-H(298.15\,\mathrm{K})",
    "kJ/mol",
    "enthalpy increments, closed-form integrals of Cp and recorded changes of phase between",
);
const ENTROPY: Symbol =
    symbol("S°", r"S^\circ", "J/(K mol)", "third-law entropies without nuclear spin, closed-form integrals of Cp/T");
const CAPACITY: Symbol = symbol("Cp°", r"C_p^\circ", "J/(K mol)", "heat capacities at constant pressure");
const TEMPERATURE: Symbol = symbol("T", "T", "K", "temperature");
const DELTA_N: Symbol = symbol("Δn(gas)", r"\Delta n(\mathrm{gas})", "1", "sum of ν of the gases");
const GAS_CONSTANT: Symbol = symbol("R", "R", "J/(K mol)", "gas constant of the constant set in force");

static ENTHALPY: Formula = Formula {
    text: "ΔrH°(T) = Σ ν [ΔfH°(298.15 K) + H(T) - H(298.15 K)]",
    latex: r"\Delta_\mathrm{r}H^\circ(T)=\sum\nu\,[\Delta_\mathrm{f}H^\circ(298.15\,\mathrm{K})+H(T)-H(298.15\,\mathrm{K})]",
    symbols: &[NU, FORMATION, INCREMENT, TEMPERATURE],
};
static INTERNAL_ENERGY: Formula = Formula {
    text: "ΔrU°(T) = ΔrH°(T) - Δn(gas) R T",
    latex: r"\Delta_\mathrm{r}U^\circ(T)=\Delta_\mathrm{r}H^\circ(T)-\Delta n(\mathrm{gas})\,RT",
    symbols: &[NU, FORMATION, INCREMENT, DELTA_N, GAS_CONSTANT, TEMPERATURE],
};
static GIBBS_ENERGY: Formula = Formula {
    text: "ΔrG°(T) = ΔrH°(T) - T Σ ν S°(T)",
    latex: r"\Delta_\mathrm{r}G^\circ(T)=\Delta_\mathrm{r}H^\circ(T)-T\sum\nu\,S^\circ(T)",
    symbols: &[NU, FORMATION, INCREMENT, ENTROPY, TEMPERATURE],
};
static HELMHOLTZ_ENERGY: Formula = Formula {
    text: "ΔrA°(T) = ΔrG°(T) - Δn(gas) R T",
    latex: r"\Delta_\mathrm{r}A^\circ(T)=\Delta_\mathrm{r}G^\circ(T)-\Delta n(\mathrm{gas})\,RT",
    symbols: &[NU, FORMATION, INCREMENT, ENTROPY, DELTA_N, GAS_CONSTANT, TEMPERATURE],
};
static REACTION_ENTROPY: Formula = Formula {
    text: "ΔrS°(T) = Σ ν S°(T)",
    latex: r"\Delta_\mathrm{r}S^\circ(T)=\sum\nu\,S^\circ(T)",
    symbols: &[NU, ENTROPY, TEMPERATURE],
};
static HEAT_CAPACITY: Formula = Formula {
    text: "ΔrCp°(T) = Σ ν Cp°(T)",
    latex: r"\Delta_\mathrm{r}C_p^\circ(T)=\sum\nu\,C_p^\circ(T)",
    symbols: &[NU, CAPACITY, TEMPERATURE],
};
static EQUILIBRIUM_CONSTANT: Formula = Formula {
    text: "K°(T) = exp(-ΔrG°(T)/(R T))",
    latex: r"K^\circ(T)=\exp\!\left(-\frac{\Delta_\mathrm{r}G^\circ(T)}{RT}\right)",
    symbols: &[NU, FORMATION, INCREMENT, ENTROPY, GAS_CONSTANT, TEMPERATURE],
};
static SUBSTANCE_ENTHALPY: Formula = Formula {
    text: "H°(T) = ΔfH°(298.15 K) + H(T) - H(298.15 K)",
    latex: r"H^\circ(T)=\Delta_\mathrm{f}H^\circ(298.15\,\mathrm{K})+H(T)-H(298.15\,\mathrm{K})",
    symbols: &[FORMATION, INCREMENT, TEMPERATURE],
};
static SUBSTANCE_INTERNAL_ENERGY: Formula = Formula {
    text: "U°(T) = H°(T) - R T for a gas",
    latex: r"U^\circ(T)=H^\circ(T)-RT\ \text{for a gas}",
    symbols: &[FORMATION, INCREMENT, GAS_CONSTANT, TEMPERATURE],
};
static SUBSTANCE_GIBBS_ENERGY: Formula = Formula {
    text: "G°(T) = H°(T) - T S°(T)",
    latex: r"G^\circ(T)=H^\circ(T)-T\,S^\circ(T)",
    symbols: &[FORMATION, INCREMENT, ENTROPY, TEMPERATURE],
};
static SUBSTANCE_HELMHOLTZ_ENERGY: Formula = Formula {
    text: "A°(T) = G°(T) - R T for a gas",
    latex: r"A^\circ(T)=G^\circ(T)-RT\ \text{for a gas}",
    symbols: &[FORMATION, INCREMENT, ENTROPY, GAS_CONSTANT, TEMPERATURE],
};
static SUBSTANCE_ENTROPY: Formula = Formula { text: "S°(T)", latex: r"S^\circ(T)", symbols: &[ENTROPY, TEMPERATURE] };
static SUBSTANCE_HEAT_CAPACITY: Formula =
    Formula { text: "Cp°(T)", latex: r"C_p^\circ(T)", symbols: &[CAPACITY, TEMPERATURE] };
static PER: Formula = Formula {
    text: "x per mole of X = x / |ν(X)|",
    latex: r"x_\mathrm{X}=x/|\nu(\mathrm{X})|",
    symbols: &[
        symbol("x", "x", "as given", "a value per mole of reaction as written"),
        symbol("ν(X)", r"\nu(\mathrm{X})", "1", "stoichiometric number of X in that reaction"),
    ],
};

const SHARES: Symbol =
    symbol("Σ", r"\Sigma", "R", "sum over translation, rotation, vibrations, torsions and electronic levels");
static MOLECULE_CP: Formula = Formula {
    text: "Cp°(T) = R (1 + Σ Cv/R)",
    latex: r"C_p^\circ(T)=R\,(1+\sum C_V/R)",
    symbols: &[SHARES, GAS_CONSTANT, TEMPERATURE],
};
static MOLECULE_CV: Formula =
    Formula { text: "Cv(T) = R Σ Cv/R", latex: r"C_V(T)=R\sum C_V/R", symbols: &[SHARES, GAS_CONSTANT, TEMPERATURE] };
static MOLECULE_S: Formula =
    Formula {
        text: "S°(T) = R Σ S/R", latex: r"S^\circ(T)=R\sum S/R", symbols: &[SHARES, GAS_CONSTANT, TEMPERATURE]
    };
static MOLECULE_H: Formula = Formula {
    text: "H(T) - H(T0) = R T (1 + Σ U/RT) - R T0 (1 + Σ U/RT0)",
    latex: r"H(T)-H(T_0)=RT\,(1+\sum U/RT)-RT_0\,(1+\sum U/RT_0)",
    symbols: &[SHARES, GAS_CONSTANT, TEMPERATURE],
};
static MOLECULE_G: Formula = Formula {
    text: "G°(T) - H°(298.15 K) = H(T) - H(298.15 K) - T S°(T)",
    latex: r"G^\circ(T)-H^\circ(298.15\,\mathrm{K})=H(T)-H(298.15\,\mathrm{K})-T\,S^\circ(T)",
    symbols: &[SHARES, GAS_CONSTANT, TEMPERATURE],
};

const DUTY: Symbol =
    symbol("Q", "Q", "kJ or kW", "heat taken up by the contents at constant pressure; negative: to be removed");
const MOLES: Symbol = symbol("n", "n", "mol or mol/s", "amounts, or flows, of the species of a stream");
const MOLAR: Symbol = symbol(
    "H(T)",
    "H(T)",
    "kJ/mol",
    "counted from the elements at 298.15 K, one dataset of formation enthalpies; at constant volume U = H - R T of gases",
);
static HEAT_BALANCE: Formula = Formula {
    text: "Q = Σ n H(T), leaving - Σ n H(T), fed",
    latex: r"Q=\sum_\mathrm{leaving}n\,H(T)-\sum_\mathrm{fed}n\,H(T)",
    symbols: &[DUTY, MOLES, MOLAR],
};
static ADIABATIC: Formula = Formula {
    text: "Σ n H(T), after = Σ n H, fed",
    latex: r"\sum_\mathrm{after}n\,H(T)=\sum_\mathrm{fed}n\,H",
    symbols: &[MOLES, MOLAR, TEMPERATURE],
};
static RISE: Formula = Formula {
    text: "ΔT = -Σ ξ ΔrH / Σ n Cp, at the start",
    latex: r"\Delta T=-\frac{\sum\xi\,\Delta_\mathrm{r}H}{\sum n\,C_p}",
    symbols: &[symbol("ξ", r"\xi", "mol", "extents of reaction"), MOLES, CAPACITY],
};

/// By the id of the card.
static FORMULAS: &[(&str, &Formula)] = &[
    ("reaction.enthalpy", &ENTHALPY),
    ("reaction.internal-energy", &INTERNAL_ENERGY),
    ("reaction.gibbs-energy", &GIBBS_ENERGY),
    ("reaction.helmholtz-energy", &HELMHOLTZ_ENERGY),
    ("reaction.entropy", &REACTION_ENTROPY),
    ("reaction.heat-capacity", &HEAT_CAPACITY),
    ("reaction.equilibrium-constant", &EQUILIBRIUM_CONSTANT),
    ("substance.enthalpy", &SUBSTANCE_ENTHALPY),
    ("substance.internal-energy", &SUBSTANCE_INTERNAL_ENERGY),
    ("substance.gibbs-energy", &SUBSTANCE_GIBBS_ENERGY),
    ("substance.helmholtz-energy", &SUBSTANCE_HELMHOLTZ_ENERGY),
    ("substance.entropy", &SUBSTANCE_ENTROPY),
    ("substance.heat-capacity", &SUBSTANCE_HEAT_CAPACITY),
    ("molecule.heat-capacity", &MOLECULE_CP),
    ("molecule.heat-capacity-v", &MOLECULE_CV),
    ("molecule.entropy", &MOLECULE_S),
    ("molecule.enthalpy-increment", &MOLECULE_H),
    ("molecule.gibbs-energy", &MOLECULE_G),
    ("quantity.per", &PER),
    ("plant.heat-balance", &HEAT_BALANCE),
    ("plant.adiabatic-temperature", &ADIABATIC),
    ("plant.temperature-rise", &RISE),
];

/// The equation of a card.
pub fn of(card: &Card) -> Option<&'static Formula> {
    FORMULAS.iter().find(|(id, _)| *id == card.id).map(|(_, formula)| *formula)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::model::CARDS;
    use crate::model::property::Property;

    #[test]
    fn every_equation_belongs_to_a_card_and_every_property_of_a_reaction_has_one() {
        for (id, formula) in FORMULAS {
            assert!(CARDS.iter().any(|card| card.id == *id), "{id} is no card");
            assert!(formula.symbols.iter().all(|s| !s.meaning.is_empty() && !s.unit.is_empty()), "{id}");
        }
        for card in CARDS.iter().filter(|card| Property::of(card).is_some()) {
            assert!(of(card).is_some(), "{} has no equation", card.id);
        }
    }
}
