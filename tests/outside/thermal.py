"""Junction temperatures of an amplifier whose bias current doubles with temperature, by Lambert's W (mpmath); printed for thermal.rs.

T = base + K*2^((T - 298.15)/step), K = theta*2*Ib*span, base = Ta + theta*Iq*span: with a = ln 2/step and x = T - base this is
-a*x*exp(-a*x) = -a*k, k = K*2^((base - 298.15)/step), so x = -W(-a*k)/a on the principal branch, and none where a*k > 1/e.
(R. Corless et al., "On the Lambert W function", Advances in Computational Mathematics 5 (1996): from memory.)
"""
import mpmath as mp

mp.mp.dps = 30
for name, ambient, theta, quiescent, bias, step, span in [
    ("mild", 358.15, 200, 1e-3, 1e-6, 10, 30),
    ("strong", 358.15, 200, 1e-3, 4e-6, 10, 30),
    ("nearly away", 358.15, 200, 1e-3, 4.55e-6, 10, 30),
    ("away", 358.15, 200, 1e-3, 4.6e-6, 10, 30),
    ("picoamperes", 343.15, 160, 1.8e-3, 6e-11, 10, 24),
]:
    ambient, quiescent, bias = (mp.mpf(str(x)) for x in (ambient, quiescent, bias))
    base, a = ambient + theta * quiescent * span, mp.log(2) / step
    k = theta * 2 * bias * span * mp.mpf(2) ** ((base - mp.mpf("298.15")) / step)
    print(name, "a*k*e =", mp.nstr(a * k * mp.e, 8), "Tj =", mp.nstr(base - mp.lambertw(-a * k) / a, 17) if a * k < 1 / mp.e else "none")
