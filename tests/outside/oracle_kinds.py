#!/usr/bin/env python3
"""Solves stages of the kinds with several inputs, drives or amplifiers, like oracle.py: dense nodal matrices of numbers.

    oracle_kinds.py write [FILE [SEED [COUNT]]]    solve all circuits (COUNT random ones of each kind) and write the table
    oracle_kinds.py check [FILE]                   solve all circuits again and compare with the table

Route and amplifier model are oracle.py's. Conventions beyond it: a source stands in series with a voltage's input and across
a current's or a charge's; a photodiode is its capacitance and shunt resistance across the input, with shot noise 2q(I0 + |I|);
differential drives are the difference (-1/2 at in1, +1/2 at in2) and the common mode (1 at both); board strays stand at the
first amplifier; the return ratio of an amplifier is taken with the others alive. With the isolation resistor inside the loop
whatever leads back from the output does so from the load, but for a capacitor straight to the inverting input: that one stays
at the pin. A stage's gain is its transfer at DC, at the greatest magnitude, or at a frequency, as its kind says (`reference`).
"""
import json
import math
import os
import random
import sys

os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")
import mpmath as mp
import numpy as np

from oracle import differences, integral, open_loop, root
from oracle_kinds_circuits import KINDS, hard, random_circuit
from oracle_kinds_network import Network

DIGITS = 13
SEED = 30_103


def amplifiers(c):
    """One for each amplifier of the stage."""
    count = 3 if c["kind"] == "instrumentation" else 1
    return [c["amplifiers"][min(k, len(c["amplifiers"]) - 1)] for k in range(count)]


class Exact:
    """One stage at single frequencies, in mpmath."""

    def __init__(self, c, **given):
        self.net, self.amps = Network(c, **given), amplifiers(c)
        self.g, self.cap = self.net.stamp(mp.mpf)

    def matrix(self, s, dead=None):
        m = mp.matrix(self.net.size, self.net.size)
        for i, j, y in self.g:
            m[i, j] += y
        for i, j, y in self.cap:
            m[i, j] += s * y
        for k, amp in enumerate(self.amps):
            if k != dead:
                gain = open_loop(amp, s, mp.mpf)
                for i, sign in self.net.difference(k):
                    m[self.net.branch["e", k], i] -= sign * gain
        return m

    def solve(self, s, rows, dead=None):
        rhs = mp.matrix(self.net.size, 1)
        for i, y in rows:
            rhs[i] += y
        return mp.lu_solve(self.matrix(s, dead), rhs)

    def transfer(self, f, drive=0):
        s = mp.mpc(0, 2 * mp.pi * mp.mpf(f))
        net = self.net
        unit = s if net.drive == "charge" else mp.mpf(1)
        rows = [(net.branch["s", i] if net.drive == "voltage" else net.at(f"s{i}"), weight * unit) for i, weight in net.drives()[drive]]
        return self.solve(s, rows)[net.at("out")]

    def return_ratio(self, f, k):
        s = mp.mpc(0, 2 * mp.pi * mp.mpf(f))
        x = self.solve(s, [(self.net.branch["e", k], mp.mpf(1))], dead=k)
        return -open_loop(self.amps[k], s, mp.mpf) * sum(sign * x[i] for i, sign in self.net.difference(k))

    def noise(self, f):
        s = mp.mpc(0, 2 * mp.pi * mp.mpf(f))
        rhs = mp.matrix(self.net.size, 1)
        rhs[self.net.at("out")] = 1
        adjoint = mp.lu_solve(self.matrix(s).T, rhs)
        pick = lambda i: 0 if i is None else adjoint[i]
        rows = []
        for _, a, b, k, density in self.net.sources():
            h = pick(a) - pick(b) if k is None else adjoint[self.net.branch["e", k]] * open_loop(self.amps[k], s, mp.mpf)
            rows.append(abs(h) ** 2 * density(f))
        return rows

    def offset(self):
        """Sum of the magnitudes at the output: offset voltages; bias currents, alike at both inputs; offset currents, half at each,
        opposed; a photodiode's dark current. And the greatest of the terms that may cancel within it."""
        net = self.net
        rhs = mp.matrix(net.size, 1)
        rhs[net.at("out")] = 1
        adjoint = mp.lu_solve(self.matrix(mp.mpf(0)).T, rhs)
        pick = lambda node: 0 if net.at(node) is None else adjoint[net.at(node)]
        volts, bias, apart = (mp.mpf(x) for x in net.c["offset"])
        diode = (net.c["sources"] + [None])[0] or {}
        total, most = abs(pick("t0")) * mp.mpf(diode.get("dark_current", 0.0)), mp.mpf(0)
        for k, (p, n, _) in enumerate(net.amps):
            p, n = pick(p), pick(n)
            total += abs(adjoint[net.branch["e", k]]) * mp.mpf(self.amps[k]["open_loop"]) * volts + abs(p + n) * bias + (abs(p) + abs(n)) / 2 * apart
            most = max(most, abs(p) * bias)
        return total, most

    def impedance(self, f, node):
        s = mp.mpc(0, 2 * mp.pi * mp.mpf(f))
        i = self.net.at(node)
        return abs(self.solve(s, [(i, mp.mpf(1))])[i])

    def pencil(self):
        """G and C of (G + sC)x = b, the amplifiers' poles as unknowns of their own."""
        with mp.workdps(110):
            g, cap = self.net.stamp(mp.mpf)
            tau, size = 2 * mp.pi, self.net.size
            n = size + sum(1 + len(amp["higher_poles"]) for amp in self.amps)
            G, C = mp.zeros(n), mp.zeros(n)
            for i, j, y in g:
                G[i, j] += y
            for i, j, y in cap:
                C[i, j] += y
            row = size
            for k, amp in enumerate(self.amps):
                chain = [mp.mpf(amp["gbw"]) * tau / mp.mpf(amp["open_loop"])] + [tau * mp.mpf(f) for f in amp["higher_poles"]]
                before = [(i, sign * mp.mpf(amp["open_loop"])) for i, sign in self.net.difference(k)]
                for j, w in enumerate(chain):
                    # (1 + s/w) x_j = (1 +- s/wz) * (x_(j-1), or the gain times the input difference)
                    G[row, row] += 1
                    C[row, row] += 1 / w
                    for i, y in before:
                        G[row, i] -= y
                        if j < len(amp["zeros"]):
                            f, right = amp["zeros"][j]
                            C[row, i] -= y * (-1 if right else 1) / (tau * mp.mpf(f))
                    before, row = [(row, mp.mpf(1))], row + 1
                G[self.net.branch["e", k], row - 1] -= 1
            return G, C

    def poles(self):
        """Finite eigenvalues of the pencil; None where DC has no solution."""
        with mp.workdps(110):
            G, C = self.pencil()
            try:
                mu = mp.eig(mp.inverse(G) * C, left=False, right=False)
            except ZeroDivisionError:
                return None  # no DC path
            out = []
            for m in mu:
                if abs(m) > mp.mpf(10) ** -26:
                    s = -1 / m
                    out.append(mp.mpc(mp.re(s), 0) if abs(mp.im(s)) < abs(s) * mp.mpf(10) ** -25 else s)
            return sorted((s for s in out if mp.im(s) >= 0), key=lambda s: (abs(s), mp.re(s)))


class Scan:
    """One stage at many frequencies, in numpy."""

    def __init__(self, c):
        self.net, self.amps = Network(c), amplifiers(c)
        g, cap = self.net.stamp(float)
        n = self.net.size
        self.G, self.C = np.zeros((n, n)), np.zeros((n, n))
        for i, j, y in g:
            self.G[i, j] += y
        for i, j, y in cap:
            self.C[i, j] += y
        self.sources = self.net.sources()

    def matrices(self, f, dead=None):
        s = 2j * np.pi * np.asarray(f)[:, None, None]
        m = self.G + s * self.C
        for k, amp in enumerate(self.amps):
            if k != dead:
                gain = open_loop(amp, s[:, 0, 0], float)
                for i, sign in self.net.difference(k):
                    m[:, self.net.branch["e", k], i] -= sign * gain
        return m

    def solve(self, f, rows, dead=None):
        rhs = np.zeros((self.net.size, 1), complex)
        for i, y in rows:
            rhs[i] += y
        return np.linalg.solve(self.matrices(f, dead), rhs)[..., 0]

    def transfer(self, f):
        net, f = self.net, np.asarray(f)
        rows = [(net.branch["s", i] if net.drive == "voltage" else net.at(f"s{i}"), weight) for i, weight in net.drives()[0]]
        h = self.solve(f, rows)[:, net.at("out")]
        return h * 2j * np.pi * f if net.drive == "charge" else h

    def return_ratio(self, f, k):
        x = self.solve(f, [(self.net.branch["e", k], 1.0)], dead=k)
        v = sum(sign * x[:, i] for i, sign in self.net.difference(k))
        return -open_loop(self.amps[k], 2j * np.pi * np.asarray(f), float) * v

    def noise(self, f):
        """Power densities at the output by source, [source, frequency]."""
        f = np.asarray(f)
        rhs = np.zeros((self.net.size, 1))
        rhs[self.net.at("out")] = 1
        adjoint = np.linalg.solve(self.matrices(f).transpose(0, 2, 1), rhs)[..., 0]
        pick = lambda i: 0 if i is None else adjoint[:, i]
        rows = []
        for _, a, b, k, density in self.sources:
            h = pick(a) - pick(b) if k is None else adjoint[:, self.net.branch["e", k]] * open_loop(self.amps[k], 2j * np.pi * f, float)
            rows.append(np.abs(h + 0 * f) ** 2 * density(f))
        return np.array(rows)


# ------------------------------------------------------------------ figures
def top(function, f):
    """Where a function is greatest near its greatest sample."""
    k = int(function(f).argmax())
    if k in (0, len(f) - 1):
        return float(f[k]), k
    a, b = math.log(f[k - 1]), math.log(f[k + 1])
    for _ in range(8):
        x = np.linspace(a, b, 33)
        i = min(max(int(function(np.exp(x)).argmax()), 1), 31)
        a, b = x[i - 1], x[i + 1]
    return math.exp((a + b) / 2), k


def reference(c):
    """Where the kind takes its gain (a definition, not a result): None at DC, "peak", or Hz; and the gain's sign there."""
    v = {**dict.fromkeys(["Rf", "Rg"], 0.0), **c["components"]}
    gbw, tau = c["amplifiers"][0]["gbw"], 2 * math.pi
    kind = c["kind"]
    if kind in ("differentiator", "multiple-feedback-band-pass"):
        return "peak", -1
    if kind == "integrator" and not v["Rf"]:
        return 1 / (tau * v["Rin"] * v["Cf"]), -1
    if kind == "charge":
        high = gbw * v["Cf"] / (v["Cf"] + ((c["sources"] + [None])[0] or {}).get("capacitance", 0.0))
        low = 1 / (tau * v["Rf"] * v["Cf"]) if v["Rf"] else high / 1e6
        return math.sqrt(low * high), -1
    if kind == "ac-inverting":
        return math.sqrt(gbw / (1 + v["Rf"] / v["Rin"]) / (tau * v["Rin"] * v["Cin"])), -1
    if kind == "ac-non-inverting":
        low = max(1 / (tau * v["Rb"] * v["Cin"]), 1 / (tau * v["Rg"] * v["Cg"]))
        return math.sqrt(low * gbw / (1 + v["Rf"] / v["Rg"])), 1
    if kind == "sallen-key-high-pass":
        f0 = 1 / (tau * math.sqrt(v["R1"] * v["R2"] * v["C1"] * v["C2"]))
        return math.sqrt(f0 * gbw / (1 + v["Rf"] / v["Rg"] if v["Rg"] else 1.0)), 1
    return None, 0


def show(x):
    return float(mp.nstr(x, DIGITS)) if isinstance(x, mp.mpf) else float(f"{float(x):.{DIGITS - 1}e}")


def loops(c, exact, scan, grid):
    """Every amplifier's crossings (Hz, angle of -T), real negative values (Hz, |T|), greatest |1/(1 + T)|."""
    out = []
    for k in range(len(exact.amps)):
        ratio = lambda f: exact.return_ratio(f, k)
        t = scan.return_ratio(grid, k)
        size = np.log(np.abs(t))
        crossings, turns = [], []
        for i in np.flatnonzero(np.sign(size[:-1]) != np.sign(size[1:])):
            f = root(lambda f: mp.log(abs(ratio(f))), grid[i], grid[i + 1])
            crossings.append([show(f), show(mp.arg(-ratio(f)))])
        for i in np.flatnonzero((np.sign(t.imag[:-1]) != np.sign(t.imag[1:])) & (t.real[:-1] < 0) & (t.real[1:] < 0)):
            if abs(t[i]) < 1e-9 and mp.sign(mp.im(ratio(grid[i]))) == mp.sign(mp.im(ratio(grid[i + 1]))):
                continue  # so far down a sign may be the rounding of double precision
            f = root(lambda f: mp.im(ratio(f)) / abs(ratio(f)), grid[i], grid[i + 1])
            turns.append([show(f), show(abs(ratio(f)))])
        f, _ = top(lambda f: np.abs(1 / (1 + scan.return_ratio(f, k))), grid)
        # At infinite frequency the return ratio ends: the peak is never below one.
        ends = [mp.mpf(1), abs(1 / (1 + ratio(f))), abs(1 / (1 + ratio(0)))]
        out.append({"crossings": crossings, "turns": turns, "sensitivity_peak": show(max(ends))})
    return out


def solve(c, poles=None):
    exact, scan = Exact(c), Scan(c)
    poles = poles or exact.poles()
    if poles is None:
        return {"no_dc_path": True}
    stable = all(mp.re(s) < 0 for s in poles)
    tau = 2 * math.pi
    corner = [float(abs(s)) / tau for s in poles]
    breaks = set(corner)
    for amp in exact.amps:
        breaks |= {*amp["higher_poles"], *(z[0] for z in amp["zeros"]), amp["gbw"], amp["gbw"] / amp["open_loop"]}
    at, sign = reference(c)
    breaks = sorted(breaks | ({at} if isinstance(at, float) else set()))
    low, high = 1e-3 * breaks[0], 1e4 * breaks[-1]
    grid = np.exp(np.arange(math.log(low), math.log(high), math.log(10) / 120))
    near = [f * (1 + k * d) for s, f in zip(poles, corner) for d in [max(1e-9, float(-mp.re(s) / abs(s)))] for k in (-3, -1, -0.3, 0, 0.3, 1, 3) if abs(d) < 0.3 and f * (1 + k * d) > 0]
    grid = np.unique(np.concatenate([grid, near]))
    out = {"stable": stable, "poles": [[show(mp.re(s)), show(mp.im(s))] for s in poles], "loops": loops(c, exact, scan, grid)}
    if not stable:
        return out

    frequencies, f = c["frequencies"], c["signal_frequency"]
    response = [[exact.transfer(f, drive) for f in frequencies] for drive in range(len(exact.net.drives()))]
    out["response"] = [[[show(mp.re(h)), show(mp.im(h))] for h in row] for row in response]
    quick = scan.transfer(frequencies)
    most = np.abs(scan.transfer(grid)).max()
    assert all(abs(complex(h) - q) < 1e-9 * abs(complex(h)) + 1e-12 * most for h, q in zip(response[0], quick)), (c["id"], response[0], quick)
    out["noise_sources"], out["noise_density"] = [s[0] for s in scan.sources], []
    for f0 in frequencies:
        density = exact.noise(f0)
        out["noise_density"].append([show(mp.sqrt(sum(density))), [show(mp.sqrt(y)) for y in density]])
        assert all(abs(a - b) <= 1e-8 * a + 1e-12 * sum(density) for a, b in zip(density, scan.noise([f0])[:, 0])), (c["id"], f0)
    behind = Exact(c, open_input=True)
    try:
        out["input_impedance"] = show(behind.impedance(f, "t0"))
    except ZeroDivisionError:
        out["input_impedance"] = None  # nothing leads from the input anywhere: unlimited
    out["output_impedance"] = show(Exact(c, load=False).impedance(f, "out"))

    out["output_offset"] = [show(x) for x in exact.offset()]

    # Against the gain.
    size = lambda f: np.abs(scan.transfer(f))
    if at == "peak":
        at, k = top(size, grid)
        assert 0 < k < len(grid) - 1, c["id"]
        gain = sign * abs(exact.transfer(at))
    elif at is None:
        gain, at = mp.re(exact.transfer(0)), 0.0
    else:
        gain = sign * abs(exact.transfer(at))
    if abs(gain) < 1e-12 * most:
        return out
    g0 = abs(gain)
    out["gain"], out["gain_at_signal"] = show(gain), show(mp.sign(gain) * abs(exact.transfer(f)))
    half = lambda f: mp.log(abs(exact.transfer(f)) / g0) + mp.log(2) / 2
    points = np.unique(np.append(grid, at)) if at else grid
    points = points[points > 0]
    h = size(points) / float(g0)
    up, down = np.flatnonzero(points >= at), np.flatnonzero(points <= at)[::-1]
    for name, path in (("bandwidth", up), ("low_cutoff", down)):
        below = [(i, j) for i, j in zip(path[:-1], path[1:]) if h[j] < math.sqrt(0.5)]
        if below:
            i, j = below[0]
            out[name] = show(root(half, min(points[i], points[j]), max(points[i], points[j])))
    best, k = top(size, grid)
    if k < len(grid) - 1:
        out["peaking"] = show(max(abs(exact.transfer(best)), abs(exact.transfer(0)), g0) / g0)
    pairs = [s for s in poles if mp.im(s) > 0]
    if pairs:
        least = min(pairs, key=lambda s: -mp.re(s) / abs(s))
        out["natural_frequency"], out["q"] = show(abs(least) / (2 * mp.pi)), show(abs(least) / (-2 * mp.re(least)))

    power = integral(scan.noise, *c["band"], breaks)
    out["output_noise"] = show(math.sqrt(power.sum()))
    out["output_noise_by_source"] = [show(math.sqrt(y)) for y in power]
    # The bandwidth of noise: below `far_low` the transfer is that of DC, above `far_high` it falls as a power of f.
    far_low, far_high = 1e-7 * breaks[0], 1e6 * breaks[-1]
    ends = [abs(exact.transfer(far_high)), abs(exact.transfer(10 * far_high))]
    order = round(float(mp.log10(ends[0] / ends[1])))
    # However little a resistance lets through, it does so at any frequency: then the area has no bound.
    with mp.workdps(150):
        last = mp.log10(abs(exact.transfer(mp.mpf(10) ** 60)) / abs(exact.transfer(mp.mpf(10) ** 61)))
    if last > 0.99:
        body = integral(lambda f: (size(f) ** 2)[None, :] / float(g0) ** 2, far_low, far_high, breaks)[0]
        edges = far_low * float((abs(exact.transfer(0)) / g0) ** 2) + float((ends[0] / g0) ** 2) * far_high / (2 * order - 1)
        out["noise_bandwidth"] = show(body + edges)
    return out


# ------------------------------------------------------------------ the table
def table(seed=SEED, count=7):
    for c in hard():
        yield {"circuit": c, "expected": solve(c)}
    draw, k = random.Random(seed), 0
    for kind in KINDS:
        kept, unstable = 0, 0
        while kept < count:
            c = random_circuit(draw, kind, k)
            k += 1
            poles = Exact(c).poles()
            if poles is None:
                continue
            margin = min(float(-mp.re(s) / abs(s)) for s in poles)
            if abs(margin) < 1e-4 or margin < 0 and unstable >= 1:
                continue  # on the verge nobody can tell; one that oscillates is enough
            unstable += margin < 0
            kept += 1
            yield {"circuit": c, "expected": solve(c, poles)}


def main():
    if len(sys.argv) < 2 or sys.argv[1] not in ("write", "check"):
        sys.exit(__doc__)
    name = sys.argv[2] if len(sys.argv) > 2 else os.path.join(os.path.dirname(os.path.abspath(__file__)), "oracle_kinds.json")
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
