"""Newmark's method for uncoupled modes, with matched stiffness and damping."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]

MEMBERS = {
    "fox-goodwin": 1.0 / 12.0,
    "linear-acceleration": 1.0 / 6.0,
    "average-acceleration": 1.0 / 4.0,
}


@dataclass(frozen=True)
class Newmark:
    """A member of Newmark's family with gamma = 1/2 (Newmark 1959).

    Parameters
    ----------
    beta : float
        1/12 (Fox-Goodwin), 1/6 (linear acceleration), 1/4 (average acceleration).
    matched : bool
        Stiffness and damping replaced by those with which the scheme's acceleration at the
        mode's own frequency is exact (own derivation, see `matched_stiffness`). False: the
        textbook scheme.
    """

    beta: float = 1.0 / 12.0
    matched: bool = True

    @classmethod
    def named(cls, name: str, matched: bool = True) -> Newmark:
        """The member called `name` in `MEMBERS`. Raises KeyError for another name."""
        return cls(MEMBERS[name], matched)

    @property
    def stability_limit(self) -> float:
        """Largest omega dt [rad] of a stable solution; infinite for beta >= 1/4 (textbook)."""
        room = 0.25 - self.beta
        return float("inf") if room <= 0.0 else room**-0.5


def _each(function: Callable[[float], float], x: Floats) -> Floats:
    """A function of `math` on every element: numpy's own may differ in the last bit from processor to processor."""
    x = np.asarray(x, dtype=np.float64)
    return np.array([function(v) for v in x.ravel()]).reshape(x.shape)


def matched_stiffness(beta: float, angle: Floats) -> Floats:
    """Omega_numerical^2 dt^2 = 2 (1 - cos W) / (1 - 2 beta (1 - cos W)), W = omega dt = `angle`.

    With gamma = 1/2, a harmonic motion of frequency W obeys u = -a / B(W) dt^-2 with exactly this
    B, and v = -i a (dt/2) / tan(W/2): stiffness M B(W) and damping 2 zeta M (2/dt) tan(W/2)
    make the acceleration at resonance exact. Own derivation; the tests compare it.
    """
    c = 1.0 - _each(math.cos, angle)
    return np.asarray(2.0 * c / (1.0 - 2.0 * beta * c), dtype=np.float64)


def numerical_properties(
    scheme: Newmark, frequency: Floats, damping: Floats, time_step: float
) -> tuple[Floats, Floats]:
    """Stiffness and damping per unit mass that the scheme is given.

    Parameters
    ----------
    frequency : [mode] natural frequency [Hz]
    damping : [mode] fraction of critical
    time_step : [s]

    Returns
    -------
    stiffness : [mode] [1/s2];  damping : [mode] [1/s]
    """
    omega = 2.0 * np.pi * np.asarray(frequency, dtype=np.float64)
    zeta = np.asarray(damping, dtype=np.float64)
    if not scheme.matched:
        return omega**2, 2.0 * zeta * omega
    angle = omega * time_step
    stiffness = matched_stiffness(scheme.beta, angle) / time_step**2
    return stiffness, 2.0 * zeta * (2.0 / time_step) * _each(math.tan, 0.5 * angle)


def step_coefficients(
    scheme: Newmark, frequency: Floats, damping: Floats, modal_mass: Floats, time_step: float
) -> Floats:
    """One step of each mode as a linear map, for the kernel.

    Returns
    -------
    [mode, 11]: displacement from (displacement, velocity, force before, force now) [4], velocity
    from the same, in the order (displacement, velocity, force before, force now) [4], then
    1/M, c/M, k/M of the acceleration force/M - c/M velocity - k/M displacement.

    The acceleration that ends one step and begins the next is eliminated: it follows from the
    equation of motion. Raises ValueError where omega dt reaches the stability limit.
    """
    frequency = np.atleast_1d(np.asarray(frequency, dtype=np.float64))
    mass = np.broadcast_to(np.asarray(modal_mass, dtype=np.float64), frequency.shape)
    angle = 2.0 * np.pi * frequency * time_step
    if np.any(angle >= min(scheme.stability_limit, np.pi)):
        raise ValueError(f"time step {time_step:g} s: omega dt = {angle.max():.3g} reaches the limit of a stable step")
    k, c = numerical_properties(scheme, frequency, damping, time_step)
    h, beta = time_step, scheme.beta
    effective = 1.0 + 0.5 * h * c + beta * h * h * k

    def step(u: float, v: float, before: float, now: float) -> tuple[Floats, Floats]:
        a = before / mass - c * v - k * u
        u1 = u + h * v + h * h * (0.5 - beta) * a
        v1 = v + 0.5 * h * a
        a1 = (now / mass - c * v1 - k * u1) / effective
        return u1 + beta * h * h * a1, v1 + 0.5 * h * a1

    maps = [step(*unit) for unit in np.eye(4)]
    columns = [u for u, _ in maps] + [v for _, v in maps] + [1.0 / mass, c, k]
    return np.ascontiguousarray(np.stack(np.broadcast_arrays(*columns), axis=1))


def acceleration_response(
    scheme: Newmark | None, frequency: float, damping: float, load_frequency: Floats, time_step: float
) -> NDArray[np.complex128]:
    """Steady acceleration per unit force and unit modal mass at the load's frequency.

    scheme None: the exact oscillator. Otherwise 1/[1 - i c (dt/2)/tan(V/2) - k/B(V)],
    V = 2 pi load_frequency dt, which any member with gamma = 1/2 obeys (own derivation).
    """
    load = np.asarray(load_frequency, dtype=np.float64)
    if scheme is None:
        ratio = frequency / load
        return np.asarray(1.0 / (1.0 - 2j * damping * ratio - ratio**2), dtype=np.complex128)
    v = 2.0 * np.pi * load * time_step
    k, c = numerical_properties(scheme, np.array([frequency]), np.array([damping]), time_step)
    b = matched_stiffness(scheme.beta, v) / time_step**2
    return np.asarray(1.0 / (1.0 - 1j * c[0] * 0.5 * time_step / np.tan(0.5 * v) - k[0] / b), dtype=np.complex128)
