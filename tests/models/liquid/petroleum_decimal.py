"""The published equations of API MPMS 11.1-2004 in 40-digit decimals, one reading at a time.

Typed from the equations in their printed order, from no code of the project: what the columns answer is held
against this, and its central differences at a step of 1e-12 give slopes to more digits than a float holds.
"""

from __future__ import annotations

from collections.abc import Callable
from decimal import Decimal, getcontext

D = Decimal
getcontext().prec = 40

SHIFT = ["-0.148759", "-0.267408", "1.080760", "1.269056", "-4.089591", "-1.871251", "7.438081", "-3.536296"]
K = {
    "crude": ("341.0957", "0", "0"),
    "gasoline": ("192.4571", "0.2438", "0"),
    "transition": ("1489.0670", "0", "-0.00186840"),
    "jet": ("330.3010", "0", "0"),
    "fuel oil": ("103.8720", "0.2701", "0"),
    "lubricating": ("0", "0.34878", "0"),
}


def star_temperature(t_f: D) -> D:
    t90 = (t_f - 32) / D("1.8")
    tau = t90 / 630
    shift = sum((D(a) * tau**power for power, a in enumerate(SHIFT, start=1)), D(0))
    return D("1.8") * (t90 - shift) + 32


def figures(density_60f: D, t_f: D, psi: D, group: str, alpha60: D | None = None) -> dict[str, D]:
    t_star = star_temperature(t_f)
    delta = D("0.01374979547")
    if alpha60 is None:
        k0, k1, k2 = (D(k) for k in K[group])
        rho = density_60f
        a = delta / 2 * ((k0 / rho + k1) / rho + k2)
        b = (2 * k0 + k1 * rho) / (k0 + (k1 + k2 * rho) * rho)
        e = (a * (1 + D("0.8") * a)).exp() - 1
        star = rho * (1 + e / (1 + a * (1 + D("1.6") * a) * b))
        alpha = (k0 / star + k1) / star + k2
    else:
        alpha = alpha60
        star = density_60f * (alpha * delta / 2 * (1 + D("0.4") * alpha * delta)).exp()
    away = t_star - D("60.0068749")
    ctl = (-alpha * away * (1 + D("0.8") * alpha * (away + delta))).exp()
    fp = (D("-1.9947") + D("0.00013427") * t_star + (D(793920) + D(2326) * t_star) / star**2).exp()
    cpl = 1 / (1 - D("1e-5") * fp * psi)
    return {"t_star": t_star, "star": star, "alpha": alpha, "ctl": ctl, "fp": fp, "cpl": cpl,
            "density": density_60f * ctl * cpl}  # fmt: skip


def slope(function: Callable[[D], D], at: D) -> D:
    """Central difference, whose error is some 1e-24."""
    step = at * D("1e-12")
    return (function(at + step) - function(at - step)) / (2 * step)
