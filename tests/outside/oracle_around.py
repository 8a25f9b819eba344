#!/usr/bin/env python3
"""Solves what stands around stages of every kind, by the route of oracle_kinds.py: dense nodal matrices of numbers in mpmath.

    oracle_around.py write [FILE [SEED [COUNT]]]    solve COUNT random circuits of each kind and write the table
    oracle_around.py check [FILE]                   solve all circuits again and compare with the table

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

from oracle import differences, open_loop
from oracle_circuits import amplifier
from oracle_kinds import Exact, show
from oracle_kinds_circuits import KINDS, circuit, random_circuit

PLAIN = ["follower", "non-inverting", "inverting"]
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
    }
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


def solve(c):
    return {"ripple_output": show(ripple_output(c))}


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
            yield {"circuit": c, "expected": solve(c)}


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
