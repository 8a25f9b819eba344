//! What stands around every amplifier: source and input network at the left, feedback above, output and load at the right.

use super::{
    Labels,
    kit::{Canvas, Label, Symbol, Upper},
};
use stageleaf_math::{
    kind::Kind,
    stage::{Converter, Isolation, Source},
};

/// Where the source's column stands.
pub const SOURCE_X: i32 = 20;
/// Middle of the first of two parts in a row, whose label begins left of the source.
pub const FIRST: i32 = 47;
/// The node between two parts in a row.
pub const INNER: i32 = 104;
/// From the inverting node to the wire that carries the other input down.
pub const DROP: i32 = 12;
/// The same where no branch hangs at the node, so that what hangs there keeps clear of the snubber.
pub const NEAR: i32 = 4;
/// From the inverting node to the amplifier's pins.
pub const PINS: i32 = 34;
/// From the inverting node to the output node.
const OUTPUT: i32 = 132;
/// From the output node to the load.
const LOAD: i32 = 120;
/// From the output's last column to the converter's input, so that the label of what stands there keeps clear of that column.
const CONVERTER: i32 = 130;
/// From the inverting input's height to the other's.
pub const PITCH: i32 = 44;

/// Where a feedback path ends.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum End {
    /// At the amplifier's pin.
    Pin,
    /// Where the output is sensed: at the load, if the isolation resistor stands inside the loop.
    Sensed,
}

/// A feedback path over the amplifier.
#[derive(Clone, Debug)]
pub struct Path {
    /// The node from which it rises.
    pub from: (i32, i32),
    /// Where it ends.
    pub to: End,
    /// Its part; none for a wire.
    pub part: Option<(Symbol, Label)>,
}

/// The amplifier with `Rf ∥ Cf`, snubber, isolation and load. `node` is the inverting node; its wire to the pin is drawn here.
pub fn amplifier_and_output(c: &mut Canvas, l: &Labels, node: (i32, i32)) {
    let mut paths = Vec::new();
    // The capacitor inside, since it senses the pin.
    if let Some(label) = l.component("Cf") {
        paths.push(Path { from: node, to: End::Pin, part: Some((Symbol::Capacitor, label)) });
    }
    match l.component("Rf") {
        Some(label) => paths.push(Path { from: node, to: End::Sensed, part: Some((Symbol::Resistor, label)) }),
        None if paths.is_empty() => paths.push(Path { from: node, to: End::Sensed, part: None }),
        None => {}
    }
    amplifier_with(c, l, node, paths);
}

/// The amplifier with these feedback paths, the inmost first; with snubber, isolation and load.
pub fn amplifier_with(c: &mut Canvas, l: &Labels, node: (i32, i32), paths: Vec<Path>) {
    amplifier_turned(c, l, node, Upper::Inverting, paths);
}

/// The amplifier of a comparator: its + input above at `node`, to which `R2` leads back; with isolation and load. The line to its other
/// input, [`PITCH`] below, ends at the column that is returned.
pub fn comparator(c: &mut Canvas, l: &Labels, (x, y): (i32, i32)) -> i32 {
    let feedback = l.component("R2").map(|label| Path { from: (x, y), to: End::Sensed, part: Some((Symbol::Resistor, label)) });
    amplifier_turned(c, l, (x, y), Upper::NonInverting, feedback.into_iter().collect());
    if let Some(label) = l.component("R3") {
        c.upright_left(Symbol::Resistor, x, y, y + 64, y + 36, label);
        c.ground(x, y + 64);
    }
    c.dot(x, y);
    let column = x + 20;
    c.wire(&[(column, y + PITCH), (x + PINS, y + PITCH)]);
    column
}

/// The reference hanging at `(x, y)`, behind its resistance; returns how far down it reaches.
pub fn reference(c: &mut Canvas, l: &Labels, x: i32, y: i32) -> i32 {
    let mut end = y;
    if let Some(label) = l.reference_resistance() {
        c.upright_left(Symbol::Resistor, x, y, y + 50, y + 26, label);
        end += 50;
    }
    c.steady(x, end, end + 34, l.reference_voltage().ok_or("Vref"));
    end + 65
}

fn amplifier_turned(c: &mut Canvas, l: &Labels, (x, y): (i32, i32), upper: Upper, paths: Vec<Path>) {
    let (positive, negative) = l.rails();
    // Of several amplifiers, the last one drives the output.
    let count = l.stage().kind.spec().amplifiers;
    let name = (count > 1).then(|| format!("A{count}"));
    let (tip, out) = c.amplifier_named((x + PINS, y), upper, name.as_deref(), (&positive, negative.as_deref()));
    c.wire(&[(x, y), (x + PINS, y)]);
    let pin = x + OUTPUT;
    let load = pin + LOAD;
    let isolated = l.has("Riso");
    let inside = isolated && l.stage().isolation == Isolation::InsideLoop;
    let sensed = if inside { load } else { pin };

    let branches = !inside || l.has("Rsn") || paths.iter().any(|p| p.to == End::Pin);
    feedback(c, paths, x + OUTPUT / 2, y - 66, |end| (if end == End::Sensed { sensed } else { pin }, out));

    c.wire(&[(tip, out), (pin, out)]);
    if branches {
        c.dot(pin, out);
    }
    if let Some(label) = l.component("Rsn") {
        c.upright_left(Symbol::Resistor, pin, out, out + 105, out + 84, label);
        if let Some(label) = l.component("Csn") {
            c.upright_left(Symbol::Capacitor, pin, out + 105, out + 140, out + 126, label);
        }
        c.ground(pin, out + 140);
    }

    let (rl, cl) = (l.load_resistance(), l.load_capacitance());
    let mut end = pin;
    if let Some(label) = l.component("Riso") {
        c.across(Symbol::Resistor, pin, load, pin + 54, out, label);
        end = load;
        if inside {
            c.dot(load, out);
        }
    }
    if let Some(label) = rl {
        c.wire(&[(end, out), (load, out)]);
        c.dot(load, out);
        c.upright_left(Symbol::Resistor, load, out, out + 64, out + 36, label);
        c.ground(load, out + 64);
        end = load;
    }
    if let Some(label) = cl {
        // Longer than the resistor, so that its label passes below the resistor's ground.
        let (at, middle) = if end == load && l.load_resistance().is_some() { (load + 26, out + 98) } else { (load, out + 36) };
        c.wire(&[(end, out), (at, out)]);
        c.dot(at, out);
        c.upright_left(Symbol::Capacitor, at, out, middle + 20, middle, label);
        c.ground(at, middle + 20);
        end = at;
    }
    if l.stage().converter != Converter::default() {
        return converter(c, l, end, out);
    }
    let terminal = end + if end == pin { 46 } else { 24 };
    c.wire(&[(end, out), (terminal, out)]);
    c.terminal(terminal, out);
}

/// A converter behind the output's last column `end`: its series resistor, the capacitor at its input, and its symbol.
fn converter(c: &mut Canvas, l: &Labels, mut end: i32, out: i32) {
    let shunt = l.converter_capacitance();
    if let Some(label) = l.converter_resistance() {
        c.across(Symbol::Resistor, end, end + CONVERTER, end + 62, out, label);
        end += CONVERTER;
    } else if shunt.is_some() {
        c.wire(&[(end, out), (end + CONVERTER, out)]);
        end += CONVERTER;
    }
    if let Some(label) = shunt {
        c.dot(end, out);
        c.upright_left(Symbol::Capacitor, end, out, out + 56, out + 36, label);
        c.ground(end, out + 56);
    }
    c.wire(&[(end, out), (end + 24, out)]);
    c.converter(end + 24, out);
}

/// Paths over the amplifier, one above the other, their parts around `middle`; `end` tells column and height of an end.
fn feedback(c: &mut Canvas, paths: Vec<Path>, middle: i32, mut level: i32, end: impl Fn(End) -> (i32, i32)) {
    // Columns with the height up to which they are drawn.
    let mut columns: Vec<(i32, i32)> = Vec::new();
    for path in paths {
        let to = end(path.to);
        for (column, height) in [path.from, to] {
            match columns.iter_mut().find(|k| k.0 == column) {
                Some(reached) => {
                    c.dot(column, reached.1);
                    c.wire(&[(column, reached.1), (column, level)]);
                    reached.1 = level;
                }
                None => {
                    c.wire(&[(column, height), (column, level)]);
                    columns.push((column, level));
                }
            }
        }
        match path.part {
            Some((symbol, label)) => c.across(symbol, path.from.0, to.0, middle, level, label),
            None => c.wire(&[(path.from.0, level), (to.0, level)]),
        }
        level -= 64;
    }
}

/// Source, `Rser` and `Cshunt` on a line at height `y`; the line goes on to `to`. `shunt` is where `Cshunt` stands.
pub fn source_and_input(c: &mut Canvas, l: &Labels, y: i32, shunt: i32, to: i32) {
    source_through(c, l, "Rser", y, shunt, to);
}

/// [`source_and_input`] with another resistor in the place of `Rser`.
pub fn source_through(c: &mut Canvas, l: &Labels, series: &str, y: i32, shunt: i32, to: i32) {
    let mut from = SOURCE_X;
    if let Some(label) = l.component(series) {
        c.across(Symbol::Resistor, SOURCE_X, shunt, SOURCE_X + 60, y, label);
        from = shunt;
    }
    let shunted = l.component("Cshunt");
    // The source's own impedance stands lower where the shunt's label needs the place beside it.
    let middle = y + if shunted.is_some() { 78 } else { 32 };
    if let Some(label) = shunted {
        c.dot(shunt, y);
        c.upright_left(Symbol::Capacitor, shunt, y, y + 48, y + 30, label);
        c.ground(shunt, y + 48);
    }
    if from < to {
        c.wire(&[(from, y), (to, y)]);
    }
    voltage_source(c, l, y, middle);
}

/// The source with its impedance, standing below the line at height `y`; whichever comes first has its middle at `middle`.
pub fn voltage_source(c: &mut Canvas, l: &Labels, y: i32, middle: i32) {
    match (l.stage().source(0), l.source_impedance()) {
        (Some(source), Some(label)) => {
            let symbol = match source {
                Source::Resistive { .. } => Symbol::Resistor,
                Source::Capacitive { .. } | Source::Photodiode { .. } => Symbol::Capacitor,
            };
            c.upright_right(symbol, SOURCE_X, y, middle + 24, middle, label);
            c.source(SOURCE_X, middle + 24, middle + 42);
        }
        _ => c.source(SOURCE_X, y, middle),
    }
}

/// What a source of current or charge, and what stands across it, take of the place at the left.
#[derive(Clone, Copy, Debug)]
pub struct Room {
    /// The column of the last part.
    pub column: i32,
    /// Where the inverting node may stand.
    pub node: i32,
    /// Below this height, the place left of the node is free.
    pub below: i32,
}

/// A source of current or charge with what stands across it, below the line at height `y`.
pub fn current_source(c: &mut Canvas, l: &Labels, y: i32, name: &str) -> Room {
    let source = l.stage().source(0);
    match source {
        Some(Source::Photodiode { .. }) => c.photodiode(SOURCE_X, y, y + 40),
        _ => c.current_source(SOURCE_X, y, y + 36, name),
    }
    let first = SOURCE_X + 36;
    let second = first + 28;
    let mut room = Room { column: SOURCE_X, node: 146, below: y + 86 };
    let Some(across) = l.source_impedance() else { return room };
    let shunt = l.shunt_resistance();
    c.dot(first, y);
    c.wire(&[(SOURCE_X, y), (first, y)]);
    if matches!(source, Some(Source::Resistive { .. })) {
        c.upright_right(Symbol::Resistor, first, y, y + 64, y + 36, across);
        c.ground(first, y + 64);
    } else {
        // Beside a shunt the capacitor is longer, so that its label passes below the shunt's ground.
        let middle = y + if shunt.is_some() { 98 } else { 36 };
        c.upright_right(Symbol::Capacitor, first, y, middle + 20, middle, across);
        c.ground(first, middle + 20);
    }
    room.column = first;
    room.node = 180;
    if let Some(label) = shunt {
        c.dot(second, y);
        c.wire(&[(first, y), (second, y)]);
        c.upright_right(Symbol::Resistor, second, y, y + 64, y + 36, label);
        c.ground(second, y + 64);
        room = Room { column: second, node: 200, below: y + 112 };
    }
    room
}

/// The + input of an inverting stage: [`balance`] where a source stands at the left, or something else that reaches down to `below`.
pub fn balanced_input(c: &mut Canvas, l: &Labels, node: (i32, i32), below: i32) {
    balance(c, l, node, below.max(node.1 + 86));
}

/// The + input of an inverting stage: the noise-gain branch, then a wire to ground or `Rp ∥ Cp`, which
/// hang lower than `below`. `(x, y)` is the inverting node.
pub fn balance(c: &mut Canvas, l: &Labels, (x, y): (i32, i32), below: i32) {
    let mut line = y + PITCH;
    let mut column = x + NEAR;
    if l.has("Rng") {
        let drop = x + DROP;
        c.wire(&[(x + PINS, line), (drop, line)]);
        // Below what stands at the left of the node, where that comes near.
        let first = if matches!(l.stage().kind, Kind::Inverting | Kind::Summing) { y + 30 } else { below + 24 };
        line = first + 66;
        noise_gain(c, l, (x, y), first, line);
        c.wire(&[(x, line), (drop, line), (drop, y + PITCH)]);
        c.dot(x, line);
        column = x;
    } else {
        c.wire(&[(x + PINS, line), (column, line)]);
    }
    if l.has("Rp") {
        if line < below {
            c.wire(&[(column, line), (column, below)]);
        }
        to_ground_below(c, l, (column, line.max(below)), y, ("Rp", "Cp"));
    } else {
        c.wire(&[(column, line), (column, line + 16)]);
        c.ground(column, line + 16);
    }
}

/// `Rng` and `Cng` standing from the inverting node down to the other input's line at height `to`.
pub fn noise_gain(c: &mut Canvas, l: &Labels, (x, y): (i32, i32), first: i32, to: i32) {
    let (Some(r), Some(k)) = (l.component("Rng"), l.component("Cng")) else { return };
    c.dot(x, y);
    c.upright_left(Symbol::Resistor, x, y, first + 24, first, r);
    c.upright_left(Symbol::Capacitor, x, first + 24, to, first + 42, k);
}

/// From an input's part to where its line ends.
const INPUT: i32 = 116;

/// A signal input with its name, the source's impedance, and the component `series`; the line ends at `to`.
pub fn input(c: &mut Canvas, l: &Labels, input: usize, series: Option<&str>, (to, y): (i32, i32)) {
    let mut end = to;
    if let Some(label) = series.and_then(|name| l.component(name)) {
        c.across(Symbol::Resistor, to - INPUT, to, to - 58, y, label);
        end = to - INPUT;
    }
    let start = if l.has_source_impedance() { end - 112 } else { end };
    match l.source_impedance_of(input) {
        Some((symbol, Ok(label))) => c.across(symbol, start, end, end - 54, y, label),
        Some((symbol, Err(name))) => c.across_twin(symbol, start, end, end - 54, y, &name),
        None if start < end => c.wire(&[(start, y), (end, y)]),
        None => {}
    }
    c.input(start, y, (l.stage().kind.spec().inputs)(l.stage()).get(input).map_or("in", |i| i.name));
}

/// A resistor with a capacitor beside it, both standing from `(x, y)` to ground.
pub fn to_ground(c: &mut Canvas, (x, y): (i32, i32), resistor: Option<Label>, capacitor: Option<Label>) {
    if let Some(label) = resistor {
        c.upright_left(Symbol::Resistor, x, y, y + 52, y + 28, label);
        c.ground(x, y + 52);
    }
    if let Some(label) = capacitor {
        c.dot(x, y);
        c.wire(&[(x, y), (x + 32, y)]);
        c.upright_right(Symbol::Capacitor, x + 32, y, y + 52, y + 28, label);
        c.ground(x + 32, y + 52);
    }
}

/// [`to_ground`] hanging below `(x, y)`; with a capacitor, far enough down to pass the amplifier at `pin` and its snubber.
pub fn to_ground_below(c: &mut Canvas, l: &Labels, (x, y): (i32, i32), pin: i32, (resistor, capacitor): (&str, &str)) {
    let capacitor = l.component(capacitor);
    let beside = match (&capacitor, l.has("Rsn")) {
        (None, _) => y,
        (Some(_), false) => pin + 88,
        (Some(_), true) => pin + 172,
    };
    let top = y.max(beside);
    if y < top {
        c.wire(&[(x, y), (x, top)]);
    }
    to_ground(c, (x, top), l.component(resistor), capacitor);
}

/// A resistor from the inverting node towards the left, and to ground.
pub fn grounded_gain_resistor(c: &mut Canvas, label: Label, (x, y): (i32, i32)) {
    let end = x - 108;
    c.dot(x, y);
    c.across(Symbol::Resistor, end, x, x - 56, y, label);
    c.wire(&[(end, y), (end, y + 12)]);
    c.ground(end, y + 12);
}

/// The source, and `Cin` on a line at height `y` that ends at `to`.
pub fn coupled_source(c: &mut Canvas, l: &Labels, y: i32, to: i32) {
    if let Some(label) = l.component("Cin") {
        c.across(Symbol::Capacitor, SOURCE_X, to, SOURCE_X + 60, y, label);
    }
    source_and_input(c, l, y, 0, 0);
}

/// A divider of the positive supply with its middle at `(x, y)`: `Rb1` from the rail, `Rb2` and `Cb` to ground.
pub fn supply_divider(c: &mut Canvas, l: &Labels, (x, y): (i32, i32)) {
    let rail = x - 146;
    if let Some(label) = l.component("Rb1") {
        c.across(Symbol::Resistor, rail, x, x - 60, y, label);
        c.wire(&[(rail, y), (rail, y - 14)]);
        c.rail(rail, y - 14, &l.rails().0);
        c.dot(x, y);
    }
    to_ground(c, (x, y), l.component("Rb2"), l.component("Cb"));
}
