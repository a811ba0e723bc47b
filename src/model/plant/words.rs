//! What a report says of a balance before its figures: the reactions, and the conditions of every stream.

use std::rc::Rc;

use crate::model::card::Call;
use crate::model::plant::adiabatic::ADIABATIC_TEMPERATURE;
use crate::model::plant::balance::HEAT_BALANCE;
use crate::model::plant::contents;
use crate::model::plant::rise::TEMPERATURE_RISE;
use crate::model::plant::stream::Stream;
use crate::quantity::round;

fn is_balance(call: &Call) -> bool {
    [HEAT_BALANCE.id, ADIABATIC_TEMPERATURE.id, TEMPERATURE_RISE.id].contains(&call.card.id)
}

/// The reactions of a balance; without any, its streams by name.
pub fn about(call: &Call) -> Vec<String> {
    if !is_balance(call) {
        return Vec::new();
    }
    let reactions: Vec<String> = contents::reactions(call).iter().map(|one| one.text().to_owned()).collect();
    if !reactions.is_empty() {
        return reactions;
    }
    let names = |streams: &[Rc<Stream>]| streams.iter().map(|one| one.name.to_string()).collect::<Vec<_>>().join(" + ");
    let (feeds, products) = (contents::streams(call, "feeds"), contents::streams(call, "products"));
    vec![if products.is_empty() { names(&feeds) } else { format!("{} to {}", names(&feeds), names(&products)) }]
}

/// Conditions in one line; `None` for what is no balance.
pub fn conditions(call: &Call) -> Option<String> {
    if !is_balance(call) {
        return None;
    }
    let kelvin = |t_k: f64| format!("{} K", round::shortest(round::significant(t_k, 10).parse().unwrap_or(t_k)));
    let one = |stream: &Rc<Stream>| format!("{} {}", stream.name, kelvin(stream.t.si()));
    let feeds = contents::streams(call, "feeds");
    let mut streams: Vec<String> = feeds.iter().map(one).collect();
    streams.extend(contents::streams(call, "products").iter().map(one));
    streams.extend(contents::quantity(call, "outlet").map(|t| format!("outlet {}", kelvin(t.si()))));
    let what = match call.card.id {
        id if id == HEAT_BALANCE.id => "heat taken up by the contents, negative: to be removed",
        id if id == ADIABATIC_TEMPERATURE.id => "no heat exchanged",
        _ => "no heat exchanged, heat capacity of what is there at the start",
    };
    let constant = call.option("constant").map_or("pressure", |word| &**word);
    let pressure = contents::quantity(call, "pressure");
    let pressure = pressure.map_or_else(String::new, |p| format!(" of {} bar", round::shortest(p.si() / 1e5)));
    let pressure = match (constant, pressure.as_str()) {
        ("volume", "") => "constant volume".to_owned(),
        ("volume", at) => format!("constant volume, from a pressure{at}"),
        (_, at) => format!("constant pressure{at}"),
    };
    let gas = feeds.iter().any(|feed| feed.portions.iter().any(|portion| portion.term.substance.species.is_gas()));
    let ideal = if gas { "; gases ideal" } else { "" };
    Some(format!("{what}; {pressure}; {}{ideal}", streams.join(", ")))
}
