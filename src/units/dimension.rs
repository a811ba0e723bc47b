//! What a quantity measures: exponents of the base units, with amount and mass split by what they are *of*.
//!
//! A mole knows its entity, so J/mol[H2O] and J/mol[rxn] differ and the algebra keeps them apart: J/mol[H2O] times
//! mol[H2O]/mol[rxn] is J/mol[rxn]. The surprise: a bare mole is an entity too, the *open* one ([`Entity::OPEN`]), so
//! that products stay associative; it is bound to another entity only where two quantities meet (see [`Dimension::bind`]).

use std::collections::BTreeMap;
use std::fmt;
use std::sync::{LazyLock, Mutex};

use smallvec::SmallVec;

/// What moles or kilograms are of, interned for the life of the process. Output is sorted by name, never by number.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub struct Entity(u32);

struct Names {
    by_name: BTreeMap<&'static str, u32>,
    names: Vec<&'static str>,
}

static NAMES: LazyLock<Mutex<Names>> = LazyLock::new(|| {
    let mut table = Names { by_name: BTreeMap::new(), names: Vec::new() };
    for name in ["", "rxn", "e-", "H+"] {
        table.by_name.insert(name, table.names.len() as u32);
        table.names.push(name);
    }
    Mutex::new(table)
});

impl Entity {
    /// Moles of something not said.
    pub const OPEN: Entity = Entity(0);
    /// Moles of reaction as written.
    pub const RXN: Entity = Entity(1);
    pub const ELECTRON: Entity = Entity(2);
    pub const PROTON: Entity = Entity(3);

    /// The entity of that name; names are substances without phase (`H2O`, `n-butane`), `rxn`, or a stream (`feed`).
    pub fn named(name: &str) -> Entity {
        let mut table = NAMES.lock().unwrap_or_else(|poisoned| poisoned.into_inner());
        if let Some(&id) = table.by_name.get(name) {
            return Entity(id);
        }
        let id = table.names.len() as u32;
        let name: &'static str = Box::leak(name.to_owned().into_boxed_str());
        table.names.push(name);
        table.by_name.insert(name, id);
        Entity(id)
    }

    pub fn name(self) -> &'static str {
        NAMES.lock().unwrap_or_else(|poisoned| poisoned.into_inner()).names[self.0 as usize]
    }

    pub fn is_open(self) -> bool {
        self == Entity::OPEN
    }
}

/// Whether an entity's exponent counts moles or kilograms of it.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum Of {
    Amount,
    Mass,
}

/// The base units besides the mole, in the order of the exponents.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Base {
    Metre,
    Kilogram,
    Second,
    Ampere,
    Kelvin,
    Candela,
}

impl Base {
    pub const ALL: [Base; BASES] =
        [Base::Metre, Base::Kilogram, Base::Second, Base::Ampere, Base::Kelvin, Base::Candela];
}

const BASES: usize = 6;
const BASE_SYMBOLS: [&str; BASES] = ["m", "kg", "s", "A", "K", "cd"];

/// Exponents of the base units. Exponents are counted in halves, so that a square root of a unit has a dimension.
#[derive(Debug, Default, PartialEq, Eq, Hash)]
pub struct Dimension {
    halves: [i8; BASES],
    /// Sorted by (Of, Entity); no zero exponents. Equality of dimensions is equality of these fields.
    of: SmallVec<[(Of, Entity, i8); 2]>,
}

impl Clone for Dimension {
    /// Every step of arithmetic makes one: a copy of the bytes, where the derived form would push entity by entity.
    fn clone(&self) -> Self {
        Dimension { halves: self.halves, of: SmallVec::from_slice(&self.of) }
    }
}

impl Dimension {
    pub const fn none() -> Self {
        Dimension { halves: [0; BASES], of: SmallVec::new_const() }
    }

    pub fn base(base: Base) -> Self {
        let mut dimension = Dimension::none();
        dimension.halves[base as usize] = 2;
        dimension
    }

    /// One mole of an entity.
    pub fn amount(entity: Entity) -> Self {
        Dimension { halves: [0; BASES], of: SmallVec::from_slice(&[(Of::Amount, entity, 2)]) }
    }

    /// One kilogram of a named entity. (A kilogram of nothing in particular is [`Base::Kilogram`].)
    pub fn mass(entity: Entity) -> Self {
        Dimension { halves: [0; BASES], of: SmallVec::from_slice(&[(Of::Mass, entity, 2)]) }
    }

    /// From whole exponents of metre, kilogram, second, ampere, kelvin, candela.
    pub const fn whole(exponents: [i8; BASES]) -> Self {
        let mut halves = [0; BASES];
        let mut i = 0;
        while i < BASES {
            halves[i] = 2 * exponents[i];
            i += 1;
        }
        Dimension { halves, of: SmallVec::new_const() }
    }

    pub fn is_none(&self) -> bool {
        self.halves == [0; BASES] && self.of.is_empty()
    }

    /// Whether nothing but amounts and named masses is left, as in mol[H2O]/mol[rxn].
    pub fn is_basis_only(&self) -> bool {
        self.halves == [0; BASES]
    }

    /// The exponents of the base units alone, without entities.
    pub fn without_basis(&self) -> Dimension {
        Dimension { halves: self.halves, of: SmallVec::new() }
    }

    /// Whether the base units, entities apart, have these whole exponents, in the order of [`Dimension::whole`].
    pub fn has_bases(&self, exponents: [i8; BASES]) -> bool {
        self.halves == exponents.map(|exponent| 2 * exponent)
    }

    /// The entities with their exponents in halves, sorted by kind and interning order.
    pub fn entities(&self) -> &[(Of, Entity, i8)] {
        &self.of
    }

    /// Exponent, in halves, of one base unit.
    pub fn halves(&self, base: Base) -> i8 {
        self.halves[base as usize]
    }

    /// Exponent, in halves, of one entity.
    pub fn exponent_of(&self, of: Of, entity: Entity) -> i8 {
        self.of.iter().find(|e| e.0 == of && e.1 == entity).map_or(0, |e| e.2)
    }

    /// Whether an exponent has grown past what the program holds, so that the dimension is not to be trusted.
    pub fn is_saturated(&self) -> bool {
        let past = |halves: i8| halves == i8::MAX || halves == i8::MIN;
        self.halves.iter().any(|halves| past(*halves)) || self.of.iter().any(|(_, _, halves)| past(*halves))
    }

    /// Whether this is a value per mole of reaction as written.
    pub fn is_per_reaction(&self) -> bool {
        self.exponent_of(Of::Amount, Entity::RXN) == -2
    }

    pub fn has_open(&self) -> bool {
        self.exponent_of(Of::Amount, Entity::OPEN) != 0
    }

    pub fn times(&self, other: &Dimension) -> Dimension {
        self.combine(other, 1)
    }

    pub fn over(&self, other: &Dimension) -> Dimension {
        self.combine(other, -1)
    }

    fn combine(&self, other: &Dimension, sign: i8) -> Dimension {
        let mut halves = self.halves;
        for (mine, theirs) in halves.iter_mut().zip(other.halves) {
            *mine = mine.saturating_add(sign.saturating_mul(theirs));
        }
        let mut of = SmallVec::from_slice(&self.of);
        for &(kind, entity, exponent) in &other.of {
            add_exponent(&mut of, kind, entity, exponent.saturating_mul(sign));
        }
        Dimension { halves, of }
    }

    /// To the power `halves / 2`; `None` where an exponent would not be a whole number of halves or grows past any use.
    pub fn powered(&self, halves: i32) -> Option<Dimension> {
        let raise = |exponent: i8| {
            let product = i32::from(exponent) * halves;
            if product % 2 != 0 { None } else { i8::try_from(product / 2).ok() }
        };
        let mut out = Dimension::none();
        for (to, from) in out.halves.iter_mut().zip(self.halves) {
            *to = raise(from)?;
        }
        for &(kind, entity, exponent) in &self.of {
            let raised = raise(exponent)?;
            if raised != 0 {
                out.of.push((kind, entity, raised));
            }
        }
        Some(out)
    }

    /// The same dimension with the open mole made a mole of `entity`.
    pub fn bind(&self, entity: Entity) -> Dimension {
        let open = self.exponent_of(Of::Amount, Entity::OPEN);
        let mut of: SmallVec<[(Of, Entity, i8); 2]> =
            self.of.iter().copied().filter(|e| !(e.0 == Of::Amount && e.1.is_open())).collect();
        add_exponent(&mut of, Of::Amount, entity, open);
        Dimension { halves: self.halves, of }
    }

    /// The entities that would make `self`, with its open moles bound, equal to `other`.
    pub fn bindings_to(&self, other: &Dimension) -> Vec<Entity> {
        if !self.has_open() || self.halves != other.halves {
            return Vec::new();
        }
        let mut fits: Vec<Entity> = (self.of.iter().chain(&other.of))
            .filter(|e| e.0 == Of::Amount && !e.1.is_open())
            .map(|e| e.1)
            .filter(|&entity| self.bind(entity) == *other)
            .collect();
        fits.sort_by_key(|entity| entity.name());
        fits.dedup();
        fits
    }
}

fn add_exponent(of: &mut SmallVec<[(Of, Entity, i8); 2]>, kind: Of, entity: Entity, exponent: i8) {
    if exponent == 0 {
        return;
    }
    match of.binary_search_by(|e| (e.0, e.1).cmp(&(kind, entity))) {
        Ok(at) => {
            of[at].2 = of[at].2.saturating_add(exponent);
            if of[at].2 == 0 {
                of.remove(at);
            }
        }
        Err(at) => of.insert(at, (kind, entity, exponent)),
    }
}

/// Base units in a fixed order, entities by name: for messages about dimensions that no named unit fits.
impl fmt::Display for Dimension {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        if self.is_none() {
            return write!(f, "1");
        }
        let mut parts: Vec<(String, i8)> =
            BASE_SYMBOLS.iter().zip(self.halves).map(|(s, e)| ((*s).to_owned(), e)).filter(|p| p.1 != 0).collect();
        let mut entities: Vec<(String, i8)> = (self.of.iter())
            .map(|&(of, entity, exponent)| {
                let symbol = if of == Of::Amount { "mol" } else { "kg" };
                let name = if entity.is_open() { symbol.to_owned() } else { format!("{symbol}[{}]", entity.name()) };
                (name, exponent)
            })
            .collect();
        entities.sort();
        parts.append(&mut entities);
        let shown: Vec<String> = parts
            .into_iter()
            .map(|(symbol, exponent)| match exponent {
                2 => symbol,
                e if e % 2 == 0 => format!("{symbol}^{}", e / 2),
                e => format!("{symbol}^({e}/2)"),
            })
            .collect();
        write!(f, "{}", shown.join(" "))
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_stoichiometric_number_turns_one_basis_into_another() {
        let water = Entity::named("H2O");
        let per_water = Dimension::whole([2, 1, -2, 0, 0, 0]).over(&Dimension::amount(water));
        let nu = Dimension::amount(water).over(&Dimension::amount(Entity::RXN));
        let per_reaction = per_water.times(&nu);
        assert!(per_reaction.is_per_reaction());
        assert_eq!(per_reaction.exponent_of(Of::Amount, water), 0);
        assert_eq!(per_reaction.over(&nu), per_water);
    }

    #[test]
    fn an_open_mole_binds_to_the_one_entity_that_fits() {
        let open = Dimension::none().over(&Dimension::amount(Entity::OPEN));
        let methane = Dimension::none().over(&Dimension::amount(Entity::named("CH4")));
        assert_eq!(open.bindings_to(&methane), vec![Entity::named("CH4")]);
        assert!(methane.bindings_to(&open).is_empty());
    }

    #[test]
    fn square_roots_keep_halves_and_quarters_are_refused() {
        let metre = Dimension::base(Base::Metre);
        let root = metre.powered(1).unwrap();
        assert_eq!(root.to_string(), "m^(1/2)");
        assert_eq!(root.powered(4).unwrap(), metre);
        assert!(root.powered(1).is_none());
    }
}
