//! Sallen–Key low-pass: `R1` and `R2` to the + input, `C1` from between them to the output, `C2` to ground.

use super::{
    Labels,
    kit::{Canvas, LABEL_HEIGHT, Symbol},
    surroundings::{self as s, End, Path},
};

/// Draws the stage.
pub fn draw(c: &mut Canvas, l: &Labels) {
    section(c, l, [(Symbol::Resistor, "R1"), (Symbol::Resistor, "R2")], (Symbol::Capacitor, "C1"), (Symbol::Capacitor, "C2"));
}

/// A Sallen–Key section: two parts in series to the + input, one from between them to the output, one from the input to ground.
pub fn section(c: &mut Canvas, l: &Labels, series: [(Symbol, &str); 2], over: (Symbol, &str), shunt: (Symbol, &str)) {
    // `Rg`'s ground keeps clear of the wire that rises from the inner node.
    let (x, y) = (s::INNER + if l.has("Rg") { 122 } else { 104 }, 0);
    let drop = x + s::DROP;
    let line = y + 22 + LABEL_HEIGHT + 14;
    let part = |(symbol, name): (Symbol, &str)| l.component(name).map(|label| (symbol, label));

    let mut paths = vec![Path { from: (x, y), to: End::Sensed, part: part((Symbol::Resistor, "Rf")) }];
    paths.push(Path { from: (s::INNER, line), to: End::Sensed, part: part(over) });
    s::amplifier_with(c, l, (x, y), paths);
    if let Some(label) = l.component("Rg") {
        let end = x - 108;
        c.dot(x, y);
        c.across(Symbol::Resistor, end, x, x - 56, y, label);
        c.wire(&[(end, y), (end, y + 12)]);
        c.ground(end, y + 12);
    }

    // The source's own impedance stands lower than the label of what hangs from the + input.
    s::voltage_source(c, l, line, line + if l.source_impedance().is_some() { 80 } else { 32 });
    if let Some((symbol, label)) = part(series[0]) {
        c.across(symbol, s::SOURCE_X, s::INNER, s::FIRST, line, label);
    }
    c.dot(s::INNER, line);
    if let Some((symbol, label)) = part(series[1]) {
        c.across(symbol, s::INNER, x, x - 48, line, label);
    }
    c.dot(x, line);
    c.wire(&[(x, line), (drop, line), (drop, y + s::PITCH), (x + s::PINS, y + s::PITCH)]);
    if let Some((symbol, label)) = part(shunt) {
        let (middle, depth) = if symbol == Symbol::Resistor { (34, 60) } else { (31, 52) };
        c.upright_left(symbol, x, line, line + depth, line + middle, label);
        c.ground(x, line + depth);
    }
}
