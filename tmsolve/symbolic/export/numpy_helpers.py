"""Source text of the helpers that exported NumPy functions stand on.

Weights are held by their logarithms, so that no temperature is too low; eigenvalues of 2 × 2
matrices are taken as the larger diagonal entry (or the root of the product of the others) times
1 + excess, with an excess that is a sum of positive terms.
"""

from __future__ import annotations

__all__ = ["LEVELS", "ROOT", "SIGNED"]

LEVELS = '''
def _sum(*levels):
    """Add weights, each (log, d log/d beta, second derivative, log - beta*derivative), without cancellation."""
    shape = numpy.broadcast_shapes(*(numpy.shape(part) for level in levels for part in level))
    log, slope, curve, entropy = (
        numpy.stack([numpy.broadcast_to(level[k], shape) for level in levels]) * 1.0 for k in range(4)
    )
    top = log.argmax(axis=0)[None]
    first = numpy.take_along_axis(log, top, 0)
    weight = numpy.exp(log - first)
    numpy.put_along_axis(weight, top, 0.0, 0)
    more = weight.sum(axis=0)
    numpy.put_along_axis(weight, top, 1.0, 0)
    chance = weight / (1.0 + more)
    lead = numpy.take_along_axis(slope, top, 0)
    excess = (chance * (slope - lead)).sum(axis=0)
    surprise = numpy.log1p(more) - (log - first)
    return (
        first[0] + numpy.log1p(more),
        lead[0] + excess,
        (chance * curve).sum(axis=0) + (chance * (slope - lead - excess) ** 2).sum(axis=0),
        (chance * (entropy + surprise)).sum(axis=0),
    )
'''

ROOT = '''
def _larger_root(a, d, bc, beta):
    """Largest eigenvalue of ((a, b), (c, d)) from the levels of a, d and b*c."""
    swap = a[0] < d[0]
    high = [numpy.where(swap, y, x) for x, y in zip(a, d)]
    low = [numpy.where(swap, x, y) for x, y in zip(a, d)]
    x0, x1, x2 = low[0] - high[0], low[1] - high[1], low[2] - high[2]
    x = numpy.exp(x0)
    dx, ddx = x * x1, x * (x2 + x1**2)
    gap = numpy.expm1(x0)
    y0, y1, y2 = bc[0] - 2.0 * high[0], bc[1] - 2.0 * high[1], bc[2] - 2.0 * high[2]
    diagonal = y0 <= 0.0

    # The larger diagonal entry leads: 1 + e with e = 2y/(1 - x + sqrt((1 - x)**2 + 4y)), y = bc/high**2.
    y = numpy.exp(numpy.minimum(y0, 0.0))
    dy, ddy = y * y1, y * (y2 + y1**2)
    square = gap**2 + 4.0 * y
    safe = numpy.where(square > 0.0, square, 1.0)
    root = numpy.sqrt(safe)
    dsquare, ddsquare = 2.0 * gap * dx + 4.0 * dy, 2.0 * gap * ddx + 2.0 * dx**2 + 4.0 * ddy
    droot = dsquare / (2.0 * root)
    ddroot = ddsquare / (2.0 * root) - dsquare / root * (dsquare / safe) / 4.0
    below, dbelow, ddbelow = root - gap, droot - dx, ddroot - ddx
    e = 2.0 * y / below
    e1 = y1 - dbelow / below
    e2 = y2 - ddbelow / below + (dbelow / below) ** 2
    share = e / (1.0 + e)
    first = (
        high[0] + numpy.log1p(e),
        high[1] + share * e1,
        high[2] + share * e2 + share * (1.0 - share) * e1**2,
        high[3] + numpy.log1p(e) - beta * share * e1,
    )

    # The other entries lead: sqrt(bc) times 1 + e with e = m + q**2/(1 + sqrt(1 + q**2)).
    u0, u1, u2 = high[0] - 0.5 * bc[0], high[1] - 0.5 * bc[1], high[2] - 0.5 * bc[2]
    w0, w1, w2 = low[0] - 0.5 * bc[0], low[1] - 0.5 * bc[1], low[2] - 0.5 * bc[2]
    u, w = numpy.exp(numpy.minimum(u0, 0.0)), numpy.exp(numpy.minimum(w0, 0.0))
    du, ddu, dw, ddw = u * u1, u * (u2 + u1**2), w * w1, w * (w2 + w1**2)
    m, dm, ddm = 0.5 * (u + w), 0.5 * (du + dw), 0.5 * (ddu + ddw)
    q, dq, ddq = -0.5 * u * gap, 0.5 * (du - dw), 0.5 * (ddu - ddw)
    radius = numpy.sqrt(1.0 + q**2)
    e = m + q**2 / (1.0 + radius)
    de = dm + q * dq / radius
    dde = ddm + q * ddq / radius + dq**2 / radius**3
    second = (
        0.5 * bc[0] + numpy.log1p(e),
        0.5 * bc[1] + de / (1.0 + e),
        0.5 * bc[2] + dde / (1.0 + e) - (de / (1.0 + e)) ** 2,
        0.5 * bc[3] + numpy.log1p(e) - beta * de / (1.0 + e),
    )
    return [numpy.where(diagonal, one, other) for one, other in zip(first, second)]
'''

SIGNED = '''
def _total(*terms):
    """Sum of c*exp(x) over the terms (c, x), as (sign, logarithm); exponentials equal but for rounding cancel."""
    shape = numpy.broadcast_shapes(*(numpy.shape(part) for term in terms for part in term))
    c, x = (numpy.stack([numpy.broadcast_to(term[k], shape) for term in terms]) * 1.0 for k in range(2))
    x = numpy.where(c == 0.0, numpy.min(x, axis=0), x)
    order = numpy.argsort(-x, axis=0, kind="stable")
    x, c = numpy.take_along_axis(x, order, 0), numpy.take_along_axis(c, order, 0)
    nothing = 3e-15 * numpy.max(numpy.abs(x), axis=0)
    for k in range(1, len(terms)):
        x[k] = numpy.where(x[k - 1] - x[k] <= nothing, x[k - 1], x[k])
    total, base = c[0], x[0]
    for weight, log in zip(c[1:], x[1:]):
        gone = total == 0.0
        base = numpy.where(gone, log, base)
        total = numpy.where(gone, weight, total + weight * numpy.exp(log - base))
    with numpy.errstate(divide="ignore"):
        return numpy.sign(total), base + numpy.log(numpy.abs(total))


def _surd(plain, radical, product):
    """Add A and B*sqrt(S), by (A**2 - B**2*S)/(A - B*sqrt(S)) where they have opposite signs."""
    alike = plain[0] * radical[0] >= 0
    up = _plus(plain, radical)
    below = _plus(plain, (-radical[0], radical[1]))
    with numpy.errstate(invalid="ignore"):
        down = product[0] * below[0], product[1] - below[1]
    return numpy.where(alike, up[0], down[0]), numpy.where(alike, up[1], down[1])


def _number(x):
    """A number as (sign, logarithm of its modulus)."""
    with numpy.errstate(divide="ignore"):
        return numpy.sign(x), numpy.log(numpy.abs(x))


def _value(x):
    """The number that (sign, logarithm) stands for."""
    return x[0] * numpy.exp(x[1])


def _plus(*terms):
    """Add; terms that cancel are added first, the largest before smaller ones."""
    shape = numpy.broadcast_shapes(*(numpy.shape(part) for term in terms for part in term))
    sign = numpy.stack([numpy.broadcast_to(term[0], shape) for term in terms])
    log = numpy.stack([numpy.broadcast_to(term[1], shape) for term in terms])
    order = numpy.argsort(-log, axis=0, kind="stable")
    sign, log = numpy.take_along_axis(sign, order, 0), numpy.take_along_axis(log, order, 0)
    top = numpy.where(numpy.isfinite(log[:1]), log[:1], 0.0)
    part = sign * numpy.exp(log - top)
    total = part[0]
    for more in part[1:]:
        total = total + more
    rest = part[1:].sum(axis=0) * part[0]
    with numpy.errstate(divide="ignore", invalid="ignore"):
        near = numpy.log1p(numpy.where(rest > -0.5, rest, 0.0))
        logarithm = numpy.where((rest > -0.5) & (part[0] != 0.0), near, numpy.log(numpy.abs(total)))
    return numpy.sign(total), top[0] + logarithm


def _times(*factors):
    """Multiply."""
    sign, log = factors[0]
    for factor in factors[1:]:
        sign, log = sign * factor[0], log + factor[1]
    return sign, log


def _power(x, above, below=1):
    """Raise to the power above/below; an even root of what rounding made negative is that of 0."""
    with numpy.errstate(invalid="ignore"):
        log = x[1] * (above / below)
    if below % 2 == 0:
        return numpy.where(x[0] > 0, 1.0, 0.0), numpy.where(x[0] > 0, log, -numpy.inf)
    return (x[0] if above % 2 else x[0] ** 2), log


def _sinh(x):
    """Hyperbolic sine."""
    with numpy.errstate(divide="ignore"):
        return numpy.sign(x), numpy.abs(x) + numpy.log(-0.5 * numpy.expm1(-2.0 * numpy.abs(x)))


def _cosh(x):
    """Hyperbolic cosine."""
    return numpy.ones_like(x * 1.0), numpy.abs(x) + numpy.log1p(numpy.exp(-2.0 * numpy.abs(x))) - numpy.log(2.0)


def _log_tanh(x):
    """Logarithm of |tanh x|, right where tanh x is nearly 1."""
    small = numpy.exp(-2.0 * numpy.abs(x))
    with numpy.errstate(divide="ignore"):
        return numpy.log(-numpy.expm1(-2.0 * numpy.abs(x))) - numpy.log1p(small)


def _largest(*numbers):
    """The largest of positive numbers."""
    log = numpy.max(numpy.stack(numpy.broadcast_arrays(*(number[1] for number in numbers))), axis=0)
    return numpy.ones_like(log), log
'''
