//! Symbols, wires and labels of a circuit drawing, on an integer grid.
//!
//! Every wire, body and label is also kept as a box, so that a test can tell whether any label covers anything.
//! Symbols follow IEC 60617 in spirit (resistor as a rectangle, capacitor as two plates, amplifier as a triangle): common practice.

use std::fmt::Write as _;

use maud::{Markup, PreEscaped, html};

/// Width of a label's value field.
pub const LABEL_WIDTH: i32 = 102;
/// Height of a label: designator over value field.
pub const LABEL_HEIGHT: i32 = 36;
/// Half the length of a resistor's body.
const RESISTOR_HALF: i32 = 17;
/// Half the thickness of a resistor's body.
const RESISTOR_THICK: i32 = 6;
/// Half the length of a capacitor's plate.
const PLATE_HALF: i32 = 11;
/// Half the distance of a capacitor's plates.
const PLATE_GAP: i32 = 3;

/// A rectangle of the grid.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Area {
    /// Left edge.
    pub x0: i32,
    /// Upper edge.
    pub y0: i32,
    /// Right edge.
    pub x1: i32,
    /// Lower edge.
    pub y1: i32,
}

impl Area {
    /// Whether two rectangles share more than an edge.
    #[must_use]
    pub const fn covers(&self, other: &Self) -> bool {
        self.x0 < other.x1 && other.x0 < self.x1 && self.y0 < other.y1 && other.y0 < self.y1
    }
}

/// What a label shows: a designator and the field with its value.
#[derive(Clone, Debug)]
pub struct Label {
    /// Reference designator: `Rf`.
    pub name: String,
    /// Path of the value in the stage block: `components.Rf`.
    pub path: String,
    /// The value as the note states it.
    pub value: String,
    /// What a screen reader says: "Rf, feedback resistor, 91 kilohms".
    pub spoken: String,
}

/// A two-terminal part.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Symbol {
    /// A resistor.
    Resistor,
    /// A capacitor.
    Capacitor,
}

impl Symbol {
    const fn half(self) -> i32 {
        match self {
            Self::Resistor => RESISTOR_HALF,
            Self::Capacitor => PLATE_GAP,
        }
    }

    const fn thick(self) -> i32 {
        match self {
            Self::Resistor => RESISTOR_THICK,
            Self::Capacitor => PLATE_HALF,
        }
    }
}

/// Which of an amplifier's pins is the upper one.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Upper {
    /// The inverting one.
    Inverting,
    /// The other one.
    NonInverting,
}

/// On which side of its part a label stands; its text leans towards the part.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum Side {
    Above,
    Left,
    Right,
}

impl Side {
    /// Class of the value field, anchor and place of the designator in a label that starts at `x`.
    const fn lean(self, x: i32) -> (&'static str, &'static str, i32) {
        match self {
            Self::Above => ("mid", "middle", x + LABEL_WIDTH / 2),
            Self::Left => ("end", "end", x + LABEL_WIDTH - 3),
            Self::Right => ("start", "start", x + 3),
        }
    }
}

/// A drawing in the making.
#[derive(Debug, Default)]
pub struct Canvas {
    wires: String,
    bodies: String,
    dots: String,
    labels: Vec<(Area, Side, Label)>,
    texts: Vec<(Area, i32, i32, &'static str, String)>,
    /// Which of the texts are designators.
    designators: Vec<usize>,
    /// Where there is ink: wires and bodies.
    ink: Vec<Area>,
}

impl Canvas {
    /// A wire through `points`.
    pub fn wire(&mut self, points: &[(i32, i32)]) {
        for (i, (x, y)) in points.iter().enumerate() {
            let _ = write!(self.wires, "{}{x} {y}", if i == 0 { "M" } else { "L" });
        }
        for pair in points.windows(2) {
            let ((xa, ya), (xb, yb)) = (pair[0], pair[1]);
            self.ink.push(Area { x0: xa.min(xb), y0: ya.min(yb), x1: xa.max(xb) + 1, y1: ya.max(yb) + 1 });
        }
    }

    /// A connection of three or more wires.
    pub fn dot(&mut self, x: i32, y: i32) {
        let _ = write!(self.dots, "M{} {y}a3 3 0 1 0 6 0a3 3 0 1 0-6 0z", x - 3);
    }

    /// A part lying in a wire at height `y`, wired from `from` to `to`, its middle at `middle`; the label above.
    pub fn across(&mut self, symbol: Symbol, from: i32, to: i32, middle: i32, y: i32, label: Label) {
        self.lying(symbol, from, to, middle, y);
        let left = middle - LABEL_WIDTH / 2;
        let bottom = y - 9 - if symbol == Symbol::Capacitor { 5 } else { 0 };
        self.label(left, bottom - LABEL_HEIGHT, Side::Above, label);
    }

    /// [`Self::across`] for a part whose value is shown at its twin: the designator alone.
    pub fn across_twin(&mut self, symbol: Symbol, from: i32, to: i32, middle: i32, y: i32, name: &str) {
        self.lying(symbol, from, to, middle, y);
        self.designators.push(self.texts.len());
        self.text(middle, y - 14 - if symbol == Symbol::Capacitor { 5 } else { 0 }, "middle", name, 40);
    }

    /// A part lying in a wire.
    fn lying(&mut self, symbol: Symbol, from: i32, to: i32, middle: i32, y: i32) {
        self.wire(&[(from, y), (middle - symbol.half(), y)]);
        self.wire(&[(middle + symbol.half(), y), (to, y)]);
        let (h, t) = (symbol.half(), symbol.thick());
        match symbol {
            Symbol::Resistor => {
                let _ = write!(self.bodies, "M{} {}h{}v{}h{}z", middle - h, y - t, 2 * h, 2 * t, -2 * h);
            }
            Symbol::Capacitor => {
                let _ = write!(self.bodies, "M{} {}v{}M{} {}v{}", middle - h, y - t, 2 * t, middle + h, y - t, 2 * t);
            }
        }
        self.ink.push(Area { x0: middle - h - 1, y0: y - t, x1: middle + h + 1, y1: y + t });
    }

    /// A part standing in a wire at `x`, wired from `from` down to `to`, its middle at `middle`.
    fn upright(&mut self, symbol: Symbol, x: i32, from: i32, to: i32, middle: i32) {
        self.wire(&[(x, from), (x, middle - symbol.half())]);
        self.wire(&[(x, middle + symbol.half()), (x, to)]);
        let (h, t) = (symbol.half(), symbol.thick());
        match symbol {
            Symbol::Resistor => {
                let _ = write!(self.bodies, "M{} {}h{}v{}h{}z", x - t, middle - h, 2 * t, 2 * h, -2 * t);
            }
            Symbol::Capacitor => {
                let _ = write!(self.bodies, "M{} {}h{}M{} {}h{}", x - t, middle - h, 2 * t, x - t, middle + h, 2 * t);
            }
        }
        self.ink.push(Area { x0: x - t, y0: middle - h - 1, x1: x + t, y1: middle + h + 1 });
    }

    /// [`Self::upright`] with its label at the left.
    pub fn upright_left(&mut self, symbol: Symbol, x: i32, from: i32, to: i32, middle: i32, label: Label) {
        self.upright(symbol, x, from, to, middle);
        self.label(x - symbol.thick() - 4 - LABEL_WIDTH, middle - LABEL_HEIGHT / 2, Side::Left, label);
    }

    /// [`Self::upright`] with its label at the right.
    pub fn upright_right(&mut self, symbol: Symbol, x: i32, from: i32, to: i32, middle: i32, label: Label) {
        self.upright(symbol, x, from, to, middle);
        self.label(x + symbol.thick() + 4, middle - LABEL_HEIGHT / 2, Side::Right, label);
    }

    /// A ground symbol hanging at a wire's end.
    pub fn ground(&mut self, x: i32, y: i32) {
        let _ = write!(self.bodies, "M{} {y}h20M{} {}h12M{} {}h4", x - 10, x - 6, y + 4, x - 2, y + 8);
        self.ink.push(Area { x0: x - 10, y0: y, x1: x + 10, y1: y + 9 });
    }

    /// An alternating voltage source standing at `x`, its circle's middle at `middle`, grounded below.
    pub fn source(&mut self, x: i32, from: i32, middle: i32) {
        self.wire(&[(x, from), (x, middle - 13)]);
        let _ = write!(self.bodies, "M{} {middle}a13 13 0 1 0 26 0a13 13 0 1 0-26 0zM{} {middle}c3-9 5-9 7 0s4 9 7 0", x - 13, x - 7);
        self.ink.push(Area { x0: x - 13, y0: middle - 13, x1: x + 13, y1: middle + 13 });
        self.wire(&[(x, middle + 13), (x, middle + 22)]);
        self.ground(x, middle + 22);
        self.text(x + 17, middle + 5, "start", "Vs", 20);
    }

    /// A current source standing at `x`, its circle's middle at `middle`, grounded below; its current flows upwards.
    pub fn current_source(&mut self, x: i32, from: i32, middle: i32, name: &str) {
        self.wire(&[(x, from), (x, middle - 13)]);
        let _ = write!(
            self.bodies,
            "M{} {middle}a13 13 0 1 0 26 0a13 13 0 1 0-26 0zM{x} {}v-15M{} {}l4-6 4 6",
            x - 13,
            middle + 8,
            x - 4,
            middle - 1
        );
        self.ink.push(Area { x0: x - 13, y0: middle - 13, x1: x + 13, y1: middle + 13 });
        self.wire(&[(x, middle + 13), (x, middle + 22)]);
        self.ground(x, middle + 22);
        self.text(x - 16, middle + 5, "end", name, 20);
    }

    /// A photodiode standing at `x` with its anode up, so that its photocurrent flows upwards; grounded below.
    pub fn photodiode(&mut self, x: i32, from: i32, middle: i32) {
        self.wire(&[(x, from), (x, middle - 9)]);
        let _ = write!(self.bodies, "M{} {}h20l-10 17zM{} {}h20", x - 10, middle - 9, x - 10, middle + 8);
        // Light from the left.
        for (dx, dy) in [(0, 0), (-6, 10)] {
            let (hx, hy) = (x - 14 + dx, middle - 7 + dy);
            let _ = write!(self.bodies, "M{} {}L{hx} {hy}M{} {}L{hx} {hy}l-2-6", hx - 14, hy - 14, hx - 6, hy - 2);
        }
        self.ink.push(Area { x0: x - 34, y0: middle - 21, x1: x + 10, y1: middle + 9 });
        self.wire(&[(x, middle + 8), (x, middle + 20)]);
        self.ground(x, middle + 20);
        self.text(x - 14, middle + 25, "end", "PD", 20);
    }

    /// A steady voltage standing at `x`, its circle's middle at `middle`, grounded below; the label at the left, or its name alone.
    pub fn steady(&mut self, x: i32, from: i32, middle: i32, label: Result<Label, &str>) {
        self.wire(&[(x, from), (x, middle - 13)]);
        let _ = write!(
            self.bodies,
            "M{} {middle}a13 13 0 1 0 26 0a13 13 0 1 0-26 0zM{} {}h8M{x} {}v8M{} {}h8",
            x - 13,
            x - 4,
            middle - 5,
            middle - 9,
            x - 4,
            middle + 6
        );
        self.ink.push(Area { x0: x - 13, y0: middle - 13, x1: x + 13, y1: middle + 13 });
        self.wire(&[(x, middle + 13), (x, middle + 22)]);
        self.ground(x, middle + 22);
        match label {
            Ok(label) => self.label(x - 17 - LABEL_WIDTH, middle - LABEL_HEIGHT / 2, Side::Left, label),
            Err(name) => self.text(x - 17, middle + 5, "end", name, 30),
        }
    }

    /// An amplifier whose pins are at `x`: the inverting one at `y`, the other at `y + 44`; returns its output.
    pub fn amplifier(&mut self, x: i32, y: i32, positive: &str, negative: Option<&str>) -> (i32, i32) {
        self.amplifier_named((x, y), Upper::Inverting, None, (positive, negative))
    }

    /// An amplifier whose pins are at `x`, the upper one at `y`, the other at `y + 44`, with its name inside; returns its output.
    pub fn amplifier_named(
        &mut self,
        (x, y): (i32, i32),
        upper: Upper,
        name: Option<&str>,
        (positive, negative): (&str, Option<&str>),
    ) -> (i32, i32) {
        let (middle, tip) = (y + 22, x + 72);
        let _ = write!(self.bodies, "M{x} {}L{tip} {middle}L{x} {}z", middle - 46, middle + 46);
        // The signs sit inside, beside their pins.
        let plus = if upper == Upper::Inverting { y + 44 } else { y };
        let _ = write!(self.bodies, "M{} {y}h9M{} {}h9M{} {}v9", x + 7, x + 7, y + 44, x + 11, plus - 4);
        if let Some(name) = name {
            self.text(x + 34, middle + 5, "middle", name, 20);
        }
        // The outline, its slopes as steps.
        self.ink.push(Area { x0: x, y0: middle - 46, x1: x + 1, y1: middle + 46 });
        for step in 0..8 {
            let (x0, x1) = (x + 9 * step, x + 9 * step + 9);
            let (far, near) = (46 * (8 - step) / 8, 46 * (7 - step) / 8);
            self.ink.push(Area { x0, y0: middle - far, x1, y1: middle - near });
            self.ink.push(Area { x0, y0: middle + near, x1, y1: middle + far });
        }
        let rail = x + 28;
        self.wire(&[(rail, middle - 28), (rail, middle - 41)]);
        self.bar(rail, middle - 41);
        self.text(rail, middle - 49, "middle", positive, 70);
        self.wire(&[(rail, middle + 28), (rail, middle + 41)]);
        match negative {
            Some(text) => {
                self.bar(rail, middle + 41);
                self.text(rail, middle + 57, "middle", text, 70);
            }
            None => self.ground(rail, middle + 41),
        }
        (tip, middle)
    }

    /// A supply rail over a wire that begins at `(x, y)` and goes down.
    pub fn rail(&mut self, x: i32, y: i32, text: &str) {
        self.bar(x, y);
        self.text(x, y - 8, "middle", text, 70);
    }

    fn bar(&mut self, x: i32, y: i32) {
        let _ = write!(self.bodies, "M{} {y}h14", x - 7);
        self.ink.push(Area { x0: x - 7, y0: y, x1: x + 7, y1: y + 1 });
    }

    /// The output terminal.
    pub fn terminal(&mut self, x: i32, y: i32) {
        let _ = write!(self.bodies, "M{x} {y}a3 3 0 1 0 6 0a3 3 0 1 0-6 0z");
        self.ink.push(Area { x0: x, y0: y - 3, x1: x + 6, y1: y + 3 });
        self.text(x + 7, y - 8, "end", "out", 22);
    }

    /// A converter whose input is at `(x, y)`.
    pub fn converter(&mut self, x: i32, y: i32) {
        let _ = write!(self.bodies, "M{x} {y}l14-16h40v32h-40z");
        self.ink.push(Area { x0: x, y0: y - 16, x1: x + 14, y1: y + 16 });
        for (y0, y1) in [(y - 16, y - 15), (y + 15, y + 16)] {
            self.ink.push(Area { x0: x, y0, x1: x + 54, y1 });
        }
        self.text(x + 32, y + 5, "middle", "ADC", 34);
    }

    /// An input terminal that a wire leaves at `(x, y)`, with its name at the left.
    pub fn input(&mut self, x: i32, y: i32, name: &str) {
        let _ = write!(self.bodies, "M{} {y}a3 3 0 1 0 6 0a3 3 0 1 0-6 0z", x - 6);
        self.ink.push(Area { x0: x - 6, y0: y - 3, x1: x, y1: y + 3 });
        self.text(x - 11, y + 5, "end", name, 22);
    }

    /// Text of at most about `width` at a baseline.
    fn text(&mut self, x: i32, y: i32, anchor: &'static str, text: &str, width: i32) {
        let x0 = match anchor {
            "middle" => x - width / 2,
            "end" => x - width,
            _ => x,
        };
        self.texts.push((Area { x0, y0: y - 11, x1: x0 + width, y1: y + 3 }, x, y, anchor, text.to_owned()));
    }

    fn label(&mut self, x: i32, y: i32, side: Side, label: Label) {
        self.labels.push((Area { x0: x, y0: y, x1: x + LABEL_WIDTH, y1: y + LABEL_HEIGHT }, side, label));
    }

    /// Labels and free texts, as boxes with their names.
    pub fn words(&self) -> impl Iterator<Item = (Area, &str)> {
        let labels = self.labels.iter().map(|(a, _, l)| (*a, l.name.as_str()));
        labels.chain(self.texts.iter().map(|(a, .., t)| (*a, t.as_str())))
    }

    /// Whether a label holds the field of the value at `path`.
    #[must_use]
    pub fn has_field(&self, path: &str) -> bool {
        self.labels.iter().any(|(.., l)| l.path == path)
    }

    /// Labels whose value is longer than its field shows at a size that a phone's reader makes out.
    pub fn cut(&self) -> impl Iterator<Item = &Label> {
        self.labels.iter().map(|(.., l)| l).filter(|l| size(&l.value) == Some("least"))
    }

    /// Wires and bodies, as boxes.
    #[must_use]
    pub fn ink(&self) -> &[Area] {
        &self.ink
    }

    /// The box around everything, with a border; never narrower than `least`, so that small drawings keep their scale.
    #[must_use]
    pub fn frame(&self, least: i32) -> Area {
        let mut frame = Area { x0: i32::MAX, y0: i32::MAX, x1: i32::MIN, y1: i32::MIN };
        for a in self.ink.iter().copied().chain(self.words().map(|(a, _)| a)) {
            frame = Area { x0: frame.x0.min(a.x0), y0: frame.y0.min(a.y0), x1: frame.x1.max(a.x1), y1: frame.y1.max(a.y1) };
        }
        let spare = (least - (frame.x1 - frame.x0 + 8)).max(0) / 2;
        Area { x0: frame.x0 - 4 - spare, y0: frame.y0 - 4, x1: frame.x1 + 4 + spare, y1: frame.y1 + 4 }
    }

    /// The drawing as SVG; `id` prefixes the ids inside, `name` is what the group is called.
    #[must_use]
    pub fn finish(&self, id: &str, name: &str) -> Markup {
        let f = self.frame(426);
        let class = match f.x1 - f.x0 {
            ..=470 => "circuit",
            471..=600 => "circuit wide",
            _ => "circuit wider",
        };
        html! {
            svg viewBox=(format_args!("{} {} {} {}", f.x0, f.y0, f.x1 - f.x0, f.y1 - f.y0)) role="group" aria-label=(name) class=(class) {
                path class="wire" d=(PreEscaped(&self.wires)) {}
                path class="body" d=(PreEscaped(&self.bodies)) {}
                path class="dot" d=(PreEscaped(&self.dots)) {}
                @for (i, (_, x, y, anchor, text)) in self.texts.iter().enumerate() {
                    @let class = self.designators.contains(&i).then_some("designator");
                    text class=[class] x=(x) y=(y) text-anchor=(anchor) aria-hidden="true" { (text) }
                }
                @for (a, side, l) in &self.labels {
                    @let (lean, anchor, x) = side.lean(a.x0);
                    @let class = size(&l.value).map_or_else(|| lean.to_owned(), |size| format!("{lean} {size}"));
                    text class="designator" x=(x) y=(a.y0 + 12) text-anchor=(anchor) aria-hidden="true" { (l.name) }
                    foreignObject x=(a.x0) y=(a.y0 + 15) width=(LABEL_WIDTH) height=(LABEL_HEIGHT - 15) {
                        input class=(class) id=(format_args!("{id}.{}", l.path)) type="text" inputmode="decimal" autocomplete="off" spellcheck="false" data-path=(l.path) value=(l.value) aria-label=(l.spoken);
                    }
                }
            }
        }
    }
}

/// The class of a value's size: the longer it is, the smaller, so that a value with tolerance and drift stands whole in its field.
fn size(value: &str) -> Option<&'static str> {
    match value.chars().count() {
        ..=10 => None,
        11..=12 => Some("snug"),
        13..=15 => Some("small"),
        _ => Some("least"),
    }
}
