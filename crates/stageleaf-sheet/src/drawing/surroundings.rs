//! What stands around every amplifier: source and input network at the left, feedback above, output and load at the right.

use super::{
    Labels,
    kit::{Canvas, Symbol},
};
use stageleaf_math::stage::{Isolation, Source};

/// Where the source's column stands.
const SOURCE_X: i32 = 20;
/// From the inverting node to the wire that carries the other input down.
pub const DROP: i32 = 12;
/// From the inverting node to the amplifier's pins.
const PINS: i32 = 34;
/// From the inverting node to the output node.
const OUTPUT: i32 = 132;
/// From the output node to the load.
const LOAD: i32 = 120;
/// From the inverting input's height to the other's.
pub const PITCH: i32 = 44;

/// The amplifier with feedback, snubber, isolation and load. `node` is the inverting node; its wire to the pin is drawn here.
pub fn amplifier_and_output(c: &mut Canvas, l: &Labels, (x, y): (i32, i32)) {
    let (positive, negative) = l.rails();
    let (tip, out) = c.amplifier(x + PINS, y, &positive, negative.as_deref());
    c.wire(&[(x, y), (x + PINS, y)]);
    let pin = x + OUTPUT;
    let load = pin + LOAD;
    let isolated = l.has("Riso");
    let inside = isolated && l.stage().isolation == Isolation::InsideLoop;
    let sensed = if inside { load } else { pin };

    feedback(c, l, (x, y), (pin, sensed, out));

    c.wire(&[(tip, out), (pin, out)]);
    c.dot(pin, out);
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
    let terminal = end + if end == pin { 46 } else { 24 };
    c.wire(&[(end, out), (terminal, out)]);
    c.terminal(terminal, out);
}

/// `Rf` and `Cf` over the amplifier: the capacitor inside, since it senses the pin.
fn feedback(c: &mut Canvas, l: &Labels, (x, y): (i32, i32), (pin, sensed, out): (i32, i32, i32)) {
    let (rf, cf) = (l.component("Rf"), l.component("Cf"));
    let middle = x + OUTPUT / 2;
    let mut level = y - 66;
    let both = rf.is_some() && cf.is_some();
    if let Some(label) = cf {
        c.across(Symbol::Capacitor, x, pin, middle, level, label);
        c.wire(&[(pin, level), (pin, out)]);
        c.dot(x, level);
        if sensed == pin {
            c.dot(pin, level);
        }
        level -= 64;
    }
    match rf {
        Some(label) => c.across(Symbol::Resistor, x, sensed, middle, level, label),
        None => c.wire(&[(x, level), (sensed, level)]),
    }
    c.wire(&[(x, y), (x, level)]);
    if !(both && sensed == pin) {
        c.wire(&[(sensed, level), (sensed, out)]);
    } else {
        c.wire(&[(pin, level), (pin, level + 64)]);
    }
}

/// Source, `Rser` and `Cshunt` on a line at height `y`; the line goes on to `to`. `shunt` is where `Cshunt` stands.
pub fn source_and_input(c: &mut Canvas, l: &Labels, y: i32, shunt: i32, to: i32) {
    let mut from = SOURCE_X;
    if let Some(label) = l.component("Rser") {
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

/// `Rng` and `Cng` standing from the inverting node down to the other input's line at height `to`.
pub fn noise_gain(c: &mut Canvas, l: &Labels, (x, y): (i32, i32), first: i32, to: i32) {
    let (Some(r), Some(k)) = (l.component("Rng"), l.component("Cng")) else { return };
    c.dot(x, y);
    c.upright_left(Symbol::Resistor, x, y, first + 24, first, r);
    c.upright_left(Symbol::Capacitor, x, first + 24, to, first + 42, k);
}
