#!/usr/bin/env python3
"""Stages whose amplifiers answer to their common mode and supplies, solved as dense nodal matrices (mpmath, 50 digits).

    rejection.py write|check [FILE]

In the row of each amplifier's controlled source stands A*(v+ - v- + k*(v+ + v-)/2 + w), with k = +-(1 + jf/fc)/CMRR and w what the
rejection of a supply, (1 + jf/fc)/PSRR, lets in; |k| ends at 1. All signs are tried. Networks are those of
oracle_kinds_network.py, and a follower and a non-inverting stage by their documentation.
"""
import itertools
import json
import os
import sys

import mpmath as mp

from oracle import open_loop
from oracle_circuits import amplifier
from oracle_kinds_circuits import circuit
from oracle_kinds_network import Network

mp.mp.dps = 50
HERE = os.path.dirname(os.path.abspath(__file__))


class Net(Network):
    def lay_follower(self, place, series, tap):
        self.wire("t0", "p")
        self.wire(tap, "n")

    def lay_non_inverting(self, place, series, tap):
        self.wire("t0", "p")
        for name, a, b in (("Rf", tap, "n"), ("Rg", "n", "0"), ("Cf", "pin", "n")):
            place(name, a, b)


class Solved:
    """One stage at one frequency, with one choice of signs."""

    def __init__(self, c, f, signs):
        self.net, self.f = Net(c), mp.mpf(f)
        self.amps = [c["amplifiers"][min(k, len(c["amplifiers"]) - 1)] for k in range(len(self.net.amps))]
        self.rejections = [c["rejections"][min(k, len(c["rejections"]) - 1)] for k in range(len(self.net.amps))]
        s = mp.mpc(0, 2 * mp.pi * self.f)
        g, cap = self.net.stamp(mp.mpf)
        m = mp.matrix(self.net.size, self.net.size)
        for i, j, y in g:
            m[i, j] += y
        for i, j, y in cap:
            m[i, j] += s * y
        self.gains = [open_loop(amp, s, mp.mpf) for amp in self.amps]
        for k, a in enumerate(self.gains):
            half = self.let_in(k, "cmrr") * signs[k] / 2
            for i, sign in self.net.difference(k):
                m[self.net.branch["e", k], i] -= a * (sign + half)
        self.m = m

    def let_in(self, k, name):
        ratio, corner = (mp.mpf(x) for x in self.rejections[k][name])
        x = mp.mpc(1, self.f / corner) / ratio
        return x / max(abs(x), 1) if name == "cmrr" else x

    def out(self, rows):
        rhs = mp.matrix(self.net.size, 1)
        for i, y in rows:
            rhs[i] += y
        return mp.lu_solve(self.m, rhs)[self.net.at("out")]

    def drive(self, k):
        return self.out([(self.net.branch["s", i], mp.mpf(w)) for i, w in self.net.drives()[k]])

    def supply(self, name):
        """Magnitudes of what a volt on a rail makes at the output."""
        total = sum(abs(self.out([(self.net.branch["e", k], a)]) * self.let_in(k, name)) for k, a in enumerate(self.gains))
        fed = name == "psrr_positive" and self.net.c["kind"].startswith("ac-")
        return total + (abs(self.out([(self.net.branch["s", 1], mp.mpf(1))])) if fed else 0)


def circuits():
    real = dict(higher_poles=[2.5e7], output_resistance=60.0, differential_capacitance=3e-12, common_mode_capacitance=2e-12)
    good, fast = amplifier(**real), amplifier(open_loop=1e5, gbw=8e7, higher_poles=[2.4e8], output_resistance=30.0)
    slow = amplifier(open_loop=4e5, gbw=1e6, higher_poles=[3.1e6], output_resistance=850.0, differential_capacitance=2e-12, common_mode_capacitance=4e-12)
    poor = {"cmrr": [2e3, 5e3], "psrr_positive": [1e4, 600.0], "psrr_negative": [3e3, 200.0]}
    fair = {"cmrr": [2.5e4, 800.0], "psrr_positive": [3e4, 100.0], "psrr_negative": [5e4, 1e3]}
    weak = {"cmrr": [1e3, 5e3], "psrr_positive": [200.0, 5e2], "psrr_negative": [300.0, 1e3]}
    none = {"cmrr": [40.0, 1e2], "psrr_positive": [20.0, 1e2], "psrr_negative": [30.0, 1e3]}

    def add(c, *rejections):
        return c | {"rejections": list(rejections)}

    yield add(circuit("follower", "follower", {}, good, sources=[{"resistance": 600.0}], load={"resistance": 2e3, "capacitance": 1e-9}), poor)
    yield add(circuit("follower-without-rejection", "follower", {}, good, sources=[{"resistance": 1e5}]), none)
    yield add(circuit("non-inverting", "non-inverting", {"Rf": 9.1e3, "Rg": 470.0}, good, sources=[{"resistance": 600.0}]), fair)
    yield add(circuit("difference", "difference", {"R1": 1e4, "R2": 2.2e4, "R3": 1.001e4, "R4": 2.2e4}, good, sources=[{"resistance": 50.0}, {"resistance": 100.0}]), fair)
    yield add(circuit("difference-balanced", "difference", {"R1": 1e4, "R2": 1e4, "R3": 1e4, "R4": 1e4, "C2": 1e-11, "C4": 1e-11}, slow), poor)
    three = {"Rg": 560.0, "Rf1": 13e3, "Rf2": 13e3, "R1": 2e4, "R2": 2e4, "R3": 2e4, "R4": 2.002e4}
    yield add(circuit("instrumentation", "instrumentation", three, good, sources=[{"resistance": 350.0}, {"resistance": 350.0}]), fair)
    yield add(circuit("instrumentation-three-parts", "instrumentation", three, good, fast, slow, load={"capacitance": 1e-10, "resistance": 1e4}), poor, weak, fair)
    yield add(circuit("inverting", "multiple-feedback-low-pass", {"R1": 3.9e3, "R2": 8.45e3, "R3": 2.7e3, "C1": 1.5e-8, "C2": 2.2e-9, "Rp": 5.4e3}, slow), poor)
    yield add(circuit("sallen-key", "sallen-key-low-pass", {"R1": 8.2e3, "R2": 8.2e3, "C1": 2.2e-9, "C2": 1e-9}, slow), poor)
    yield add(circuit("scale-and-shift", "scale-and-shift", {"R1": 1e4, "R2": 2e4, "Rf": 1e5, "Rg": 1e4}, fast, reference=10.0), poor)
    yield add(circuit("from-the-supply", "ac-inverting", {"Cin": 1e-6, "Rin": 1e4, "Rf": 1e5, "Rb1": 1e5, "Rb2": 1e5, "Cb": 1e-6}, good), fair)


def solve(c):
    frequencies = [0.0, 50.0, 2e4, 3e5]
    amps = len(Net(c).amps)
    out = {"frequencies": frequencies, "gain": [], "plain": [], "cmrr": [], "positive": [], "negative": []}
    show = lambda x: float(mp.nstr(x, 16))
    for f in frequencies:
        all_signs = [Solved(c, f, signs) for signs in itertools.product((-1, 1), repeat=amps)]
        size = (lambda h: mp.re(h)) if f == 0 else abs
        # A spread may leave an amplifier's error out, too.
        gains = [size(Solved(c, f, signs).drive(0)) for signs in itertools.product((-1, 0, 1), repeat=amps)]
        out["gain"].append([show(min(gains)), show(max(gains))])
        out["plain"].append(show(size(Solved(c, f, [0] * amps).drive(0))))
        if c["kind"] in ("difference", "instrumentation"):
            out["cmrr"].append(show(min(abs(s.drive(0) / s.drive(1)) for s in all_signs)))
        # Volts at the output per volt of the rail.
        out["positive"].append(show(max(s.supply("psrr_positive") for s in all_signs)))
        out["negative"].append(show(max(s.supply("psrr_negative") for s in all_signs)))
    return out


def main():
    if len(sys.argv) < 2 or sys.argv[1] not in ("write", "check"):
        sys.exit(__doc__)
    name = sys.argv[2] if len(sys.argv) > 2 else os.path.join(HERE, "rejection.json")
    rows = [{"rejections": c["rejections"], "circuit": {k: v for k, v in c.items() if k != "rejections"}, "expected": solve(c)} for c in circuits()]
    text = "[\n" + ",\n".join(json.dumps(row, separators=(",", ":")) for row in rows) + "\n]\n"
    if sys.argv[1] == "write":
        with open(name, "w", encoding="utf-8") as file:
            file.write(text)
        return
    with open(name, encoding="utf-8") as file:
        same = file.read() == text
    print(f"{len(rows)} stages agree with the table" if same else "the table is not what this program gives")
    sys.exit(not same)


if __name__ == "__main__":
    main()
