"""The circuits that oracle_kinds.py solves: cases that break methods which random values do not, and random valid ones."""
import math

from oracle_circuits import amplifier

KINDS = ["summing", "difference", "instrumentation", "transimpedance", "charge", "integrator", "differentiator", "scale-and-shift",
         "ac-non-inverting", "ac-inverting", "sallen-key-low-pass", "sallen-key-high-pass", "multiple-feedback-low-pass",
         "multiple-feedback-band-pass"]


def circuit(id, kind, components, *amplifiers, **given):
    base = dict(isolation="outside", sources=[], reference=None, load={}, board={}, temperature=300.0, band=[1.0, 1e6],
                frequencies=[1.0, 1e3, 1e6], signal_frequency=1e3, signal_dc=0.0,
                offset=[1e-3, 1e-9, 1e-10])
    assert set(given) <= set(base)
    return {"id": id, "kind": kind, "components": components, "amplifiers": list(amplifiers), **base, **given}


def hard():
    """Cases that break methods which random values do not."""
    real = dict(higher_poles=[2.5e7], output_resistance=60.0, differential_capacitance=3e-12, common_mode_capacitance=2e-12)
    good = amplifier(**real)
    fet = amplifier(current_noise=1e-15, open_loop=1e6, gbw=8e7, higher_poles=[2.4e8], output_resistance=30.0, differential_capacitance=2e-12,
                    common_mode_capacitance=3e-12, differential_resistance=1e12, common_mode_resistance=1e12)
    slow = amplifier(open_loop=4e5, gbw=1e6, higher_poles=[3.1e6], output_resistance=850.0, differential_capacitance=2e-12, common_mode_capacitance=4e-12)
    diode = lambda c, rsh=None, dark=0.0: {"capacitance": c, "shunt_resistance": rsh, "dark_current": dark}

    yield circuit("summing-eight", "summing", {f"Rin{i}": 1e3 * 3**i for i in range(1, 9)} | {"Rf": 4.7e4, "Cf": 1e-11, "Rp": 470.0}, good)
    yield circuit("summing-thousandth", "summing", {"Rin1": 1e6, "Rin2": 3e6, "Rf": 1e3}, good)
    yield circuit("summing-hundred-thousand", "summing", {"Rin1": 10.0, "Rin2": 1e7, "Rf": 1e6}, amplifier(open_loop=1e8, **real), band=[0.1, 1e5])
    yield circuit("summing-gigaohm-source", "summing", {"Rin1": 1e4, "Rin2": 1e4, "Rf": 1e5}, fet, sources=[{"resistance": 2e9}, {"capacitance": 2e-12}])
    yield circuit("difference-balanced-to-a-billionth", "difference", {"R1": 1e4, "R2": 1e5, "R3": 1e4, "R4": 1e5 * (1 + 1e-9)}, good)
    yield circuit("difference-thousandth", "difference", {"R1": 1e6, "R2": 1e3, "R3": 1e6, "R4": 1e3}, good)
    yield circuit("difference-hundred-thousand", "difference", {"R1": 10.0, "R2": 1e6, "R3": 10.0, "R4": 1e6}, amplifier(open_loop=1e8, **real), band=[0.1, 1e5])
    yield circuit("difference-gigaohm-sources", "difference", {"R1": 1e4, "R2": 2.2e4, "R3": 1e4, "R4": 2.2e4, "C2": 1e-11, "C4": 1.1e-11}, fet,
                  sources=[{"resistance": 1e9}, {"resistance": 1.1e9}], board={"non_inverting_node": 3e-12})
    yield circuit("difference-band-far-above", "difference", {"R1": 1e4, "R2": 1e4, "R3": 1e4, "R4": 1e4}, slow, band=[1e9, 1e11])
    three = {"Rg": 560.0, "Rf1": 13e3, "Rf2": 13e3, "R1": 2e4, "R2": 2e4, "R3": 2e4, "R4": 2e4}
    yield circuit("instrumentation-bridge", "instrumentation", three, good, sources=[{"resistance": 350.0}, {"resistance": 350.0}])
    yield circuit("instrumentation-three-parts", "instrumentation", three | {"R4": 2.002e4, "Riso": 47.0, "C2": 1e-11, "C4": 1e-11}, good, fet, slow,
                  isolation="inside", load={"capacitance": 1e-9, "resistance": 1e4}, board={"inverting_node": 3e-12, "across_feedback": 5e-13})
    yield circuit("instrumentation-hundred-thousand", "instrumentation", three | {"Rg": 2.6, "R2": 2e5, "R4": 2e5}, good, band=[0.01, 10.0])
    yield circuit("instrumentation-thousandth", "instrumentation", three | {"Rg": 1e9, "R1": 1e6, "R2": 1e3, "R3": 1e6, "R4": 1e3}, good)
    yield circuit("instrumentation-gigaohm-sources", "instrumentation", three, fet, sources=[{"resistance": 1e9}, {"resistance": 3e9}], board={"non_inverting_node": 2e-12})
    yield circuit("transimpedance-nanofarads", "transimpedance", {"Rf": 1e6, "Cf": 3e-12}, fet, sources=[diode(4.7e-9, 1e8, 2e-9)], signal_dc=1e-6)
    yield circuit("transimpedance-picoampere", "transimpedance", {"Rf": 1e10, "Cf": 1e-13, "Rp": 1e10, "Cp": 1e-8}, fet, sources=[diode(1e-11, 1e11, 1e-12)], band=[0.01, 1e3])
    yield circuit("transimpedance-bare", "transimpedance", {"Rf": 5.1e4}, good, sources=[diode(1.2e-10)])
    yield circuit("transimpedance-no-source", "transimpedance", {"Rf": 1e3}, good)
    yield circuit("transimpedance-behind-resistance", "transimpedance", {"Rf": 1e5, "Cf": 1e-12, "Riso": 30.0}, good, isolation="inside",
                  sources=[{"resistance": 2e5}], load={"capacitance": 1e-9})
    yield circuit("charge-hydrophone", "charge", {"Cf": 1e-9, "Rf": 1e9, "Rser": 1e3}, fet, sources=[{"capacitance": 1e-8}], band=[0.1, 1e5])
    yield circuit("charge-no-path", "charge", {"Cf": 1e-9}, good, sources=[{"capacitance": 1e-9}])
    yield circuit("charge-leak-alone", "charge", {"Cf": 1e-12}, fet, sources=[{"capacitance": 1e-10}])
    yield circuit("charge-band-far-below", "charge", {"Cf": 1e-10, "Rf": 1e6}, good, sources=[{"capacitance": 1e-9}], band=[1e-6, 1e-4], frequencies=[1e-4, 1e2, 1e5])
    yield circuit("integrator-no-resistor", "integrator", {"Rin": 1e4, "Cf": 1e-8}, good, frequencies=[1e-3, 1e2, 1e6])
    yield circuit("integrator-hundred-thousand", "integrator", {"Rin": 1e3, "Cf": 1e-8, "Rf": 1e8}, amplifier(open_loop=1e8, **real), frequencies=[1e-3, 1e2, 1e6])
    yield circuit("differentiator-bare", "differentiator", {"Rf": 1.5e4, "Cin": 1e-8}, amplifier(open_loop=1e5, gbw=6e6))
    yield circuit("differentiator-both", "differentiator", {"Rf": 9.1e3, "Cin": 2.2e-8, "Rin": 360.0, "Cf": 5.6e-10}, good, load={"capacitance": 1e-10})
    yield circuit("scale-and-shift-near-cancelling-pair", "scale-and-shift", {"R1": 1e4, "R2": 1e4, "Rf": 1e5, "Rg": 1e4, "Cf": 1.1e-11, "Cshunt": 1e-12},
                  amplifier(common_mode_capacitance=1e-12, differential_capacitance=1e-13, output_resistance=100.0), board={"inverting_node": 1.0889e-10}, reference=10.0)
    yield circuit("scale-and-shift-thousandth", "scale-and-shift", {"R1": 1e7, "R2": 1e4, "Rf": 1.0, "Rg": 1e5}, good)
    yield circuit("ac-non-inverting-no-rb-to-speak-of", "ac-non-inverting", {"Cin": 1e-6, "Rb1": 1e5, "Rb2": 1e5, "Rb": 1.0, "Cb": 1e-5, "Rf": 9e4, "Rg": 1e4, "Cg": 1e-5}, good)
    yield circuit("ac-inverting-decades", "ac-inverting", {"Cin": 1e-4, "Rin": 1e5, "Rf": 1e6, "Rb1": 1e6, "Rb2": 1e6, "Cb": 1e-4}, good, frequencies=[1e-3, 1.0, 1e5])
    yield circuit("sallen-key-low-pass-feed-through", "sallen-key-low-pass", {"R1": 8.2e3, "R2": 8.2e3, "C1": 2.2e-9, "C2": 1e-9}, slow, frequencies=[10.0, 1e4, 1e7])
    yield circuit("sallen-key-low-pass-q-30", "sallen-key-low-pass", {"R1": 1e4, "R2": 1e4, "C1": 1e-9, "C2": 1e-9, "Rf": 1.96e4, "Rg": 1e4}, good)
    yield circuit("sallen-key-high-pass-q-20", "sallen-key-high-pass", {"R1": 1e3, "R2": 1.6e6, "C1": 1e-9, "C2": 1e-9}, good)
    yield circuit("sallen-key-high-pass-gain", "sallen-key-high-pass", {"R1": 1e4, "R2": 1e4, "C1": 1e-8, "C2": 1e-8, "Rf": 1e4, "Rg": 2e4, "Riso": 50.0}, slow, isolation="inside")
    yield circuit("multiple-feedback-low-pass-plain", "multiple-feedback-low-pass", {"R1": 3.9e3, "R2": 8.45e3, "R3": 2.7e3, "C1": 1.5e-8, "C2": 2.2e-9, "Rp": 5.4e3}, slow)
    yield circuit("multiple-feedback-band-pass-q-20", "multiple-feedback-band-pass", {"R1": 2e4, "R2": 50.0, "R3": 8e4, "C1": 1e-8, "C2": 1e-8}, good)
    yield circuit("multiple-feedback-band-pass-no-r2", "multiple-feedback-band-pass", {"R1": 1e3, "R3": 1e5, "C1": 1e-8, "C2": 1.1e-8}, good)
    equal = {"R1": 1e4, "R2": 1e4, "R3": 1e4, "R4": 1e4}
    yield circuit("summing-eight-sources", "summing", {f"Rin{i}": 1e4 for i in range(1, 9)} | {"Rf": 1e4, "Rp": 1e3, "Riso": 50.0}, good,
                  sources=[{"resistance": 50.0 + i} for i in range(8)])
    yield circuit("summing-three-near-cancelling", "summing", {"Rin1": 1e4, "Rin2": 1e4, "Rf": 1e4, "Cf": 1e-9, "Rng": 1e4, "Cng": 1.0000001e-9, "Rsn": 1e4, "Csn": 1e-9}, good)
    yield circuit("difference-balanced-with-capacitors", "difference", equal | {"C2": 1e-10, "C4": 1e-10}, good, frequencies=[1.0, 1e3, 1e5])
    yield circuit("instrumentation-one-source-capacitive", "instrumentation", equal | {"Rg": 1e3, "Rf1": 1e4, "Rf2": 1e4},
                  amplifier(common_mode_resistance=1e9, **real), sources=[{"capacitance": 1e-9}, {"resistance": 1e3}])
    yield circuit("transimpedance-teraohm", "transimpedance", {"Rf": 1e12, "Cf": 1e-15}, good, sources=[diode(1e-7, 1e6, 1e-6)])
    yield circuit("charge-femtofarad", "charge", {"Cf": 1e-15, "Rf": 1e12}, good, sources=[{"capacitance": 1e-6}])
    yield circuit("integrator-hours", "integrator", {"Rin": 1e9, "Cf": 1e-6}, good, band=[1e-9, 1e-7], frequencies=[1e-8, 1.0, 1e6])
    yield circuit("sallen-key-high-pass-q-200", "sallen-key-high-pass", {"R1": 10.0, "R2": 1.6e6, "C1": 1e-9, "C2": 1e-9}, amplifier(open_loop=1e8, gbw=1e9))
    yield circuit("multiple-feedback-band-pass-q-140", "multiple-feedback-band-pass", {"R1": 1e5, "R2": 12.5, "R3": 5e5, "C1": 1e-8, "C2": 1e-8}, good)
    # A zero at 1.7e21 Hz, where powers of the frequency overflow.
    yield circuit("instrumentation-far-zero", "instrumentation", {"R1": 1260.0, "R2": 14190.0, "R3": 1269.0, "R4": 14470.0, "Rf1": 14810.0, "Rf2": 15070.0, "Rg": 601.5},
                  amplifier(open_loop=4179000.0, gbw=64300000.0, higher_poles=[4608000000.0], output_resistance=19.83, differential_resistance=107600000000.0, common_mode_resistance=1164000000.0, common_mode_capacitance=2.916e-12, voltage_noise=6.22e-08, voltage_corner=9.448, exponent=1.2, current_noise=3.826e-13, current_corner=73.87),
                  sources=[{'resistance': 30.87}, {'resistance': 165.7}],
                  load={'resistance': 1047.0},
                  board={'inverting_node': 8.463e-12, 'non_inverting_node': 1.89e-12},
                  band=[1.729, 8681.0],
                  frequencies=[13.82, 97410.0, 30290000.0],
                  signal_frequency=418.2,
                  temperature=298.15)
    # The first amplifier lifts the second's return ratio above one again, between 31.8 and 33.6 MHz.
    yield circuit("instrumentation-narrow-crossings", "instrumentation", {"R1": 3158.0, "R2": 32180.0, "R3": 3190.0, "R4": 32510.0, "Rf1": 1705.0, "Rf2": 1664.0, "Rg": 14.21, "C2": 4.282e-13, "C4": 4.613e-13},
                  amplifier(open_loop=97950.0, gbw=172200000.0, higher_poles=[1508000000.0], output_resistance=106.0, differential_resistance=6579000.0, common_mode_resistance=190600000000.0, differential_capacitance=8.483e-12, common_mode_capacitance=3.704e-12, voltage_noise=1.535e-08, voltage_corner=1001.0, current_noise=7.375e-12, current_corner=0.1715),
                  amplifier(open_loop=45380.0, gbw=61770000.0, higher_poles=[145500000.0], differential_resistance=179900000.0, common_mode_capacitance=3.534e-13, voltage_noise=1.254e-08, voltage_corner=3353.0, exponent=1.2, current_noise=3.193e-16, current_corner=1862.0),
                  amplifier(open_loop=46070.0, gbw=1579000000.0, higher_poles=[5647000000.0, 111600000000.0], differential_resistance=1765000000.0, differential_capacitance=1.801e-12, voltage_noise=1.199e-08, voltage_corner=0.4992, current_noise=1.094e-14, current_corner=1252.0),
                  sources=[None, {'resistance': 654.7}],
                  load={'resistance': 14090.0},
                  band=[9.925, 647500.0],
                  frequencies=[96.45, 581300.0, 14260000.0],
                  signal_frequency=171500.0,
                  temperature=298.15)


def random_circuit(draw, kind, k):
    def log(low, high):
        return float(f"{10 ** draw.uniform(math.log10(low), math.log10(high)):.4g}")

    def short(x):
        return float(f"{x:.4g}")

    def maybe(chance, low, high):
        return log(low, high) if draw.random() < chance else None

    comp, gbw, tau = {}, log(1e5, 3e8), 2 * math.pi

    def add(chance, **parts):
        if draw.random() < chance:
            for name, value in parts.items():
                comp[name] = log(*value) if isinstance(value, tuple) else short(value)

    def across(ohms):
        """A capacitor across a feedback resistor with its corner some decades below the amplifier's."""
        return min(1e-7, max(2e-13, 1 / (tau * ohms * gbw * log(1e-3, 0.3))))

    sources = [draw.choice([None, {"resistance": log(1, 1e6)}, {"resistance": log(10, 1e3)}]) for _ in range(2)]
    capacitive = [draw.choice([s, s, {"capacitance": log(1e-11, 1e-6)}]) for s in sources]
    signal_dc = 0.0
    f0 = gbw * log(1e-4, 1e-2)
    r = log(1e2, 1e5)
    scale = 1 / (tau * f0 * r)
    if kind == "summing":
        for i in range(1, draw.randint(2, 5) + 1):
            comp[f"Rin{i}"] = log(300, 1e6)
        comp["Rf"] = short(comp["Rin1"] * log(0.05, 50))
        add(0.5, Cf=across(comp["Rf"]))
        sources = capacitive
    elif kind in ("difference", "instrumentation"):
        comp["R1"] = log(300, 1e5)
        comp["R2"] = short(comp["R1"] * log(0.05, 100))
        comp["R3"], comp["R4"] = (short(comp[x] * draw.uniform(0.97, 1.03)) for x in ("R1", "R2"))
        if kind == "instrumentation":
            comp["Rf1"] = log(1e3, 1e5)
            comp["Rf2"] = short(comp["Rf1"] * draw.uniform(0.97, 1.03))
            comp["Rg"] = short(comp["Rf1"] / log(0.3, 300))
        else:
            sources = capacitive
        if draw.random() < 0.5:
            comp["C2"] = short(across(comp["R2"]))
            comp["C4"] = short(comp["C2"] * draw.uniform(0.9, 1.1))
    elif kind == "transimpedance":
        comp["Rf"] = log(1e3, 1e9)
        junction = log(1e-12, 1e-8)
        sources = [draw.choice([{"capacitance": junction, "shunt_resistance": log(1e6, 1e11), "dark_current": log(1e-12, 1e-7)},
                                {"capacitance": junction, "shunt_resistance": None, "dark_current": 0.0}, {"capacitance": junction},
                                {"resistance": comp["Rf"]}])]
        signal_dc = draw.choice([0.0, log(1e-9, 1e-5), -log(1e-9, 1e-5)])
        add(0.9, Cf=math.sqrt(junction / (tau * comp["Rf"] * gbw)) * log(0.5, 3))
    elif kind == "charge":
        comp["Cf"] = log(1e-12, 1e-8)
        comp["Rf"] = log(1e6, 1e10)
        add(0.4, Rser=(10, 1e4))
        sources = [draw.choice([None, {"capacitance": short(comp["Cf"] * log(0.3, 100))}, {"resistance": log(1e5, 1e9)}])]
    elif kind == "integrator":
        comp["Rin"], comp["Cf"] = r, short(scale)
        add(0.7, Rf=r * log(3, 1e4))
        sources = capacitive if "Rf" in comp else sources
    elif kind == "differentiator":
        comp["Rf"], comp["Cin"] = r, short(scale)
        add(0.8, Rin=r * math.sqrt(f0 / gbw) * log(0.5, 3))
        add(0.6, Cf=scale * math.sqrt(f0 / gbw) * log(0.3, 3))
    elif kind == "scale-and-shift":
        comp["R1"], comp["R2"], comp["Rg"] = log(300, 1e6), log(300, 1e6), log(100, 1e5)
        comp["Rf"] = short(comp["Rg"] * log(0.05, 100))
        add(0.5, Cf=across(comp["Rf"]))
        add(0.5, Cshunt=(1e-12, 1e-8))
        sources = capacitive
    elif kind in ("ac-non-inverting", "ac-inverting"):
        comp["Rb1"], comp["Rb2"], comp["Cin"] = log(1e4, 1e6), log(1e4, 1e6), log(1e-9, 1e-5)
        add(0.7, Cb=(1e-8, 1e-4))
        if kind == "ac-inverting":
            comp["Rin"] = log(300, 1e5)
            comp["Rf"] = short(comp["Rin"] * log(0.1, 100))
        else:
            comp["Rb"], comp["Rg"], comp["Cg"] = log(1e4, 1e6), log(100, 1e5), log(1e-8, 1e-4)
            comp["Rf"] = short(comp["Rg"] * log(0.1, 100))
        add(0.5, Cf=across(comp["Rf"]))
    elif kind == "sallen-key-low-pass":
        comp["R1"], comp["R2"] = r, short(r * log(0.3, 3))
        if draw.random() < 0.5:
            comp["Rg"] = log(1e3, 1e5)
            comp["Rf"] = short(comp["Rg"] * draw.uniform(0.1, 1.2))
            comp["C1"], comp["C2"] = short(scale), short(scale * log(0.5, 2))
        else:
            comp["C1"], comp["C2"] = short(scale * log(1, 20)), short(scale)
    elif kind == "sallen-key-high-pass":
        comp["C1"], comp["C2"] = short(scale), short(scale * log(0.3, 3))
        if draw.random() < 0.5:
            comp["Rg"] = log(1e3, 1e5)
            comp["Rf"] = short(comp["Rg"] * draw.uniform(0.1, 1.2))
            comp["R1"], comp["R2"] = r, short(r * log(0.5, 2))
        else:
            comp["R1"], comp["R2"] = r, short(r * log(1, 20))
    elif kind == "multiple-feedback-low-pass":
        comp["R1"], comp["R2"], comp["R3"] = r, short(r * log(0.2, 10)), short(r * log(0.2, 3))
        comp["C1"], comp["C2"] = short(scale * log(1, 30)), short(scale * log(0.1, 1))
    else:
        comp["R1"], comp["R3"] = r, short(r * log(1, 100))
        add(0.7, R2=r * log(0.01, 1))
        comp["C1"], comp["C2"] = short(scale), short(scale * log(0.5, 2))
    if kind in ("summing", "transimpedance", "charge", "integrator", "differentiator", "multiple-feedback-low-pass", "multiple-feedback-band-pass"):
        add(0.4, Rp=(10, 1e6))
        if "Rp" in comp:
            add(0.5, Cp=(1e-12, 1e-7))
    if kind in ("summing", "difference", "scale-and-shift"):
        add(0.3, Rng=(10, 1e5), Cng=(1e-11, 1e-8))
    add(0.3, Riso=(5, 100))
    add(0.2, Rsn=(20, 500), Csn=(1e-10, 1e-8))

    def one(gbw):
        poles = sorted(short(gbw * log(1, 100)) for _ in range(draw.choice([0, 1, 1, 2])))
        zeros = [[short(gbw * log(1.5, 100)), draw.random() < 0.5]] if poles and draw.random() < 0.2 else []
        return amplifier(open_loop=log(1e4, 1e7), gbw=short(gbw), higher_poles=poles, zeros=zeros, output_resistance=maybe(0.8, 1, 500) or 0.0,
                         differential_resistance=maybe(0.6, 1e6, 1e12), common_mode_resistance=maybe(0.6, 1e8, 1e13),
                         differential_capacitance=maybe(0.7, 2e-13, 1e-11) or 0.0, common_mode_capacitance=maybe(0.7, 2e-13, 1e-11) or 0.0,
                         voltage_noise=log(8e-10, 1e-7), voltage_corner=log(0.1, 1e4), exponent=draw.choice([1.0, 1.0, 0.9, 1.2]),
                         current_noise=log(1e-16, 1e-11), current_corner=log(0.1, 1e4))

    amps = [one(gbw)]
    if kind == "instrumentation" and draw.random() < 0.5:
        amps += [one(gbw * log(0.3, 3)), one(gbw * log(0.3, 10))]
    board = {}
    for name, chance in (("inverting_node", 0.5), ("non_inverting_node", 0.3), ("across_feedback", 0.3)):
        value = maybe(chance, 1e-13, 1e-11)
        if value:
            board[name] = value
    load = {}
    for name, chance, low, high in (("resistance", 0.6, 300, 1e6), ("capacitance", 0.5, 1e-12, 1e-9)):
        value = maybe(chance, low, high)
        if value:
            load[name] = value
    low = log(0.01, 100)
    return circuit(f"{kind}-{k}", kind, comp, *amps, isolation=draw.choice(["outside", "inside"]) if "Riso" in comp else "outside",
                   sources=sources, reference=maybe(0.5, 0.1, 1e3) if kind == "scale-and-shift" else None, load=load, board=board,
                   temperature=draw.choice([250.0, 298.15, 358.15]), band=[low, short(low * log(10, 1e6))],
                   frequencies=sorted([log(1, 100), short(gbw * log(1e-4, 1e-2)), short(gbw * log(0.03, 1))]),
                   signal_frequency=short(gbw * log(1e-6, 0.1)), signal_dc=signal_dc)
