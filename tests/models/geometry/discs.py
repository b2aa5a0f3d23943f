"""Volumes of lying vessels by quadrature over coaxial discs: slow, and nothing in common with the models."""

import math

from scipy.integrate import quad


def segment(radius, height):
    """Area of a disc below a height over its centre."""
    y = min(max(height, -radius), radius)
    return radius**2 * math.acos(-y / radius) + y * math.sqrt(max(radius**2 - y**2, 0.0)) if radius > 0 else 0.0


def profile(kind, radius, x, *, depth=None, crown=None, knuckle=None):
    """Radius of a head at x outward from its tangent line, from the drawing; None beyond its end."""
    if kind == "cone":
        return radius * (1 - x / depth) if x <= depth else None
    if kind in ("ellipsoidal", "hemispherical"):
        depth = radius if kind == "hemispherical" else depth
        return radius * math.sqrt(max(1 - (x / depth) ** 2, 0.0)) if x <= depth else None
    if kind == "torispherical":
        # Centres: of the knuckle at (0, R − q), of the crown on the axis; they touch along the line of both.
        alpha = math.asin((radius - knuckle) / (crown - knuckle))
        inside = (crown - knuckle) * math.cos(alpha)
        if x <= knuckle * math.cos(alpha):
            return radius - knuckle + math.sqrt(knuckle**2 - x**2)
        return math.sqrt(max(crown**2 - (x + inside) ** 2, 0.0)) if x <= crown - inside else None
    return None


def head_depth(kind, radius, *, depth=None, crown=None, knuckle=None):
    if kind == "hemispherical":
        return radius
    if kind == "torispherical":
        return crown - math.sqrt((crown - knuckle) ** 2 - (radius - knuckle) ** 2)
    return 0.0 if kind == "flat" else depth


def lying_volume(level, *, diameter, length, left, right, tilt=0.0, gauge_at=None):
    """Volume below the horizontal plane at a vertical level over the shell's bottom at the gauge."""
    radius = diameter / 2
    gauge_at = length / 2 if gauge_at is None else gauge_at

    def y(x):
        return level / math.cos(tilt) - radius - (x - gauge_at) * math.tan(tilt)

    def integral(function, start, stop, breaks):
        breaks = sorted({start, stop, *(b for b in breaks if start < b < stop)})
        return sum(
            quad(function, a, b, epsabs=1e-13, epsrel=1e-13, limit=400)[0]
            for a, b in zip(breaks, breaks[1:], strict=False)
        )

    ends = []
    if tilt:
        ends = [gauge_at + (level / math.cos(tilt) - radius + s * radius) / math.tan(tilt) for s in (-1, 1)]
    volume = integral(lambda x: segment(radius, y(x)), 0.0, length, ends)
    for (kind, sizes), origin, outward in ((left, 0.0, -1), (right, length, 1)):
        if kind == "flat":
            continue
        deep = head_depth(kind, radius, **sizes)
        breaks = [deep * i / 16 for i in range(1, 16)]
        if kind == "torispherical":
            alpha = math.asin((radius - sizes["knuckle"]) / (sizes["crown"] - sizes["knuckle"]))
            breaks.append(sizes["knuckle"] * math.cos(alpha))
        volume += integral(
            lambda x, k=kind, s=sizes, o=origin, w=outward: segment(profile(k, radius, x, **s) or 0.0, y(o + w * x)),
            0.0, deep, breaks,
        )  # fmt: skip
    return volume
