//! Inverting stage: the signal through `Rin` at the − input, the other one at ground, directly or through `Rp ∥ Cp`.

use super::{
    Labels,
    kit::{Canvas, Symbol},
    surroundings as s,
};

/// Draws the stage.
pub fn draw(c: &mut Canvas, l: &Labels) {
    let extended = l.has("Rser") || l.has("Cshunt") || l.has("Rng");
    let (x, y) = (if extended { 270 } else { 146 }, 0);
    let shunt = 140;
    s::amplifier_and_output(c, l, (x, y));
    s::source_and_input(c, l, y, shunt, if extended { shunt } else { 0 });
    if let Some(label) = l.component("Rin") {
        c.across(Symbol::Resistor, if extended { shunt } else { 20 }, x, x - 58, y, label);
        c.dot(x, y);
    }
    let drop = x + s::DROP;
    let mut line = y + s::PITCH;
    c.wire(&[(x + 34, line), (drop, line)]);
    if l.has("Rng") {
        let to = y + 96;
        s::noise_gain(c, l, (x, y), y + 30, to);
        c.wire(&[(x, to), (drop, to), (drop, line)]);
        line = to;
    }
    match (l.component("Rp"), l.component("Cp")) {
        (Some(r), k) => {
            // Below the source's texts, and below the snubber's labels.
            let mut top = line.max(y + 86);
            if l.has("Rsn") {
                top = top.max(y + 172);
            }
            c.wire(&[(drop, line), (drop, top)]);
            c.upright_left(Symbol::Resistor, drop, top, top + 52, top + 28, r);
            c.ground(drop, top + 52);
            if let Some(label) = k {
                c.dot(drop, top);
                c.wire(&[(drop, top), (drop + 26, top)]);
                c.upright_left(Symbol::Capacitor, drop + 26, top, top + 104, top + 88, label);
                c.ground(drop + 26, top + 104);
            }
        }
        // Below the noise-gain branch rather than below the other wire: the snubber's labels stand there.
        _ if l.has("Rng") => {
            c.dot(x, line);
            c.wire(&[(x, line), (x, line + 14)]);
            c.ground(x, line + 14);
        }
        _ => {
            c.wire(&[(drop, line), (drop, line + 18)]);
            c.ground(drop, line + 18);
        }
    }
}
