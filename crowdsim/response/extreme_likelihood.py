"""Likelihood of the Gumbel and GEV laws: value, derivatives and maximum; the numbers behind `extremes`.

Values are arrays [..., value], parameters [..., 3] with location, scale, shape: many samples at once, as a bootstrap
needs. Values are best handed over with a spread of about 1. The local maximum with a shape above -1 is sought: below,
the likelihood has no bound.
"""

from __future__ import annotations

import math
from typing import Literal

import numpy as np
from numpy.polynomial.polynomial import polyval
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Family = Literal["gumbel", "gev"]
LEAST_SHAPE = -1.0  # at and below it the likelihood of the GEV law has no bound
LEAST_REGULAR_SHAPE = -0.5  # at and below it standard errors do not follow from the likelihood
ITERATIONS = 100
HALVINGS = 40
CONVERGED = 1e-14  # Newton decrement: an error of 1e-7 standard errors, and one full step follows
EULER = 0.5772156649015329


def growth(u: Floats) -> Floats:
    """(exp(u) - 1)/u."""
    small = np.abs(u) < 1e-8
    safe = np.where(small, 1.0, u)
    return np.where(small, 1.0 + 0.5 * u, np.expm1(safe) / safe)


def growth_slope(u: Floats) -> Floats:
    """Derivative of (exp(u) - 1)/u: (exp(u) - growth)/u, by series where that cancels."""
    small = np.abs(u) < 1e-3
    safe = np.where(small, 1.0, u)
    series = 0.5 + u * (1.0 / 3.0 + u * (0.125 + u / 30.0))
    return np.where(small, series, (np.exp(safe) - growth(safe)) / safe)


def log_ratio(u: Floats) -> Floats:
    """ln(1 + u)/u."""
    zero = u == 0.0
    return np.where(zero, 1.0, np.log1p(u) / np.where(zero, 1.0, u))


def log_ratio_slopes(u: Floats, ratio: Floats) -> tuple[Floats, Floats]:
    """First two derivatives of ln(1 + u)/u, given with it; by series where the quotients cancel."""
    small = np.abs(u) < 0.03
    safe = np.where(small, 1.0, u)
    inverse = 1.0 / (1.0 + safe)
    slope = (inverse - ratio) / safe
    curvature = -(inverse**2 + 2.0 * slope) / safe
    if small.any():
        k = np.arange(12.0)  # 0.03^12 is far below rounding
        sign = (-1.0) ** k
        slope[small] = polyval(u[small], -sign * (k + 1.0) / (k + 2.0))
        curvature[small] = polyval(u[small], sign * (k + 1.0) * (k + 2.0) / (k + 3.0))
    return slope, curvature


def log_likelihood(x: Floats, parameters: Floats) -> Floats:
    """Of each sample; -inf outside the parameters' range or with a value outside the law's ends."""
    location, scale, shape = np.moveaxis(parameters[..., None], -2, 0)
    allowed = (scale > 0.0) & (shape > LEAST_SHAPE)
    scale = np.where(allowed, scale, 1.0)
    z = (x - location) / scale
    u = shape * z
    allowed = allowed & (u.min(axis=-1, keepdims=True) > -1.0)
    y = z * log_ratio(np.where(allowed, u, 0.0))
    with np.errstate(over="ignore"):
        found = -x.shape[-1] * np.log(scale[..., 0]) - np.sum((1.0 + shape) * y + np.exp(-y), axis=-1)
    return np.asarray(np.where(allowed[..., 0], found, -np.inf))


def derivatives(x: Floats, parameters: Floats) -> tuple[Floats, Floats]:
    """Score of every value [..., 3, value] and Hessian [..., 3, 3] of the log-likelihood.

    One value's share is l = -ln(scale) - (1 + shape) y - exp(-y), y = z A(shape z), A(u) = ln(1 + u)/u.
    """
    location, scale, shape = np.moveaxis(parameters[..., None], -2, 0)
    z = (x - location) / scale
    u = shape * z
    a = log_ratio(u)
    a1, a2 = log_ratio_slopes(u, a)
    y = z * a
    y_s, y_ss = z**2 * a1, z**3 * a2  # s: the shape
    y_z = 1.0 / (1.0 + u)
    t = np.exp(-y)
    l_y = t - (1.0 + shape)
    l_z = l_y * y_z
    l_zz = -(t + shape * l_y) * y_z**2
    l_zs = -(t * y_s + 1.0) * y_z - l_y * z * y_z**2
    l_ss = -t * y_s**2 + l_y * y_ss - 2.0 * y_s
    scores = np.stack([-l_z / scale, -(1.0 + z * l_z) / scale, l_y * y_s - y], axis=-2)
    hessian = np.empty((*parameters.shape, 3))
    unit = scale[..., 0]
    hessian[..., 0, 0] = l_zz.sum(axis=-1) / unit**2
    hessian[..., 0, 1] = hessian[..., 1, 0] = (z * l_zz + l_z).sum(axis=-1) / unit**2
    hessian[..., 0, 2] = hessian[..., 2, 0] = -l_zs.sum(axis=-1) / unit
    hessian[..., 1, 1] = (1.0 + z**2 * l_zz + 2.0 * z * l_z).sum(axis=-1) / unit**2
    hessian[..., 1, 2] = hessian[..., 2, 1] = -(z * l_zs).sum(axis=-1) / unit
    hessian[..., 2, 2] = l_ss.sum(axis=-1)
    return scores, hessian


def l_moment_estimate(x: Floats, family: Family) -> Floats:
    """Estimate by L-moments: Hosking, Wallis & Wood 1985 for the GEV law, Hosking 1990 for Gumbel's, from memory."""
    n = x.shape[-1]
    i = np.arange(n)
    ordered = np.sort(x, axis=-1)
    b0 = ordered.mean(axis=-1)
    b1 = ordered @ (i / (n * (n - 1.0)))
    b2 = ordered @ (i * (i - 1.0) / (n * (n - 1.0) * (n - 2.0)))
    l2 = 2.0 * b1 - b0
    gumbel = np.stack([b0 - EULER * l2 / math.log(2.0), l2 / math.log(2.0), np.zeros_like(l2)], axis=-1)
    if family == "gumbel":
        return gumbel
    c = 2.0 / (3.0 + (6.0 * b2 - 6.0 * b1 + b0) / l2) - math.log(2.0) / math.log(3.0)
    k = np.minimum(7.8590 * c + 2.9554 * c * c, 0.5)
    k = np.where(np.abs(k) < 1e-6, 1e-6, k)
    gamma = np.vectorize(math.gamma)(1.0 + k)
    scale = l2 * k / ((1.0 - 2.0**-k) * gamma)
    gev = np.stack([b0 - scale * (1.0 - gamma) / k, scale, -k], axis=-1)
    return np.where(np.isfinite(log_likelihood(x, gev))[..., None], gev, gumbel)


def maximise(x: Floats, family: Family) -> tuple[Floats, NDArray[np.bool_]]:
    """Parameters [sample, 3] of largest likelihood for samples [sample, value], and where there is such a maximum.

    Newton's method, its steps halved until the likelihood does not fall.
    """
    free = 2 if family == "gumbel" else 3
    parameters = l_moment_estimate(x, family)
    reached = log_likelihood(x, parameters)
    found = np.zeros(x.shape[0], dtype=bool)
    active = np.arange(x.shape[0])
    for _ in range(ITERATIONS):
        some, here = x[active], parameters[active]
        scores, hessian = derivatives(some, here)
        gradient = scores.sum(axis=-1)[:, :free]
        curvature, axes = np.linalg.eigh(-hessian[:, :free, :free])
        # absolute values: a way up also where the likelihood is not concave
        along = np.einsum("sji,sj->si", axes, gradient) / np.maximum(np.abs(curvature), 1e-9 * x.shape[1])
        step = np.zeros_like(here)
        step[:, :free] = np.einsum("sij,sj->si", axes, along)
        done = (np.sum(gradient * step[:, :free], axis=1) < CONVERGED) & (curvature[:, 0] > 0.0)
        found[active[done]] = True
        parameters[active], reached[active], moved = _ascended(some, here, step, reached[active])
        active = active[~done & moved]
        if active.size == 0:
            break
    return parameters, found


def _ascended(x: Floats, parameters: Floats, step: Floats, reached: Floats) -> tuple[Floats, Floats, NDArray[np.bool_]]:
    """Parameters after steps halved until the likelihood `reached` does not fall, the new one, and which moved."""
    least = reached - 1e-12 * x.shape[1]  # rounding
    after = log_likelihood(x, parameters + step)
    falls = after < least
    for _ in range(HALVINGS):
        if not falls.any():
            break
        step = np.where(falls[:, None], 0.5 * step, step)
        after[falls] = log_likelihood(x[falls], (parameters + step)[falls])
        falls = after < least
    return np.where(falls[:, None], parameters, parameters + step), np.where(falls, reached, after), ~falls


def covariance_of(x: Floats, parameters: Floats, family: Family, label: NDArray[np.intp]) -> Floats:
    """Of the free parameters of one sample; label : group of each value, from 0 without gaps. See `extremes.fit`."""
    free = 2 if family == "gumbel" else 3
    groups = int(label.max()) + 1
    if parameters[2] <= LEAST_REGULAR_SHAPE:
        return np.full((free, free), np.nan)
    scores, hessians = derivatives(x[:, None], np.broadcast_to(parameters, (x.size, 3)))
    information = -hessians.sum(axis=0)[:free, :free]
    if groups == x.size:
        return np.asarray(np.linalg.inv(information))
    score, own = np.zeros((groups, free)), np.zeros((groups, free, free))
    np.add.at(score, label, scores[:, :free, 0])
    np.add.at(own, label, -hessians[:, :free, :free])
    rest = information - own
    definite = np.linalg.eigvalsh(rest)[:, 0] > 0.0
    rest = np.where(definite[:, None, None], rest, information)
    change = np.linalg.solve(rest, score[..., None])[..., 0]
    return np.asarray(change.T @ change)
