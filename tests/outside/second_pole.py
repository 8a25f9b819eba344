#!/usr/bin/env python3
"""Phase margins of amplifiers with two poles behind an output resistance and a load, by bisection in mpmath; printed for
second_pole.rs, which states the margins and asks for the second pole back."""
import mpmath as mp

mp.mp.dps = 40
for name, a0, gbw, ro, pole, gain, rl, cl in [
    ("plain", 1e6, 1e7, 0, 2.5e7, 1, None, None),
    ("loaded", 1e6, 1e7, 50, 2.5e7, 1, 2e3, 1e-10),
    ("gain of ten", 2e5, 8e7, 30, 1.2e7, 10, 600, None),
    ("cable", 1e5, 5e6, 200, 6e6, 2, None, 4.7e-10),
]:
    def loop(f):
        s = 2j * mp.pi * f
        load = (1 / mp.mpf(rl) if rl else 0) + s * (cl or 0)
        return a0 / (1 + s * a0 / (2 * mp.pi * gbw)) / (1 + s / (2 * mp.pi * pole)) / (1 + ro * load) / gain

    low, high = mp.mpf(1), mp.mpf(gbw) * 10
    for _ in range(120):
        middle = mp.sqrt(low * high)
        low, high = (middle, high) if abs(loop(middle)) > 1 else (low, middle)
    print(name, mp.nstr(mp.arg(-loop(low)), 17))
