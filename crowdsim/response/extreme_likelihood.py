"""Likelihood of the Gumbel and GEV laws: value, derivatives and maximum; the numbers behind `extremes`.

Parameters are arrays (location, scale, shape). Values are best handed over with a spread of about 1. The local maximum
with a shape above -1 is sought: below, the likelihood has no bound.
"""

from __future__ import annotations

import math
from typing import Literal

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Family = Literal["gumbel", "gev"]
LEAST_SHAPE = -1.0  # at and below it the likelihood of the GEV law has no bound
LEAST_REGULAR_SHAPE = -0.5  # at and below it standard errors do not follow from the likelihood
ITERATIONS = 100
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


def log_ratio(u: Floats) -> tuple[Floats, Floats, Floats]:
    """ln(1 + u)/u and its first two derivatives; by series where the quotients cancel."""
    small = np.abs(u) < 0.03
    safe = np.where(small, 1.0, u)
    value = np.log1p(safe) / safe
    inverse = 1.0 / (1.0 + safe)
    slope = (inverse - value) / safe
    curvature = (-(inverse**2) - 2.0 * slope) / safe
    if small.any():
        v = u[small]
        k = np.arange(12)  # 0.03^12 is far below rounding
        sign = (-1.0) ** k
        powers = v[:, None] ** k
        value[small] = powers @ (sign / (k + 1.0))
        slope[small] = powers @ (-sign * (k + 1.0) / (k + 2.0))
        curvature[small] = powers @ (sign * (k + 1.0) * (k + 2.0) / (k + 3.0))
    return value, slope, curvature


def log_likelihood(x: Floats, parameters: Floats) -> float:
    """Of all values; -inf outside the parameters' range or with a value outside the law's ends."""
    location, scale, shape = parameters
    if scale <= 0.0 or shape <= LEAST_SHAPE:
        return -math.inf
    z = (x - location) / scale
    u = shape * z
    if u.min() <= -1.0:
        return -math.inf
    y = z * log_ratio(u)[0] if shape else z
    with np.errstate(over="ignore"):
        return float(-x.size * math.log(scale) - np.sum((1.0 + shape) * y + np.exp(-y)))


def derivatives(x: Floats, parameters: Floats) -> tuple[Floats, Floats]:
    """Score of every value [value, 3] and Hessian [3, 3] of the log-likelihood, in (location, scale, shape).

    One value's share is l = -ln(scale) - (1 + shape) y - exp(-y), y = z A(shape z), A(u) = ln(1 + u)/u.
    """
    location, scale, shape = parameters
    z = (x - location) / scale
    a, a1, a2 = log_ratio(shape * z)
    y = z * a
    y_s, y_ss = z**2 * a1, z**3 * a2  # s: the shape
    y_z = 1.0 / (1.0 + shape * z)
    t = np.exp(-y)
    l_y = t - (1.0 + shape)
    l_z = l_y * y_z
    l_zz = -(t + shape * l_y) * y_z**2
    l_zs = -(t * y_s + 1.0) * y_z - l_y * z * y_z**2
    l_ss = -t * y_s**2 + l_y * y_ss - 2.0 * y_s
    scores = np.stack([-l_z / scale, -(1.0 + z * l_z) / scale, l_y * y_s - y], axis=1)
    cross = np.sum(z * l_zz + l_z) / scale**2
    hessian = np.array(
        [
            [np.sum(l_zz) / scale**2, cross, -np.sum(l_zs) / scale],
            [cross, np.sum(1.0 + z**2 * l_zz + 2.0 * z * l_z) / scale**2, -np.sum(z * l_zs) / scale],
            [-np.sum(l_zs) / scale, -np.sum(z * l_zs) / scale, np.sum(l_ss)],
        ]
    )
    return scores, hessian


def l_moment_estimate(x: Floats, family: Family) -> Floats:
    """Estimate by L-moments: Hosking, Wallis & Wood 1985 for the GEV law, Hosking 1990 for Gumbel's, from memory."""
    n = x.size
    i = np.arange(n)
    ordered = np.sort(x)
    b0 = ordered.mean()
    b1 = np.sum(i * ordered) / (n * (n - 1.0))
    b2 = np.sum(i * (i - 1.0) * ordered) / (n * (n - 1.0) * (n - 2.0))
    l2 = 2.0 * b1 - b0
    gumbel = np.array([b0 - EULER * l2 / math.log(2.0), l2 / math.log(2.0), 0.0])
    if family == "gumbel":
        return gumbel
    c = 2.0 / (3.0 + (6.0 * b2 - 6.0 * b1 + b0) / l2) - math.log(2.0) / math.log(3.0)
    k = min(7.8590 * c + 2.9554 * c * c, 0.5)
    if abs(k) < 1e-6:
        return gumbel
    gamma = math.gamma(1.0 + k)
    scale = l2 * k / ((1.0 - 2.0**-k) * gamma)
    start = np.array([b0 - scale * (1.0 - gamma) / k, scale, -k])
    return start if math.isfinite(log_likelihood(x, start)) else gumbel


def maximise(x: Floats, family: Family) -> Floats:
    """Parameters of largest likelihood, by Newton's method with halved steps."""
    free = 2 if family == "gumbel" else 3
    parameters = l_moment_estimate(x, family)
    reached = log_likelihood(x, parameters)
    for _ in range(ITERATIONS):
        scores, hessian = derivatives(x, parameters)
        gradient = scores.sum(axis=0)[:free]
        curvature, axes = np.linalg.eigh(-hessian[:free, :free])
        # absolute values: a way up also where the likelihood is not concave
        step = np.zeros(3)
        step[:free] = axes @ ((axes.T @ gradient) / np.maximum(np.abs(curvature), 1e-9 * x.size))
        if gradient @ step[:free] < CONVERGED and curvature[0] > 0.0:
            return parameters + step
        for _ in range(40):
            tried = log_likelihood(x, parameters + step)
            if tried >= reached - 1e-12 * x.size:
                break
            step *= 0.5
        else:
            break
        parameters, reached = parameters + step, tried
    raise ValueError(
        f"the likelihood has no maximum with a shape above {LEAST_SHAPE:g}: the values crowd against a bound"
        if family == "gev"
        else "the likelihood has no maximum"
    )


def covariance_of(x: Floats, parameters: Floats, family: Family, label: NDArray[np.intp], unit: Floats) -> Floats:
    """Of the free parameters, in the unit of each."""
    free = 2 if family == "gumbel" else 3
    if parameters[2] <= LEAST_REGULAR_SHAPE:
        return np.full((free, free), np.nan)
    scores, hessian = derivatives(x, parameters)
    covariance = np.linalg.inv(-hessian[:free, :free])
    groups = int(label.max()) + 1
    if groups < x.size:
        summed = np.stack([np.bincount(label, weights=scores[:, i], minlength=groups) for i in range(free)], axis=1)
        covariance = covariance @ (summed.T @ summed) @ covariance
    return np.asarray(covariance * np.outer(unit[:free], unit[:free]))
