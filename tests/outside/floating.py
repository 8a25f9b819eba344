#!/usr/bin/env python3
"""Stages behind a capacitive source with a further capacitor in series, solved as dense nodal matrices (oracle_kinds.py's, mpmath);
printed for floating.rs: |H| at 1 kHz and 1 MHz, output noise density at 1 kHz. The node between the capacitors has no DC path."""
import mpmath as mp

from oracle_circuits import amplifier
from oracle_kinds import Exact
from oracle_kinds_circuits import circuit

mp.mp.dps = 50
good = amplifier(higher_poles=[2.5e7], output_resistance=60.0, differential_capacitance=3e-12, common_mode_capacitance=2e-12)
source = [{"capacitance": 4.7e-9}]
for c in [
    circuit("differentiator", "differentiator", {"Rf": 9.1e3, "Cin": 2.2e-8, "Rin": 360.0, "Cf": 5.6e-10}, good, sources=source),
    circuit("ac-non-inverting", "ac-non-inverting", {"Cin": 1e-8, "Rb1": 1e5, "Rb2": 1e5, "Rb": 1e5, "Cb": 1e-5, "Rf": 9e4, "Rg": 1e4, "Cg": 1e-5}, good, sources=source),
    circuit("ac-inverting", "ac-inverting", {"Cin": 1e-8, "Rin": 1e4, "Rf": 1e5, "Rb1": 1e5, "Rb2": 1e5}, good, sources=source),
    circuit("sallen-key-high-pass", "sallen-key-high-pass", {"R1": 1e4, "R2": 2e4, "C1": 1e-8, "C2": 1e-8}, good, sources=source),
    circuit("multiple-feedback-band-pass", "multiple-feedback-band-pass", {"R1": 1e3, "R3": 1e5, "C1": 1e-8, "C2": 1.1e-8}, good, sources=source),
]:
    exact = Exact(c)
    print(c["id"], *(mp.nstr(x, 15) for x in [abs(exact.transfer(1e3)), abs(exact.transfer(1e6)), mp.sqrt(sum(exact.noise(1e3)))]))
