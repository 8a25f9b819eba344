#!/usr/bin/env python3
"""Solves what stands around stages of every kind, by the route of oracle_kinds.py: dense nodal matrices of numbers in mpmath.

    oracle_around.py write [FILE [SEED [COUNT]]]    solve COUNT random circuits of each kind and write the table
    oracle_around.py check [FILE]                   solve all circuits again and compare with the table

Transients are sums over the eigenvectors of the matrix pencil, in mpmath with 110 digits; their extremes are sought on a dense grid.

- converter: its sampling capacitor, charged to a voltage the whole input range away, is connected to the network at t = 0. The error
  is the largest one at that capacitor from the acquisition time on; how steeply each amplifier's controlled source moves and what
  current leaves its pin tell whether the settling is linear. Effective bits from the noise over the band, its own, and LSB/sqrt(12).
- response at three frequencies, with the converter's resistor and capacitor and a noise-gain network in place.
- start-up: supplies, reference and steady signals step to their values with every capacitor empty. The last time at which the output is
  a hundredth of its final value away from it; where a controlled source would move faster than it slews, its largest value over the
  slew rate besides; the part's own start-up time. A stage whose pin would leave the rails on its way is told apart.
- ripple: a sine of the stated peak on each rail that is not the ground. Each amplifier lets a part of it in, as a voltage in
  series with its input of |1 + jf/fc|/PSRR of the ripple; a divider of the positive supply lets it in through the network. Signs
  are unknown, so the magnitudes at the output are added.
"""
import json
import math
import os
import random
import sys

import mpmath as mp
import numpy as np

from oracle import differences, integral, open_loop
from oracle_circuits import amplifier
from oracle_kinds import Exact, Scan, show
from oracle_kinds_circuits import KINDS, circuit, random_circuit

PLAIN = ["follower", "non-inverting", "inverting"]
NOISE_GAIN = ("follower", "non-inverting", "inverting", "transimpedance", "charge", "integrator", "differentiator",
              "multiple-feedback-low-pass", "multiple-feedback-band-pass")
BIASED = ("ac-non-inverting", "ac-inverting")
SEED = 41_017


def short(x):
    return float(f"{x:.4g}")


def log(draw, low, high):
    return short(10 ** draw.uniform(math.log10(low), math.log10(high)))


def random_plain(draw, kind, k):
    """A circuit of a kind with one input and one amplifier."""
    rf = log(draw, 1e3, 1e5)
    components = {"follower": {}, "non-inverting": {"Rf": rf, "Rg": short(rf / log(draw, 0.1, 50))}, "inverting": {"Rf": rf, "Rin": short(rf / log(draw, 0.1, 50))}}[kind]
    gbw = log(draw, 1e6, 1e8)
    amp = amplifier(open_loop=log(draw, 1e4, 1e7), gbw=gbw, higher_poles=[short(gbw * log(draw, 2, 20))], output_resistance=log(draw, 5, 300),
                    differential_capacitance=log(draw, 2e-13, 5e-12), common_mode_capacitance=log(draw, 2e-13, 5e-12))
    return circuit(f"{kind}-{k}", kind, components, amp, sources=[{"resistance": log(draw, 1, 1e3)}], load=draw.choice([{}, {"resistance": log(draw, 500, 1e5)}]),
                   frequencies=[10.0, short(gbw * 1e-3), short(gbw * 0.1)])


def around(draw, c):
    """What stands around: added to the circuit."""
    single = c["kind"] in BIASED or draw.random() < 0.3
    c["around"] = {
        "supply": [5.0, 0.0] if single else [12.0, -12.0],
        "psrr": [log(draw, 1e3, 1e6), log(draw, 1, 1e4), log(draw, 1e3, 1e6), log(draw, 1, 1e4)],
        "ripple": [log(draw, 1e-3, 0.1), log(draw, 10, 1e6)],
        "signal": [short(draw.uniform(-1, 1)), log(draw, 1e-3, 1.0), c["signal_frequency"]],
        "range": draw.choice([[0.0, 4.096], [-2.5, 2.5], [0.5, 3.0]]),
    }
    if draw.random() < 0.5 and "Rng" not in c["components"] and c["kind"] in NOISE_GAIN:
        c["components"] |= {"Rng": log(draw, 10, 1e5), "Cng": log(draw, 1e-11, 1e-8)}
    c["around"]["startup"] = [log(draw, 1e-6, 1e-4), draw.choice([1e15, log(draw, 1e4, 1e8)])]
    if c["kind"] in ("transimpedance", "charge"):
        c["around"]["signal"][:2] = [c["signal_dc"], short(c["around"]["signal"][1] * 1e-9)]
    # Slowest of what the kick meets: the time that the shunt capacitor takes, or a time constant in the band's upper half.
    fast = 1 / (2 * math.pi * c["amplifiers"][0]["gbw"])
    ohms, farads = log(draw, 10, 1e3), log(draw, 1e-10, 1e-8)
    converter = {"bits": float(draw.randint(8, 20)), "sample_capacitance": log(draw, 2e-12, 1e-10), "noise": draw.choice([None, log(draw, 1e-6, 1e-3)])}
    for name, chance, value in (("series_resistance", 0.8, ohms), ("shunt_capacitance", 0.8, farads), ("switch_resistance", 0.5, log(draw, 20, 2e3))):
        if draw.random() < chance:
            converter[name] = value
    tau = max(ohms * farads if "series_resistance" in converter and "shunt_capacitance" in converter else 0.0, 3 * fast)
    converter["acquisition_time"] = short(tau * draw.uniform(0.3, 12))
    c["around"]["converter"] = converter
    return c


# ------------------------------------------------------------------ figures
def ripple_output(c):
    peak, f = c["around"]["ripple"]
    exact, total = Exact(c), mp.mpf(0)
    s = mp.mpc(0, 2 * mp.pi * mp.mpf(f))
    out = exact.net.at("out")
    for volts, ratio, corner in zip(c["around"]["supply"], c["around"]["psrr"][::2], c["around"]["psrr"][1::2]):
        if volts == 0:
            continue
        for k, amp in enumerate(exact.amps):
            h = exact.solve(s, [(exact.net.branch["e", k], open_loop(amp, s, mp.mpf))])[out]
            total += abs(h) * abs(mp.mpc(1, mp.mpf(f) / mp.mpf(corner))) / mp.mpf(ratio) * mp.mpf(peak)
        if volts > 0 and c["kind"] in BIASED:
            total += abs(exact.transfer(f, 1)) * mp.mpf(peak)
    return total


class Transient:
    """x(t) of (G + sC)x = b for t > 0: a sum of exponentials, one for each finite eigenvalue of the pencil."""

    def __init__(self, exact, b):
        with mp.workdps(110):
            G, C = exact.pencil()
            inverse = mp.inverse(G)
            right = mp.matrix(G.rows, 1)
            for i, y in b:
                right[i] += y
            self.net, start = exact.net, inverse * right
            mu, L, R = mp.eig(inverse * C, left=True, right=True)
            self.p, self.x = [], []
            for i, m in enumerate(mu):
                if abs(m) > mp.mpf(10) ** -26:
                    weight = sum(L[i, j] * start[j] for j in range(G.rows)) / sum(L[i, j] * R[j, i] for j in range(G.rows))
                    self.p.append(-1 / m)
                    self.x.append([R[j, i] * weight / m for j in range(self.net.size)])

    def modes(self, what):
        """Poles and factors of a voltage, or of what `what(pole, voltage by node name)` makes of them."""
        volt = lambda x: lambda node: mp.mpf(0) if self.net.at(node) is None else x[self.net.at(node)]
        return [(p, what(p, volt(x))) for p, x in zip(self.p, self.x)]


def value(modes, t):
    return mp.re(sum(a * mp.exp(p * t) for p, a in modes))


def largest(modes, start):
    """The largest magnitude from a time on: dense looks in double precision, then 50 digits around the greatest."""
    p = np.array([complex(p) for p, _ in modes])
    a = np.array([complex(a) for _, a in modes])
    size = lambda t: np.abs((a[:, None] * np.exp(p[:, None] * t)).sum(0).real)
    best, at, now = float(abs(value(modes, start))), start, start
    rest = abs(sum((mp.re(a) for p0, a in modes if p0 == 0), mp.mpf(0)))  # where it ends
    for _ in range(4000):
        left = np.abs(a) * np.exp(p.real * now)
        if left.sum() <= best:
            break
        live = (left > 1e-5 * max(best, 1e-9 * left.sum())) & (np.abs(p) > 0)
        if not live.any():
            break  # what stands still is left
        step = 0.02 / np.abs(p[live]).max()
        t = now + step * np.arange(1, 513)
        v = size(t)
        if v.max() > best:
            best, at, width = float(v.max()), float(t[v.argmax()]), step
        now = float(t[-1])
    else:
        return None
    if at == start:
        return max(rest, abs(value(modes, start)))
    low, high = mp.mpf(max(start, at - width * 2)), mp.mpf(at + width * 2)
    for _ in range(120):
        x, y = low + (high - low) * mp.mpf("0.382"), low + (high - low) * mp.mpf("0.618")
        if abs(value(modes, x)) < abs(value(modes, y)):
            low = x
        else:
            high = y
    return max(rest, abs(value(modes, low)))


def acquisition(c):
    """Error at the sampling capacitor; by amplifier the steepest slope and the largest current, all for the whole input range."""
    exact = Exact(c, acquiring=True)
    converter, (low, high) = c["around"]["converter"], c["around"]["range"]
    transient = Transient(exact, [(exact.net.at("hold"), mp.mpf(converter["sample_capacitance"]) * (mp.mpf(high) - mp.mpf(low)))])
    if any(mp.re(p) > 0 for p in transient.p):
        return None
    error = largest(transient.modes(lambda p, v: v("hold")), converter["acquisition_time"])
    rows = []
    for k, (_, _, pin) in enumerate(exact.net.amps):
        slope = largest(transient.modes(lambda p, v: p * v(f"e{k}")), 0.0)
        branch = exact.net.branch["e", k]
        # The controlled source's branch current is what leaves the pin: its row in the solution.
        current = largest([(p, x[branch]) for p, x in zip(transient.p, transient.x)], 0.0)
        rows.append([slope, current])
    return error, rows


def converter_figures(c, poles):
    converter, (low, high) = c["around"]["converter"], c["around"]["range"]
    exact, scan, out = Exact(c), Scan(c), {}
    found = acquisition(c)
    if found and found[0] and all(x is not None for row in found[1] for x in row):
        out["acquisition_error"] = show(found[0])
        out["kick"] = [[show(x) for x in row] for row in found[1]]
    breaks = {float(abs(s)) / (2 * math.pi) for s in poles}
    for amp in exact.amps:
        breaks |= {*amp["higher_poles"], *(z[0] for z in amp["zeros"]), amp["gbw"], amp["gbw"] / amp["open_loop"]}
    noise = mp.mpf(integral(scan.noise, *c["band"], sorted(breaks)).sum())
    step = mp.mpf(high - low) / mp.mpf(2) ** int(converter["bits"])
    power = noise + mp.mpf(converter["noise"] or 0) ** 2 + step**2 / 12
    out["enob"] = show(mp.log((high - low) / mp.sqrt(12 * power), 2))
    dc, peak, f = c["around"]["signal"]
    middle = sum(mp.re(exact.transfer(0, drive)) * volts for drive, volts in steady(c, exact) if volts)
    room = min(high - middle, middle - low) - abs(exact.transfer(f)) * peak - exact.offset()[0]
    out["full_scale_margin"] = show(room)
    return out


def steady(c, exact):
    """What each drive stands at."""
    dc, _, _ = c["around"]["signal"]
    rows = [(0, dc)]
    if c["kind"] in BIASED:
        rows.append((1, c["around"]["supply"][0]))
    if c["reference"]:
        rows.append((1, 2.5))
    return rows


def startup(c):
    exact = Exact(c)
    net = exact.net
    rows = []
    for drive, dc in steady(c, exact):
        for i, weight in net.drives()[drive]:
            rows.append((net.branch["s", i] if net.drive == "voltage" else net.at(f"s{i}"), mp.mpf(weight) * mp.mpf(dc)))
    if net.drive == "charge":
        return {}  # a steady charge is no current: nothing stands at the output
    transient = Transient(exact, rows)
    # A step instead of an impulse: each factor over its pole.
    step = lambda node: [(p, a / p) for p, a in transient.modes(lambda p, v: v(node))]
    end = exact.solve(mp.mpf(0), rows)
    volts = lambda node: mp.mpf(0) if net.at(node) is None else mp.re(end[net.at(node)])
    if abs(volts("out")) < 1e-12:
        return {}
    own, slew = c["around"]["startup"]
    high, low = c["around"]["supply"]
    slewing = mp.mpf(0)
    for k, (_, _, pin) in enumerate(net.amps):
        excursion = largest(step(pin) + [(mp.mpf(0), volts(pin) - mp.mpf(high + low) / 2)], 0.0)
        if excursion is None:
            return {}
        if excursion > (high - low) / 2 + abs(volts("out")) / 100:
            return {"startup_clips": True}
        source = step(f"e{k}")
        slope = largest([(p, a * p) for p, a in source], 0.0)
        if slope is None:
            return {}
        if slope > slew:
            most = largest(source + [(mp.mpf(0), volts(f"e{k}"))], 0.0)
            slewing = max(slewing, most / slew)
    last = last_beyond(step("out"), abs(volts("out")) / 100)
    return {} if last is None else {"startup_time": show(own + slewing + last)}


def last_beyond(modes, level):
    """The last time at which a decaying sum has this magnitude: looked for backwards from where its envelope has fallen there."""
    p = np.array([complex(p) for p, _ in modes])
    a = np.array([complex(a) for _, a in modes])
    level = float(level)
    size = lambda t: np.abs((a[:, None] * np.exp(p[:, None] * t)).sum(0).real)
    envelope = lambda t: (np.abs(a) * np.exp(p.real * t)).sum()
    if envelope(0.0) <= level:
        return mp.mpf(0)
    high = 1.0 / np.abs(p).max()
    while envelope(high) > level:
        high *= 1.1
    now = high
    for _ in range(20000):
        live = np.abs(a) * np.exp(p.real * now) > 1e-6 * level
        step = 0.01 / np.abs(p[live]).max() if live.any() else now
        t = np.maximum(now - step * np.arange(0, 513), 0.0)
        over = np.flatnonzero(size(t) > level)
        if len(over):
            k = over[0]
            if k == 0:
                return None
            inside, outside = mp.mpf(t[k]), mp.mpf(t[k - 1])
            for _ in range(150):
                middle = (inside + outside) / 2
                if abs(value(modes, middle)) > level:
                    inside = middle
                else:
                    outside = middle
            return outside
        now = float(t[-1])
        if now <= 0:
            return mp.mpf(0)
    return None


def solve(c, poles):
    exact = Exact(c)
    response = [exact.transfer(f) for f in c["frequencies"]]
    return {"response": [[show(mp.re(h)), show(mp.im(h))] for h in response], "ripple_output": show(ripple_output(c)), **converter_figures(c, poles), **startup(c)}


# ------------------------------------------------------------------ the table
def table(seed=SEED, count=3):
    draw, k = random.Random(seed), 0
    for kind in PLAIN + KINDS:
        kept = 0
        while kept < count:
            c = random_plain(draw, kind, k) if kind in PLAIN else random_circuit(draw, kind, k)
            around(draw, c)
            k += 1
            poles = Exact(c).poles()
            if poles is None or max(float(mp.re(s) / abs(s)) for s in poles) > -1e-3:
                continue
            kept += 1
            yield {"circuit": c, "expected": solve(c, poles)}


def main():
    if len(sys.argv) < 2 or sys.argv[1] not in ("write", "check"):
        sys.exit(__doc__)
    name = sys.argv[2] if len(sys.argv) > 2 else os.path.join(os.path.dirname(os.path.abspath(__file__)), "oracle_around.json")
    rows = []
    for row in table(*(int(x) for x in sys.argv[3:5])):
        rows.append(row)
        if sys.stderr.isatty():
            print(f"\r{len(rows)} circuits, {row['circuit']['id']:50s}", end="", file=sys.stderr, flush=True)
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
