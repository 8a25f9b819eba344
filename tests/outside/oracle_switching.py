#!/usr/bin/env python3
"""Solves comparators with hysteresis: dense matrices of numbers with the signal among the unknowns.

    oracle_switching.py write [FILE [SEED [COUNT]]]    solve all circuits (COUNT random ones) and write the table
    oracle_switching.py check [FILE]                   solve all circuits again and compare with the table

Route: one matrix holds Kirchhoff's law at every node, the sources' branches, and, for a threshold, the condition that the amplifier
leaves its level; the signal is its last unknown. The pin's level follows by iterating `Vo = rail -+ headroom(current)` until nothing
moves. Nominal values in mpmath (40 digits); extremes by solving every corner of tolerances, supplies, headroom and signs of the
errors in numpy, the errors' magnitudes at their worse bounds.

Conventions: the amplifier leaves a level where `e + V(+) - V(-) = (Vo + I*Ro - Vm)/A0`, Vm the middle between the rails; e is the
offset, the drift from 298.15 K and the supplies' deviations from nominal over rejection, all with one sign, plus the common-mode
voltage less Vm over rejection with another one. Bias currents flow alike at both inputs, half the offset current each way, all with
the sign that shifts V(+) - V(-) as e does. States that are asked for currents and levels are at the thresholds without errors, at the
signal's extremes where it is stated, the thresholds no further than these. Capacitors are open.
"""
import itertools
import json
import os
import random
import sys

os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")
import mpmath as mp
import numpy as np

from oracle import differences

DIGITS = 13
SEED = 90_210
mp.mp.dps = 40

NODES = ["in", "sig", "ref", "vref", "+", "-", "pin", "out"]


def elements(c, value):
    """Resistors as (node, node, ohms, name); `value` gives a component's value."""
    inverting = c["kind"] == "comparator-inverting"
    has = c["components"]
    yield "in", "sig", c["source"], "source"
    yield "ref", "vref", c["reference_resistance"], "reference"
    filtered = "-" if inverting else "filtered"
    first = "vref" if inverting else "filtered"
    yield "sig", filtered, value("Rser") if "Rser" in has else 0, "Rser"
    if not inverting:
        yield "vref", "-", 0, "wire"
    if "R4" in has:
        yield "-", "0", value("R4"), "R4"
    yield first, "+", value("R1"), "R1"
    if "R3" in has:
        yield "+", "0", value("R3"), "R3"
    yield "pin", "out", value("Riso") if "Riso" in has else 0, "Riso"
    yield ("out" if c["isolation"] == "inside" else "pin"), "+", value("R2"), "R2"
    if c["load_resistance"] is not None:
        yield "out", "0", c["load_resistance"], "load"
    part = c["part"]
    if part["differential_resistance"] is not None:
        yield "+", "-", part["differential_resistance"], "inputs"
    if part["common_mode_resistance"] is not None:
        yield "+", "0", part["common_mode_resistance"], "input"
        yield "-", "0", part["common_mode_resistance"], "input"


class Stage:
    """A build with numbers of one sort: mpmath's, or arrays of numpy with one entry for each corner."""

    def __init__(self, c, number, build):
        self.c, self.number, self.b = c, number, build
        joined = {}

        def find(n):
            while n in joined:
                n = joined[n]
            return n

        parts = list(elements(c, lambda name: build["components"][name]))
        for a, b, ohms, _ in parts:
            if not hasattr(ohms, "shape") and ohms == 0 and find(a) != find(b):
                joined[find(b)] = find(a)
        self.find = find
        names = sorted({find(n) for a, b, *_ in parts for n in (a, b)} - {find("0")})
        self.index = {n: k for k, n in enumerate(names)}
        self.parts = [(find(a), find(b), ohms, name) for a, b, ohms, name in parts if find(a) != find(b)]
        # After the nodes: currents of signal, reference and pin, then the signal itself.
        self.size = len(names) + 4

    def at(self, node):
        return self.index.get(self.find(node))

    def solve(self, output, errors, signal=None):
        """Node voltages, the pin's current and the signal, with the pin at `output`; without a signal, at the amplifier's edge."""
        n, one, b = self.size, self.number(1), self.b
        shape = np.shape(output) if isinstance(output, np.ndarray) else None
        matrix = np.zeros(shape + (n, n)) if shape is not None else mp.zeros(n, n)
        right = np.zeros(shape + (n,)) if shape is not None else mp.zeros(n, 1)

        def add(i, j, y):
            if i is not None and j is not None:
                matrix[(Ellipsis, i, j) if shape is not None else (i, j)] += y

        def put(i, y):
            right[(Ellipsis, i) if shape is not None else (i, 0)] += y

        for a, k, ohms, _ in self.parts:
            y, i, j = one / ohms, self.at(a), self.at(k)
            for p, q, sign in ((i, i, 1), (j, j, 1), (i, j, -1), (j, i, -1)):
                add(p, q, sign * y)
        first = n - 4
        for k, node in enumerate(("in", "ref", "pin")):
            add(self.at(node), first + k, one)
            add(first + k, self.at(node), one)
        add(first, n - 1, -one)
        put(first + 1, b["reference"])
        put(first + 2, output)
        if signal is not None:
            add(n - 1, n - 1, one)
            put(n - 1, signal)
        else:
            plus, minus, gain, middle = self.at("+"), self.at("-"), b["open_loop"], (b["positive"] + b["negative"]) / 2
            e, rejection = errors
            add(n - 1, plus, one + rejection)
            add(n - 1, minus, -one)
            # The pin's branch current flows out of the node: that of the amplifier is its negative.
            add(n - 1, first + 2, b["output_resistance"] / gain)
            put(n - 1, (output - middle) / gain + rejection * middle - e)
        for node, amperes in zip(("+", "-"), b["injected"]):
            put(self.at(node), amperes)
        x = np.linalg.solve(matrix, right[..., None])[..., 0] if shape is not None else mp.lu_solve(matrix, right)
        pick = (lambda k: x[..., k]) if shape is not None else (lambda k: x[k])
        volts = {node: (pick(self.at(node)) if self.at(node) is not None else self.number(0)) for node in [*NODES, "0", "filtered"] if node in ("0",) or self.find(node) in self.index}
        return volts, -pick(first + 2), pick(n - 1)

    def level(self, high, errors=None, signal=None):
        """The state at a level: at the amplifier's edge, or at a signal."""
        b = self.b
        rail, sign = (b["positive"], 1) if high else (b["negative"], -1)
        output = rail * self.number(1)
        for _ in range(400):
            volts, current, at = self.solve(output, errors, signal)
            new = rail - sign * headroom(b["headroom_high" if high else "headroom_low"], sign * current)
            moved = np.max(np.abs(new - output)) if isinstance(output, np.ndarray) else abs(new - output)
            output = new
            if moved < (1e-15 if isinstance(output, np.ndarray) else mp.mpf(10) ** -35):
                return {"volts": volts, "current": current, "signal": at, "output": output}
        raise ArithmeticError(self.c["id"])


def headroom(table, current):
    if isinstance(current, np.ndarray):
        # Each corner has its own column of volts.
        rows = np.array([row[0] for row in table])
        volts = np.array([np.broadcast_to(row[1], current.shape) for row in table])
        assert current.max() <= rows[-1]
        out = volts[0].copy()
        for k in range(1, len(rows)):
            share = np.clip((current - rows[k - 1]) / (rows[k] - rows[k - 1]), 0, 1)
            out += share * (volts[k] - volts[k - 1])
        return out
    assert current <= table[-1][0]
    if current <= table[0][0]:
        return table[0][1]
    for (a, u), (z, v) in zip(table, table[1:]):
        if current <= z:
            return u + (v - u) * (current - a) / (z - a)
    raise ArithmeticError


def build(c, number, at=None):
    """Values of a build: nominal, or at a corner (`at` gives each parameter's place from -1 to 1, or an array of them)."""
    at = at or {}
    part = c["part"]
    place = lambda name: at.get(name, 0)
    toleranced = lambda name, value: number(value) * (1 + place(name) * number(c["tolerance"]))
    span = lambda name, s: number(s[1]) + (number(s[2]) - number(s[1])) * place(name)
    worse = lambda key: part[key][1] if at else part[key][0]
    position = (place("headroom") + 1) / 2 if at else 0
    b = {
        "components": {name: toleranced(name, v) for name, v in c["components"].items()},
        "reference": toleranced("reference", c["reference"]),
        "positive": span("positive", c["positive"]),
        "negative": span("negative", c["negative"]),
        "injected": (0, 0),
    }
    for key in ("open_loop", "output_resistance"):
        b[key] = number(part[key])
    for key in ("headroom_high", "headroom_low"):
        b[key] = [(number(i), number(t) + position * (number(m) - number(t))) for i, t, m in part[key]]
    for key in ("offset", "drift", "bias", "offset_current", "cmrr", "psrr_positive", "psrr_negative"):
        b[key] = number(worse(key))
    b["away"] = abs(number(c["temperature"]) - number(298.15))
    return b


def with_errors(c, number, b, sign, other):
    """The stage with its input errors, and what stands in series with the input."""
    stage = Stage(c, number, b)
    if not isinstance(sign, np.ndarray) and sign == 0 and other == 0:
        return stage, (number(0), number(0))
    # Which way equal currents at both inputs shift their difference.
    probe = Stage(c, number, {**b, "injected": (number(1), number(1)), "reference": b["reference"] * 0})
    volts, _, _ = probe.solve(b["positive"] * 0, None, b["positive"] * 0)
    way = np.where(volts["+"] < volts["-"], -1, 1) if isinstance(sign, np.ndarray) else (-1 if volts["+"] < volts["-"] else 1)
    half = b["offset_current"] / 2
    b = {**b, "injected": (sign * (way * b["bias"] + half), sign * (way * b["bias"] - half))}
    moved = [(abs(b[rail] - number(c[rail][1])) / b["psrr_" + rail]) for rail in ("positive", "negative")]
    return Stage(c, number, b), (sign * (b["offset"] + b["drift"] * b["away"] + sum(moved)), other / b["cmrr"])


def thresholds(c, number, b, sign=0, other=0):
    stage, errors = with_errors(c, number, b, sign, other)
    left = {high: stage.level(high, errors) for high in (False, True)}
    up, down = (left[True], left[False]) if c["kind"] == "comparator-inverting" else (left[False], left[True])
    return up, down, stage


def show(x):
    return float(mp.nstr(mp.mpf(x), DIGITS))


def solve(c):
    number = mp.mpf
    b = build(c, number)
    up, down, stage = thresholds(c, number, b)
    out = {"threshold_high": show(up["signal"]), "threshold_low": show(down["signal"]), "hysteresis": show(up["signal"] - down["signal"])}
    if up["signal"] <= down["signal"]:
        return {"no_hysteresis": True}
    part, inverting = c["part"], c["kind"] == "comparator-inverting"
    states = []
    for high in (False, True):
        edge = (up if high == inverting else down)["signal"]
        ends = [edge]
        if c["signal"]:
            low, top = number(c["signal"][0]) - number(c["signal"][1]), number(c["signal"][0]) + number(c["signal"][1])
            # The output is high below the thresholds where the stage inverts.
            ends = [min(max(edge, low), top), low if high == inverting else top]
        states += [(high, stage.level(high, signal=s)) for s in ends]
    out["output_high"] = show(min(s["volts"]["out"] for high, s in states if high))
    out["output_low"] = show(max(s["volts"]["out"] for high, s in states if not high))
    currents = [s["current"] for _, s in states]
    out["current_margin"] = show(number(part["current_limit"]) - max(abs(i) for i in currents))
    low, top = b["negative"] + number(part["range"][0]), b["positive"] - number(part["range"][1])
    inputs = [s["volts"][pin] for _, s in states for pin in "+-"]
    out["input_range_margin"] = show(min(min(top - v, v - low) for v in inputs))
    quiescent = number(part["supply_current"])
    out["supply_current"] = show(quiescent + max(max(i, 0) for i in currents))
    heat = max((b["positive"] - s["output"]) * i if i > 0 else (b["negative"] - s["output"]) * i for (_, s), i in zip(states, currents))
    heat += quiescent * (b["positive"] - b["negative"])
    out["dissipation"] = show(heat)
    out["junction_temperature"] = show(number(c["temperature"]) + heat * number(part["junction_to_ambient"]))
    power = [
        (s["volts"][a] - s["volts"][k]) ** 2 / ohms
        for _, s in states
        for a, k, ohms, name in stage.parts
        if name in c["components"] and a in s["volts"] and k in s["volts"]
    ]
    out["resistor_dissipation"] = show(max(power))
    times = []
    for rises in (False, True):
        before = up if rises != inverting else down
        after = stage.level(rises, signal=before["signal"])
        rate = number(part["slew_rise" if rises else "slew_fall"])
        if c["load_capacitance"]:
            way = 1 if rises else -1
            standing = max(after["current"] * way, before["current"] * way, 0)
            rate = min(rate, (number(part["current_limit"]) - standing) / number(c["load_capacitance"]))
        times.append(abs(after["output"] - before["output"]) / rate)
    out["response_time"] = show(max(times) + number(part["overload_recovery"]))

    names = [*c["components"], "reference", "positive", "negative", "headroom"]
    corners = np.array(list(itertools.product((-1.0, 1.0), repeat=len(names) + 2)))
    at = {name: corners[:, k] for k, name in enumerate(names)}
    b = build(c, lambda x: np.float64(x), at)
    b = {k: v + np.zeros(len(corners)) if isinstance(v, np.ndarray) or np.isscalar(v) else v for k, v in b.items()}
    up, down, _ = thresholds(c, lambda x: np.ones(len(corners)) * x, b, corners[:, -2], corners[:, -1])
    for name, values in (
        ("threshold_high", up["signal"]),
        ("threshold_low", down["signal"]),
        ("hysteresis", up["signal"] - down["signal"]),
    ):
        out[name + "_range"] = [show(values.min()), show(values.max())]
    return out


# ------------------------------------------------------------------ circuits
def spread(draw, low, high):
    return float(f"{10 ** draw.uniform(mp.log10(low), mp.log10(high)):.3g}")


def part(draw, span):
    bound = lambda typ, factor: [typ, float(f"{typ * factor:.3g}")]
    up = [[0.0, 0.004 * span, 0.009 * span], [0.002, 0.012 * span, 0.03 * span], [0.02, 0.05 * span, 0.12 * span]]
    down = [[0.0005, 0.003 * span, 0.011 * span], [0.02, 0.06 * span, 0.1 * span]]
    return {
        "offset": bound(spread(draw, 1e-5, 5e-3), 4),
        "drift": bound(spread(draw, 1e-7, 1e-5), 3),
        "bias": bound(spread(draw, 1e-12, 1e-7), 5),
        "offset_current": bound(spread(draw, 1e-13, 3e-8), 5),
        "cmrr": bound(spread(draw, 1e4, 1e6), 0.2),
        "psrr_positive": bound(spread(draw, 1e4, 1e6), 0.3),
        "psrr_negative": bound(spread(draw, 1e4, 1e6), 0.3),
        "open_loop": spread(draw, 1e4, 1e7),
        "output_resistance": spread(draw, 10, 2e3),
        "differential_resistance": draw.choice([None, spread(draw, 1e6, 1e12)]),
        "common_mode_resistance": draw.choice([None, spread(draw, 1e8, 1e13)]),
        "slew_rise": spread(draw, 1e5, 1e8),
        "slew_fall": spread(draw, 1e5, 1e8),
        "overload_recovery": spread(draw, 1e-8, 1e-4),
        "current_limit": 0.021,
        "supply_current": spread(draw, 1e-5, 5e-3),
        "junction_to_ambient": spread(draw, 50, 300),
        "range": [-0.1 * span, -0.1 * span],
        "headroom_high": up,
        "headroom_low": down,
    }


def random_circuit(draw, k):
    kind = ["comparator-inverting", "comparator-non-inverting"][k % 2]
    single = draw.random() < 0.5
    span = draw.choice([3.3, 5.0, 12.0, 24.0])
    low = 0.0 if single else -span / 2
    scale = spread(draw, 2e3, 3e5)
    ratio = spread(draw, 2, 200)
    components = {"R1": scale, "R2": float(f"{scale * ratio:.3g}")}
    if draw.random() < 0.4:
        components["R3"] = float(f"{scale * spread(draw, 0.5, 20):.3g}")
    if draw.random() < 0.5:
        components["Rser"] = spread(draw, 10, 1e4)
        if kind == "comparator-inverting" and draw.random() < 0.5:
            components["R4"] = spread(draw, 1e3, 1e5)
    if draw.random() < 0.3:
        components["Riso"] = spread(draw, 10, 200)
    # The reference lies where its inputs can follow.
    reference = float(f"{low + span * draw.uniform(0.25, 0.6):.3g}")
    rail = lambda v: [v - abs(v) * 0.05, v, v + abs(v) * 0.05]
    signal = None
    if draw.random() < 0.4:
        signal = [0.0, 1e3]
    c = {
        "id": f"s{k}",
        "kind": kind,
        "components": components,
        "isolation": draw.choice(["inside", "outside"]) if "Riso" in components else "outside",
        "source": draw.choice([0.0, spread(draw, 1, 1e4)]),
        "reference": reference,
        "reference_resistance": draw.choice([0.0, spread(draw, 0.1, 1e3)]),
        "load_resistance": draw.choice([None, spread(draw, 2e3 * span / 5, 1e6)]),
        "load_capacitance": draw.choice([None, spread(draw, 1e-11, 1e-7)]),
        "positive": rail(low + span),
        "negative": rail(low),
        "temperature": draw.choice([298.15, 253.15, 343.15]),
        "tolerance": draw.choice([0.001, 0.01, 0.02]),
        "signal": signal,
        "part": part(draw, span),
    }
    return c


def hard():
    """What a formula would miss: feedback weaker than the gain asks, a millivolt of hysteresis, rails far from ground, heavy loads."""
    draw = random.Random(5)
    for k, (name, change) in enumerate(
        [
            ("weak-feedback", {"components": {"R1": 1e3, "R2": 1e9}, "part": {"open_loop": 1e4}}),
            ("barely-any", {"components": {"R1": 1e3, "R2": 5e6}, "part": {"open_loop": 1e6}}),
            ("gain-of-a-thousand", {"components": {"R1": 1e3, "R2": 1e5}, "part": {"open_loop": 1e3}}),
            ("strong-feedback", {"components": {"R1": 1e5, "R2": 1.2e5, "R3": 1e5}}),
            ("badly-scaled", {"components": {"R1": 1e-2, "R2": 1e9}, "source": 0.0, "part": {"open_loop": 1e12}}),
            ("heavy-load", {"load_resistance": 600.0, "components": {"R1": 1e4, "R2": 3e4, "Riso": 100.0}, "isolation": "inside"}),
        ]
    ):
        for which in (0, 1):
            c = random_circuit(draw, 2 * k + which)
            c["signal"] = None
            c.update({"positive": [4.75, 5.0, 5.25], "negative": [0.0, 0.0, 0.0], "reference": 2.0, "load_resistance": None})
            c["part"] = part(draw, 5.0)
            c["isolation"] = "outside"
            for key, value in change.items():
                c[key] = {**c["part"], **value} if key == "part" else value
            c["id"] = f"{name}-{which}"
            yield c


def table(seed=SEED, count=40):
    for c in hard():
        yield {"circuit": c, "expected": solve(c)}
    draw = random.Random(seed)
    k = kept = 0
    while kept < count:
        c = random_circuit(draw, k)
        k += 1
        try:
            expected = solve(c)
        except (AssertionError, ArithmeticError):
            continue  # more current than the headroom tables state
        if "no_hysteresis" in expected or expected["hysteresis_range"][0] <= 0:
            continue
        if c["signal"]:
            # Around the thresholds, so that they can be met at every corner.
            low, high = expected["threshold_low_range"][0], expected["threshold_high_range"][1]
            c["signal"] = [(low + high) / 2, (high - low) * draw.uniform(0.6, 2)]
            try:
                expected = solve(c)
            except (AssertionError, ArithmeticError):
                continue
        if expected["input_range_margin"] <= 0.02 * (c["positive"][1] - c["negative"][1]):
            continue  # outside the inputs' range there is no threshold
        kept += 1
        yield {"circuit": c, "expected": expected}


def main():
    if len(sys.argv) < 2 or sys.argv[1] not in ("write", "check"):
        sys.exit(__doc__)
    name = sys.argv[2] if len(sys.argv) > 2 else os.path.join(os.path.dirname(os.path.abspath(__file__)), "oracle_switching.json")
    rows = list(table(*(int(x) for x in sys.argv[3:5])))
    if sys.argv[1] == "write":
        with open(name, "w", encoding="utf-8") as file:
            file.write("[\n" + ",\n".join(json.dumps(row, separators=(",", ":")) for row in rows) + "\n]\n")
        return
    with open(name, encoding="utf-8") as file:
        old = json.load(file)
    found = list(differences(old, json.loads(json.dumps(rows))))
    print("\n".join(found) or f"{len(rows)} circuits agree with the table to 1e-10")
    sys.exit(1 if found else 0)


if __name__ == "__main__":
    main()
