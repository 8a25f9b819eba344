"""The circuits that oracle.py solves: cases that break methods which random values do not, and random valid ones."""
import math

def amplifier(**given):
    base = dict(open_loop=1e6, gbw=1e7, higher_poles=[], zeros=[], output_resistance=0.0, differential_resistance=None,
                common_mode_resistance=None, differential_capacitance=0.0, common_mode_capacitance=0.0, voltage_noise=5e-9,
                voltage_corner=30.0, exponent=1.0, current_noise=1e-12, current_corner=100.0)
    assert set(given) <= set(base)
    return {**base, **given}


def circuit(id, kind, components, amp, **given):
    base = dict(isolation="outside", source=None, load={}, board={}, temperature=300.0, band=[1.0, 1e6],
                frequencies=[1.0, 1e3, 1e5, 1e7], signal_frequency=1e3)
    assert set(given) <= set(base)
    return {"id": id, "kind": kind, "components": components, "amplifier": amp, **base, **given}


def hard():
    """Cases that break methods which random values do not."""
    real = dict(higher_poles=[2.5e7], output_resistance=60.0, differential_capacitance=3e-12, common_mode_capacitance=2e-12)
    for k, farads in enumerate([1e-12, 1e-11, 1e-10, 1e-9, 1e-8, 1e-7, 1e-6]):
        yield circuit(f"follower-load-{k}", "follower", {}, amplifier(**real), load={"capacitance": farads})
        yield circuit(f"follower-load-isolated-{k}", "follower", {"Riso": 47.0}, amplifier(**real), load={"capacitance": farads, "resistance": 1e4})
    yield circuit("gigaohm-source", "follower", {}, amplifier(current_noise=1e-15, **real), source={"resistance": 2e9}, band=[0.1, 1e4], frequencies=[0.1, 20.0, 1e3, 1e6])
    yield circuit("gigaohm-source-leaky", "non-inverting", {"Rf": 1e6, "Rg": 1e4, "Cf": 1e-12, "Rser": 1e5},
                  amplifier(current_noise=1e-15, differential_resistance=1e12, common_mode_resistance=1e11, **real), source={"resistance": 1e9},
                  board={"non_inverting_node": 3e-12, "inverting_node": 2e-12}, band=[0.1, 1e4], frequencies=[0.1, 20.0, 1e3, 1e6])
    yield circuit("inverting-thousandth", "inverting", {"Rin": 1e6, "Rf": 1e3}, amplifier(**real))
    yield circuit("inverting-hundred-thousand", "inverting", {"Rin": 10.0, "Rf": 1e6}, amplifier(open_loop=1e7, **real), frequencies=[0.1, 10.0, 1e3, 1e5], band=[0.1, 1e5])
    yield circuit("inverting-gain-near-open-loop", "inverting", {"Rin": 100.0, "Rf": 1e6, "Rp": 100.0}, amplifier(open_loop=2e3, gbw=1e6))
    yield circuit("non-inverting-gain-one-and-a-bit", "non-inverting", {"Rf": 1.0, "Rg": 1e6}, amplifier(**real))
    yield circuit("low-open-loop", "non-inverting", {"Rf": 9e3, "Rg": 1e3}, amplifier(open_loop=10.0, gbw=1e5))
    # Two lags and two leads inside the loop's gain: the phase passes -180 degrees and returns.
    yield circuit("conditional", "non-inverting", {"Rf": 9e3, "Rg": 1e3},
                  amplifier(open_loop=1e10, gbw=1e12, higher_poles=[1e3, 1e3, 3e8], zeros=[[1e5, False], [1e5, False]]), frequencies=[1.0, 1e4, 1e6, 1e7])
    # The same with too little gain: oscillates.
    yield circuit("conditional-starved", "non-inverting", {"Rf": 9e3, "Rg": 1e3},
                  amplifier(open_loop=1e7, gbw=1e9, higher_poles=[1e3, 1e3, 3e8], zeros=[[1e5, False], [1e5, False]]), frequencies=[1.0, 1e4, 1e6, 1e7])
    yield circuit("three-crossings", "follower", {},
                  amplifier(open_loop=1e5, gbw=1e6, higher_poles=[5e7, 5e7, 2e8], zeros=[[3e6, False], [3e6, False]]), frequencies=[1.0, 1e4, 1e6, 1e7])
    yield circuit("near-cancelling-pair", "follower", {}, amplifier(higher_poles=[1.0001e5, 3e7], zeros=[[1e5, False]]))
    yield circuit("far-cancelling-pair", "non-inverting", {"Rf": 1e5, "Rg": 1e4, "Cf": 1.1e-11},
                  amplifier(common_mode_capacitance=1e-12, differential_capacitance=1e-13, output_resistance=100.0), board={"inverting_node": 1.0889e-10})
    yield circuit("right-half-plane-zero", "non-inverting", {"Rf": 4e3, "Rg": 1e3}, amplifier(higher_poles=[3e7], zeros=[[2e7, True]]))
    yield circuit("high-q", "non-inverting", {"Rf": 1e6, "Rg": 1e6}, amplifier(), board={"inverting_node": 5e-11})
    yield circuit("very-high-q", "inverting", {"Rin": 1e7, "Rf": 1e7}, amplifier(open_loop=1e8, gbw=1e8), board={"inverting_node": 1e-10})
    yield circuit("double-pole", "follower", {}, amplifier(open_loop=1e9, gbw=1e6, higher_poles=[4e6]))
    yield circuit("triple-pole", "follower", {"Cshunt": 1 / (2 * math.pi * 1e5 * 1e3), "Riso": 1e3}, amplifier(open_loop=1e12, gbw=1e5), source={"resistance": 1e3},
                  load={"capacitance": 1 / (2 * math.pi * 1e5 * 1e3)})
    yield circuit("flicker-exponent", "non-inverting", {"Rf": 9e3, "Rg": 1e3}, amplifier(exponent=0.8, voltage_corner=1e4, **real), band=[0.1, 1e5])
    yield circuit("flicker-exponent-steep", "inverting", {"Rin": 1e3, "Rf": 9e3}, amplifier(exponent=1.35, voltage_corner=1e3, **real), band=[0.01, 1e5])
    yield circuit("flicker-alone", "follower", {}, amplifier(voltage_noise=1e-12, voltage_corner=1e9, current_noise=0.0), band=[0.001, 1e7])
    yield circuit("inside", "non-inverting", {"Rf": 47e3, "Rg": 18e3, "Cf": 8.2e-11, "Riso": 68.0}, amplifier(**real), isolation="inside", load={"resistance": 5.1e3, "capacitance": 1e-8})
    yield circuit("inside-inverting", "inverting", {"Rin": 1e4, "Rf": 1e5, "Cf": 3.3e-11, "Riso": 33.0}, amplifier(**real), isolation="inside", load={"resistance": 2e3, "capacitance": 4.7e-8})
    yield circuit("inside-follower", "follower", {"Rf": 1e4, "Cf": 1e-10, "Riso": 100.0}, amplifier(**real), isolation="inside", load={"capacitance": 1e-8})
    yield circuit("inside-follower-no-resistor", "follower", {"Riso": 10.0}, amplifier(**real), isolation="inside", load={"capacitance": 1e-10})
    yield circuit("snubber", "follower", {"Rsn": 30.0, "Csn": 1e-8}, amplifier(**real), load={"capacitance": 2e-9})
    yield circuit("noise-gain-network", "inverting", {"Rin": 1e4, "Rf": 1e4, "Rng": 1e3, "Cng": 1e-8}, amplifier(**real))
    yield circuit("noise-gain-network-balanced", "inverting", {"Rin": 1e4, "Rf": 1e4, "Rp": 5e3, "Cp": 1e-9, "Rng": 1e3, "Cng": 1e-8}, amplifier(**real))
    yield circuit("noise-gain-follower", "follower", {"Rf": 1e4, "Rng": 1e3, "Cng": 1e-9}, amplifier(**real), source={"resistance": 50.0})
    yield circuit("capacitive-source", "non-inverting", {"Rf": 9e3, "Rg": 1e3}, amplifier(common_mode_resistance=1e9, **real), source={"capacitance": 1e-10})
    yield circuit("capacitive-source-inverting", "inverting", {"Rin": 1e3, "Rf": 1e5, "Cf": 1e-11}, amplifier(**real), source={"capacitance": 1e-8})


def random_circuit(draw, k):
    def log(low, high):
        return float(f"{10 ** draw.uniform(math.log10(low), math.log10(high)):.4g}")

    def maybe(chance, low, high):
        return log(low, high) if draw.random() < chance else None

    kind = draw.choice(["follower", "non-inverting", "inverting"])
    components, board, load = {}, {}, {}
    if kind == "inverting":
        components["Rin"] = log(100, 1e6)
        components["Rf"] = float(f"{components['Rin'] * log(0.05, 200):.4g}")
    elif kind == "non-inverting":
        components["Rg"] = log(100, 1e6)
        components["Rf"] = float(f"{components['Rg'] * log(0.05, 200):.4g}")
    elif draw.random() < 0.5:
        components["Rf"] = log(10, 1e6)

    def add(chance, **parts):
        if draw.random() < chance:
            for name, (a, b) in parts.items():
                components[name] = log(a, b)

    if "Rf" in components:
        # Across the feedback resistor so that the corner lies within some decades of the amplifier's.
        if draw.random() < 0.5:
            components["Cf"] = float(f"{min(1e-7, max(2e-13, 1 / (2 * math.pi * components['Rf'] * log(1e4, 1e8)))):.4g}")
    if kind == "inverting" and draw.random() < 0.5:
        components["Rp"] = log(10, 1e6)
        add(0.5, Cp=(1e-12, 1e-7))
    add(0.3, Rser=(1, 1e5))
    add(0.3, Cshunt=(1e-12, 1e-8))
    add(0.4, Riso=(5, 300))
    add(0.2, Rsn=(5, 500), Csn=(1e-10, 1e-7))
    add(0.2, Rng=(10, 1e5), Cng=(1e-11, 1e-8))
    for name, chance in (("inverting_node", 0.5), ("non_inverting_node", 0.3), ("across_feedback", 0.3)):
        value = maybe(chance, 1e-13, 2e-11)
        if value:
            board[name] = value
    for name, chance, low, high in (("resistance", 0.6, 50, 1e6), ("capacitance", 0.6, 1e-12, 1e-7)):
        value = maybe(chance, low, high)
        if value:
            load[name] = value
    gbw = log(1e4, 1e9)
    poles = sorted(float(f"{gbw * log(0.1, 100):.4g}") for _ in range(draw.choice([0, 1, 1, 2, 3])))
    zeros = [[float(f"{gbw * log(1.5, 100):.4g}"), draw.random() < 0.5]] if poles and draw.random() < 0.3 else []
    amp = amplifier(open_loop=log(1e3, 1e7), gbw=gbw, higher_poles=poles, zeros=zeros,
                    output_resistance=maybe(0.8, 1, 2e3) or 0.0, differential_resistance=maybe(0.6, 1e5, 1e12),
                    common_mode_resistance=maybe(0.6, 1e6, 1e13), differential_capacitance=maybe(0.7, 2e-13, 2e-11) or 0.0,
                    common_mode_capacitance=maybe(0.7, 2e-13, 2e-11) or 0.0, voltage_noise=log(8e-10, 1e-7), voltage_corner=log(0.1, 1e4),
                    exponent=draw.choice([1.0, 1.0, 1.0, 0.9, 1.2]), current_noise=log(1e-16, 1e-11), current_corner=log(0.1, 1e4))
    source = draw.choice([None, {"resistance": log(1, 1e7)}, {"resistance": log(10, 1e4)}, {"capacitance": log(1e-11, 1e-6)}])
    if source and "capacitance" in source and kind != "inverting" and not amp["common_mode_resistance"]:
        amp["common_mode_resistance"] = log(1e6, 1e12)
    low = log(0.01, 100)
    return circuit(f"random-{k}", kind, components, amp, isolation=draw.choice(["outside", "inside"]) if "Riso" in components else "outside", source=source,
                   load=load, board=board, temperature=draw.choice([250.0, 298.15, 358.15]), band=[low, float(f"{low * log(10, 1e6):.4g}")],
                   frequencies=sorted([log(0.1, 100), float(f"{gbw * log(1e-4, 1e-2):.4g}"), float(f"{gbw * log(0.03, 3):.4g}")]), signal_frequency=float(f"{gbw * log(1e-6, 0.1):.4g}"))
