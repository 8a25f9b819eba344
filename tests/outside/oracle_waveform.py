#!/usr/bin/env python3
"""Steps random nonlinear stages with scipy's adaptive solver, from equations written here by another route than ours.

    oracle_waveform.py write [FILE [SEED [COUNT]]]    step COUNT random circuits, and the listed hard ones, and write the table
    oracle_waveform.py check [FILE]                   step all circuits again and compare with the table

Network: nodal matrices; charges of the capacitance matrix's eigenvectors are the states, its null space is solved at each moment (ours
takes the capacitors' tree). Pin: the current is the middle one of three lines' roots (ours keeps straight pieces and walks
from one to the next). Time: LSODA with rtol 1e-9 and small steps (ours steps by matrix exponentials and looks for events).

The amplifier is the model's, as its documentation states it: input stage limited, dominant and higher poles, output resistance (at
least 1 mΩ), pin limited by rails less headroom (with 1e-5 of the output resistance more) and by the current limit; at a limit all of
the amplifier's states are held back at 100·2π·GBW times E − Ro·I − V.
"""
import json
import math
import os
import random
import signal
import sys

import numpy as np
from scipy.integrate import solve_ivp

HERE = os.path.dirname(os.path.abspath(__file__))
TABLE = os.path.join(HERE, "oracle_waveform.json")
SEED, COUNT, POINTS = 60_221, 60, 24
# Seconds after which a circuit is left out of a new table.
PATIENCE = 60


def short(x):
    return float(f"{x:.4g}")


def log(draw, low, high):
    return short(10 ** draw.uniform(math.log10(low), math.log10(high)))


# ------------------------------------------------------------------ network
class Net:
    """Nodes 0 (ground), 1 (the input), 2 …; node 1 is held."""

    def __init__(self, c):
        v, a = c["values"], c["amplifier"]
        self.n, self.r, self.c = 2, [], []
        source = self.behind(1, v.get("Rs"))
        kind = c["kind"]
        if kind == "inverting":
            minus = self.node()
            self.r.append((source, minus, v["Rin"]))
            plus = 0
        elif kind == "non-inverting":
            plus = self.behind(source, v.get("Rser"))
            self.cap(plus, 0, v.get("Cshunt"))
            minus = self.node()
            self.r.append((minus, 0, v["Rg"]))
        else:
            plus = self.behind(source, v.get("Rser"))
            self.cap(plus, 0, v.get("Cshunt"))
            minus = None
        pin = self.node()
        if minus is None:
            if v.get("Rf"):
                minus = self.node()
            else:
                minus = pin
        if v.get("Rf"):
            self.r.append((pin, minus, v["Rf"]))
        self.cap(pin, minus, v.get("Cf"))
        if v.get("Rsn"):
            middle = self.node()
            self.r.append((pin, middle, v["Rsn"]))
            self.cap(middle, 0, v["Csn"])
        load = self.behind(pin, v.get("Riso"))
        if v.get("RL"):
            self.r.append((load, 0, v["RL"]))
        self.cap(load, 0, v.get("CL"))
        self.cap(plus, minus, a["differential_capacitance"])
        self.cap(plus, 0, a["common_mode_capacitance"])
        self.cap(minus, 0, a["common_mode_capacitance"])
        self.plus, self.minus, self.pin, self.load = plus, minus, pin, load

    def node(self):
        self.n += 1
        return self.n - 1

    def behind(self, frm, r):
        if not r:
            return frm
        to = self.node()
        self.r.append((frm, to, r))
        return to

    def cap(self, a, b, c):
        if c and a != b:
            self.c.append((a, b, c))

    def matrices(self):
        G, C = np.zeros((self.n, self.n)), np.zeros((self.n, self.n))
        for M, list_, f in ((G, self.r, lambda r: 1 / r), (C, self.c, lambda x: x)):
            for a, b, x in list_:
                y = f(x)
                M[a, a] += y
                M[b, b] += y
                M[a, b] -= y
                M[b, a] -= y
        free = [0 + i for i in range(self.n) if i not in (0, 1)]
        ix = np.ix_(free, free)
        return G[ix], C[ix], G[free, 1], C[free, 1], free


# ------------------------------------------------------------------ in time
def wave(c):
    """Pieces of the input: (from, value(t))."""
    w = c["input"]
    if w["kind"] == "steps":
        return [(t, (lambda _t, x=x: x)) for t, x in w["steps"]]
    if w["kind"] == "sine":
        return [(0.0, lambda t: w["dc"] + w["peak"] * math.sin(2 * math.pi * w["frequency"] * t))]
    return [(0.0, lambda t: w["slope"] * t)]


def solve(c):
    net, a = Net(c), c["amplifier"]
    G, C, Gu, Cu, free = net.matrices()
    at = {n: i for i, n in enumerate(free)}
    scale = np.max(np.abs(C)) or 1.0
    lam, U = np.linalg.eigh(C)
    dyn = lam > 1e-12 * scale
    R, N, lam = U[:, dyn], U[:, ~dyn], lam[dyn]
    ro = max(a["output_resistance"], 1e-3)
    wu, gap = 2 * math.pi * a["gbw"], 1e-5 * ro
    wd, hold = wu / a["open_loop"], 100 * wu
    poles = [2 * math.pi * p for p in a["poles"]]
    zeros = [2 * math.pi * z for z in a.get("zeros", [])]
    rise, fall, most = a["slew_rise"], a["slew_fall"], a["current_limit"]
    vp, vm = c["supply"]
    e_pin = np.zeros(len(free))
    e_pin[at[net.pin]] = 1.0
    # Algebraic part by the current and the rest: N'G(R y + N w) + N'Gu u = N'e I.
    NGN = N.T @ G @ N
    back = np.linalg.inv(NGN) if N.shape[1] else np.zeros((0, 0))
    nd = R.shape[1]

    # v = of_q·q + of_u·u + of_i·I.
    inner = R / lam if nd else R
    fixed_q, fixed_u = inner, -(inner @ (R.T @ Cu)) if nd else np.zeros(len(free))
    of_q = fixed_q - N @ (back @ (N.T @ (G @ fixed_q)))
    of_u = fixed_u - N @ (back @ (N.T @ (G @ fixed_u + Gu)))
    of_i = N @ (back @ (N.T @ e_pin))
    pin = at[net.pin]
    a1 = of_i[pin]
    rq, ru, ri = R.T @ (-G @ of_q), R.T @ (-G @ of_u - Gu), R.T @ (e_pin - G @ of_i)
    row = lambda n: (np.zeros(nd), 0.0, 0.0) if n == 0 else (np.zeros(nd), 1.0, 0.0) if n == 1 else (of_q[at[n]], of_u[at[n]], of_i[at[n]])
    difference = tuple(x - y for x, y in zip(row(net.plus), row(net.minus)))

    def at_rail(rail, rows, sign, a0):
        """Where the network meets rail ∓ headroom(±I) − gap·I: straight from row to row."""
        edges = [-math.inf] + [r[0] for r in rows] + [math.inf]
        for k in range(len(edges) - 1):
            if k == 0 or k == len(rows):
                h, slope, base = rows[0 if k == 0 else -1][1], 0.0, 0.0
            else:
                (base, h), (x1, h1) = rows[k - 1], rows[k]
                slope = (h1 - h) / (x1 - base)
            # a0 + a1·I = rail − sign·(h + slope·(sign·I − base)) − gap·I
            i = (rail - sign * (h - slope * base) - a0) / (a1 + slope + gap)
            if edges[k] - 1e-15 <= sign * i <= edges[k + 1] + 1e-15:
                return i
        raise AssertionError("monotone")

    def moment(s, u):
        q = s[:nd]
        a0 = float(of_q[pin] @ q) + of_u[pin] * u
        E = s[nd]
        for k, p in enumerate(poles):
            own = s[nd + 1 + k]
            E = own + (E - own) * p / zeros[k] if k < len(zeros) else own
        # Falling lines against a rising one: the roots are ordered as the lines are.
        i = (E - a0) / (a1 + ro)
        i = max(min(i, at_rail(vp, a["headroom_high"], 1, a0)), at_rail(vm, a["headroom_low"], -1, a0))
        i = max(min(i, most), -most)
        return a0 + a1 * i, i, E

    def rhs(t, s, value):
        u = value(t)
        v, i, E = moment(s, u)
        d = np.empty_like(s)
        d[:nd] = rq @ s[:nd] + ru * u + ri * i
        vd = float(difference[0] @ s[:nd]) + difference[1] * u + difference[2] * i
        excess = E - ro * i - v
        pulled = hold * excess if abs(excess) > 1e-12 * (1 + abs(E)) else 0.0
        d[nd] = min(max(wu * vd, -fall), rise) - wd * s[nd] - pulled
        before = s[nd]
        for k, p in enumerate(poles):
            own = s[nd + 1 + k]
            d[nd + 1 + k] = p * (before - own) - pulled
            before = own + (before - own) * p / zeros[k] if k < len(zeros) else own
        return d

    s = np.zeros(nd + 1 + len(poles))
    end, out = c["window"], []
    times = [end * (k + 1) / POINTS for k in range(POINTS - 1)] + [end]
    pieces = wave(c)
    # Charges are of the order of the capacitances: tolerances follow.
    absolute = np.concatenate([1e-12 * np.sqrt(lam * lam) if nd else np.zeros(0), np.full(1 + len(poles), 1e-11)])
    for k, (begin, value) in enumerate(pieces):
        until = pieces[k + 1][0] if k + 1 < len(pieces) else end
        inside = [t for t in times if begin < t <= until]
        r = solve_ivp(rhs, (begin, until), s, method="LSODA", t_eval=sorted(set(inside) | {until}), rtol=1e-9, atol=absolute, args=(value,), max_step=(until - begin) / 100)
        assert r.success, r.message
        for t, state in zip(r.t, r.y.T):
            if t in inside:
                _, i, _ = moment(state, value(t))
                share = row(net.load)
                out.append(float(share[0] @ state[:nd] + share[1] * value(t) + share[2] * i))
        s = r.y[:, -1]
    return {"times": times, "output": out}


# ------------------------------------------------------------------ circuits
def amplifier(draw):
    gbw = log(draw, 5e5, 5e7)
    rise = short(gbw * log(draw, 0.2, 4))
    most = log(draw, 5e-3, 5e-2)
    rows = lambda: [[0.0, log(draw, 0.02, 1.2)]] if draw.random() < 0.3 else [[0.0, short(x := log(draw, 0.02, 0.5))], [short(most * 0.4), short(x + 0.3)], [most, short(x + 0.3 + log(draw, 0.2, 1.0))]]
    poles = draw.choice([[], [short(gbw * log(draw, 2, 8))], [short(gbw * log(draw, 2, 8)), short(gbw * log(draw, 8, 20))]])
    return {
        "open_loop": log(draw, 1e4, 1e6),
        "gbw": gbw,
        "poles": poles,
        "zeros": [short(poles[0] * log(draw, 1.5, 5))] if poles and draw.random() < 0.3 else [],
        "output_resistance": log(draw, 5, 200),
        "differential_capacitance": log(draw, 5e-13, 5e-12),
        "common_mode_capacitance": log(draw, 5e-13, 5e-12),
        "slew_rise": rise,
        "slew_fall": draw.choice([rise, short(rise * log(draw, 0.4, 2))]),
        "current_limit": most,
        "headroom_high": rows(),
        "headroom_low": rows(),
    }


def random_circuit(draw, k):
    a, kind = amplifier(draw), draw.choice(["follower", "non-inverting", "inverting"])
    rf = log(draw, 1e3, 3e4)
    gain = log(draw, 0.5, 20)
    values = {"follower": lambda: {}, "non-inverting": lambda: {"Rf": rf, "Rg": short(rf / gain)}, "inverting": lambda: {"Rf": rf, "Rin": short(rf / gain)}}[kind]()
    noise_gain = 1 if kind == "follower" else 1 + gain
    if kind != "follower":
        values["Cf"] = short(1 / (2 * math.pi * rf * a["gbw"] / noise_gain * log(draw, 0.5, 3)))
    values["Rs"] = log(draw, 10, 1e3)
    if draw.random() < 0.7:
        values["RL"] = log(draw, 200, 1e4)
    if draw.random() < 0.6:
        values["CL"] = log(draw, 1e-11, 1e-7)
        values["Riso"] = log(draw, 10, 100) if values["CL"] > 3e-10 else None
        values = {k_: v for k_, v in values.items() if v}
    if draw.random() < 0.3 and kind == "follower":
        values["Rser"], values["Cshunt"] = log(draw, 50, 1e3), log(draw, 1e-11, 1e-9)
    if draw.random() < 0.2:
        values["Rsn"], values["Csn"] = log(draw, 20, 200), log(draw, 1e-10, 1e-8)
    supply = draw.choice([[5.0, -5.0], [12.0, -12.0], [3.3, -1.7], [15.0, -5.0]])
    swing = min(supply[0], -supply[1])
    shown = {"follower": 1, "non-inverting": 1 + gain, "inverting": gain}[kind]
    level = lambda: short(draw.choice([0.2, 0.6, 1.0, 1.6]) * swing / shown * draw.choice([-1, 1]))
    slewing = 2 * swing / min(a["slew_rise"], a["slew_fall"]) + (2 * swing * values.get("CL", 0) / a["current_limit"])
    slow = noise_gain / (2 * math.pi * a["gbw"]) + 3 * values.get("CL", 0) * (values.get("Riso", 0) + a["output_resistance"]) / 3
    window = short(2 * slewing + 20 * slow)
    kind_of = draw.choice(["steps", "steps", "sine", "sine", "ramp"])
    inputs = {
        "steps": lambda: {"kind": "steps", "steps": [[0.0, level()], [short(window / 2), level()]]},
        "sine": lambda: {"kind": "sine", "dc": 0.0, "peak": abs(level()), "frequency": short(draw.choice([1.5, 2.5, 4.0]) / window)},
        "ramp": lambda: {"kind": "ramp", "slope": short(2 * level() / window)},
    }
    return {"id": f"wave-{k}", "kind": kind, "values": values, "amplifier": a, "supply": supply, "input": inputs[kind_of](), "window": window}


def hard():
    """Listed: a stiff follower with 100 nF behind 10 Ω, a capacitance that the current cannot slew, one rail alone, a gross overdrive."""
    a = {"open_loop": 1e6, "gbw": 1e7, "poles": [2.5e7], "zeros": [], "output_resistance": 50.0, "differential_capacitance": 2e-12, "common_mode_capacitance": 4e-12,
         "slew_rise": 8e6, "slew_fall": 6e6, "current_limit": 0.03, "headroom_high": [[0.0, 0.1], [0.01, 0.4], [0.03, 1.5]], "headroom_low": [[0.0, 0.05], [0.03, 1.0]]}
    step = lambda *s: {"kind": "steps", "steps": [list(x) for x in s]}
    row = lambda id, kind, values, supply, input, window, **more: {"id": id, "kind": kind, "values": values, "amplifier": {**a, **more}, "supply": supply, "input": input, "window": window}
    return [
        row("stiff-100n", "follower", {"Rs": 100.0, "Riso": 10.0, "CL": 1e-7, "RL": 2e3}, [12.0, -12.0], step((0.0, 5.0), (4e-5, -5.0)), 1e-4),
        row("cannot-slew", "follower", {"Rs": 100.0, "Riso": 1.0, "CL": 1e-6}, [12.0, -12.0], step((0.0, 3.0)), 4e-4, current_limit=0.01),
        row("one-rail", "inverting", {"Rs": 50.0, "Rin": 1e3, "Rf": 1e4, "Cf": 1e-12, "RL": 1e3}, [5.0, -5.0], {"kind": "sine", "dc": 0.3, "peak": 0.4, "frequency": 2e4}, 1e-4),
        row("overdriven", "non-inverting", {"Rs": 50.0, "Rf": 9e3, "Rg": 1e3, "Cf": 2e-12, "RL": 600.0}, [5.0, -5.0], step((0.0, 5.0), (5e-6, -5.0), (1e-5, 0.1)), 2e-5),
        row("rings", "follower", {"Rs": 10.0, "CL": 3e-9}, [12.0, -12.0], step((0.0, 1.0)), 2e-5),
    ]


def circuits(seed, count):
    draw = random.Random(seed)
    return hard() + [random_circuit(draw, k) for k in range(count)]


def too_long(*_):
    raise TimeoutError


def main():
    signal.signal(signal.SIGALRM, too_long)
    mode, file = sys.argv[1], sys.argv[2] if len(sys.argv) > 2 else TABLE
    if mode == "write":
        seed, count = int(sys.argv[3]) if len(sys.argv) > 3 else SEED, int(sys.argv[4]) if len(sys.argv) > 4 else COUNT
        rows = []
        for c in circuits(seed, count):
            print(c["id"], c["kind"], flush=True, file=sys.stderr)
            signal.alarm(PATIENCE)
            try:
                rows.append({"circuit": c, "expected": solve(c)})
            except (TimeoutError, AssertionError) as why:
                print(f"left out: {why or 'takes too long'}", flush=True, file=sys.stderr)
                continue
            finally:
                signal.alarm(0)
            signal.alarm(0)
            rows[-1]["expected"] = {k: [float(f"{x:.10g}") for x in v] for k, v in rows[-1]["expected"].items()}
        with open(file, "w") as f:
            f.write("[\n" + ",\n".join(json.dumps(r) for r in rows) + "\n]\n")
        print(f"{len(rows)} circuits written to {file}")
        return
    with open(file) as f:
        rows = json.load(f)
    worst = 0.0
    for row in rows:
        now = solve(row["circuit"])["output"]
        worst = max([worst] + [abs(x - y) for x, y in zip(now, row["expected"]["output"])])
    print(f"{len(rows)} circuits; greatest difference {worst:.3g} V")
    sys.exit(0 if worst < 1e-6 else 1)


if __name__ == "__main__":
    main()
