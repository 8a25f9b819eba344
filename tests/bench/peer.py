#!/usr/bin/env python3
"""What an engineer would write in a notebook for the same sweep: response and noise by source over a frequency grid.

    peer.py CIRCUIT NATIVE

Vectorised numpy, one thread: stamp all frequencies, one batched solve for the response, one for the adjoint. CIRCUIT is
circuit.json, NATIVE what the project's program measured and computed. Compares both (relative 1e-9) and prints the times
side by side with their ratio. The exit status tells whether they agree; times decide nothing.
"""
import json
import os
import statistics
import sys
import time

for name in ("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS"):
    os.environ.setdefault(name, "1")
import numpy as np

BOLTZMANN = 1.380649e-23
SOURCE, INP, INN, P1, P2, PIN, LOAD, SNUB, CURRENT = range(9)
UNKNOWNS = 9
AGREEMENT = 1e-9


def stamps(v):
    """Conductance and capacitance matrices."""
    G, C = np.zeros((UNKNOWNS, UNKNOWNS)), np.zeros((UNKNOWNS, UNKNOWNS))

    def between(M, a, b, y):
        M[a, a] += y
        M[b, b] += y
        M[a, b] -= y
        M[b, a] -= y

    between(G, SOURCE, INP, 1 / v["Rs"])
    between(G, INN, LOAD, 1 / v["Rf"])
    between(G, PIN, LOAD, 1 / v["Riso"])
    between(G, PIN, SNUB, 1 / v["Rsn"])
    G[INN, INN] += 1 / v["Rg"]
    G[LOAD, LOAD] += 1 / v["RL"]
    between(C, INP, INN, v["Cdiff"])
    between(C, INN, PIN, v["Cf"])
    C[INP, INP] += v["Ccm"]
    C[INN, INN] += v["Ccm"] + v["Cn"]
    C[SNUB, SNUB] += v["Csn"]
    C[LOAD, LOAD] += v["CL"]
    # Two poles as two nodes of one siemens each; the second drives the pin through the output resistance.
    G[P1, P1] += 1
    C[P1, P1] += v["Ao"] / (2 * np.pi * v["GBW"])
    G[P1, INP] -= v["Ao"]
    G[P1, INN] += v["Ao"]
    G[P2, P2] += 1
    C[P2, P2] += 1 / (2 * np.pi * v["f2"])
    G[P2, P1] -= 1
    G[PIN, PIN] += 1 / v["Ro"]
    G[PIN, P2] -= 1 / v["Ro"]
    G[SOURCE, CURRENT] = G[CURRENT, SOURCE] = 1
    return G, C


def sweep(v, f):
    """Response and noise power densities by source."""
    G, C = stamps(v)
    A = G + 2j * np.pi * f[:, None, None] * C
    drive, probe = np.zeros((UNKNOWNS, 1)), np.zeros((UNKNOWNS, 1))
    drive[CURRENT] = probe[LOAD] = 1
    response = np.linalg.solve(A, drive)[..., LOAD, 0]
    adjoint = np.linalg.solve(A.transpose(0, 2, 1), probe)[..., 0]
    square = lambda z: z.real ** 2 + z.imag ** 2
    at = lambda node: adjoint[:, node]
    thermal = 4 * BOLTZMANN * v["T"]
    voltage = v["en"] ** 2 * (1 + v["fcv"] / f)
    current = v["in"] ** 2 * (1 + v["fci"] / f)
    noise = {
        "SourceResistance": square(at(SOURCE) - at(INP)) * thermal / v["Rs"],
        "Rf": square(at(INN) - at(LOAD)) * thermal / v["Rf"],
        "Rg": square(at(INN)) * thermal / v["Rg"],
        "Riso": square(at(PIN) - at(LOAD)) * thermal / v["Riso"],
        "Rsn": square(at(PIN) - at(SNUB)) * thermal / v["Rsn"],
        "LoadResistance": square(at(LOAD)) * thermal / v["RL"],
        "AmplifierVoltage": square(at(P1)) * v["Ao"] ** 2 * voltage,
        "CurrentNonInverting": square(at(INP)) * current,
        "CurrentInverting": square(at(INN)) * current,
    }
    return response, noise, sum(noise.values())


def timed(function, times):
    taken = []
    for _ in range(times):
        began = time.perf_counter()
        result = function()
        taken.append(time.perf_counter() - began)
    return result, statistics.median(taken)


def furthest(ours, theirs, floor=0.0):
    ours, theirs = np.asarray(ours), np.asarray(theirs)
    return float(np.max(np.abs(ours - theirs) / np.maximum(np.abs(theirs), floor)))


def main():
    with open(sys.argv[1], encoding="utf-8") as file:
        circuit = json.load(file)
    with open(sys.argv[2], encoding="utf-8") as file:
        native = json.load(file)
    frequencies = np.array(native["frequencies"])
    (response, noise, total), seconds = timed(lambda: sweep(circuit["values"], frequencies), 21)

    if set(native["noise"]) != set(noise):
        sys.exit(f"different noise sources: {sorted(native['noise'])} against {sorted(noise)}")
    found = {"response": furthest(np.array(native["response"]) @ [1, 1j], response), "noise": furthest(native["total"], total)}
    checked = native["lu"]
    found["response by LU"] = furthest(np.array(checked["response"]) @ [1, 1j], response)
    found["noise by LU"] = furthest(checked["total"], total)
    # The peer's own rounding shows where a source contributes next to nothing.
    for name, theirs in noise.items():
        found[f"noise of {name}"] = furthest(native["noise"][name], theirs, 1e-4 * total)
    worst = max(found, key=found.get)
    print(f"response and noise by source, {len(frequencies)} frequencies, {UNKNOWNS} unknowns")
    print(f"  largest relative difference  {found[worst]:.1e} ({worst}); allowed {AGREEMENT:.0e}")
    print(f"  numpy                        {seconds * 1e6:10.1f} µs")
    for name, key in (("native, topology compiled", "sweep_seconds"), ("native, from the stage", "whole_seconds")):
        print(f"  {name:28s} {native[key] * 1e6:10.1f} µs   numpy ÷ native {seconds / native[key]:8.1f}")
    lu = checked["sweep_seconds"]
    print(f"  {'native, by sparse LU':28s} {lu * 1e6:10.1f} µs   numpy ÷ native {seconds / lu:8.1f}   ({checked['operations']} operations a frequency)")
    sys.exit(0 if found[worst] <= AGREEMENT else 1)


if __name__ == "__main__":
    main()
