"""Random systems of the kinds that eigensolvers are silently wrong on, small enough for exact arithmetic.

Every generator takes a seeded generator and returns one System. Critical and colliding ones are made by closed forms
or by bisection on one damper, so that they are as near as binary64 lets them be.
"""

from __future__ import annotations

from collections.abc import Callable
from functools import partial
from typing import TYPE_CHECKING

import numpy as np

from mdof import System

if TYPE_CHECKING:
    from numpy.random import Generator
    from numpy.typing import NDArray

    Real = NDArray[np.float64]

__all__ = ["FAMILIES"]


def _between(n: int, first: int, second: int = -1) -> Real:
    """Direction of a spring between two coordinates, or from one to the ground."""
    column = np.zeros(n)
    column[first] = 1.0
    if second >= 0:
        column[second] = -1.0
    return column


def _spread(rng: Generator, decades: float, count: int) -> Real:
    return np.asarray(10.0 ** rng.uniform(-decades / 2, decades / 2, count))


def _columns(parts: list[Real], n: int) -> Real:
    return np.array(parts).reshape(-1, n).T


def _chain(n: int, *, held: bool = True) -> list[Real]:
    parts = [_between(n, index, index - 1) for index in range(1, n)]
    return [_between(n, 0), *parts] if held else parts


def _random_dampers(rng: Generator, n: int, count: int, *, grounded: bool = True) -> list[Real]:
    result = []
    for _ in range(count):
        first, second = rng.choice(n, 2, replace=False) if n > 1 else (0, -1)
        result.append(_between(n, int(first), int(second) if rng.random() < 0.6 or not grounded else -1))
    return result


def _built(mass: Real, springs: list[Real], k: Real, dampers: list[Real], c: Real) -> System:
    n = len(mass)
    M = np.diag(mass) if mass.ndim == 1 else mass
    return System.from_factors(M, _columns(springs, n), k, _columns(dampers, n), c)


def ordinary(rng: Generator) -> System:
    """Chains with a few dampers, values within two decades."""
    n = int(rng.integers(1, 7))
    springs, count = _chain(n), int(rng.integers(1, 4))
    return _built(
        _spread(rng, 1, n), springs, _spread(rng, 2, n), _random_dampers(rng, n, count), _spread(rng, 2, count)
    )


def graded_stiffness(rng: Generator) -> System:
    """Stiffness over twelve orders of magnitude."""
    n = int(rng.integers(2, 7))
    springs, count = _chain(n), int(rng.integers(0, 4))
    return _built(
        _spread(rng, 2, n), springs, _spread(rng, 12, n), _random_dampers(rng, n, count), _spread(rng, 6, count)
    )


def unequal_dampers(rng: Generator) -> System:
    """Tiny and huge dampers side by side."""
    n = int(rng.integers(2, 6))
    count = int(rng.integers(1, 5))
    return _built(
        _spread(rng, 1, n), _chain(n), _spread(rng, 2, n), _random_dampers(rng, n, count), _spread(rng, 14, count)
    )


def interlaced(rng: Generator) -> System:
    """A heavy damper beside every spring: all or most roots real, those of different modes interlaced."""
    n = int(rng.integers(2, 6))
    springs = _chain(n)
    return _built(_spread(rng, 1, n), springs, _spread(rng, 2, n), springs, 4 * _spread(rng, 3, n))


def free_machines(rng: Generator) -> System:
    """Chains and groups that nothing ties to the ground, some with a drag."""
    n = int(rng.integers(2, 7))
    springs = _chain(n, held=False)
    if n > 3 and rng.random() < 0.3:
        springs.pop(int(rng.integers(len(springs))))
    count = int(rng.integers(0, 3))
    dampers = _random_dampers(rng, n, count, grounded=bool(rng.random() < 0.5))
    drag = float(rng.choice([3, 12]))
    return _built(_spread(rng, 2, n), springs, _spread(rng, 3, len(springs)), dampers, _spread(rng, drag, count))


def massless_joints(rng: Generator) -> System:
    """Some coordinates without mass, damped or not."""
    n = int(rng.integers(2, 7))
    mass = _spread(rng, float(rng.choice([1, 4])), n)
    mass[rng.choice(np.arange(n), int(rng.integers(1, max(2, n // 2))), replace=False)] = 0.0
    count = int(rng.integers(0, 4))
    springs = [*_chain(n), _between(n, n - 1)]
    stiff, drag = float(rng.choice([2, 6])), float(rng.choice([3, 10]))
    if rng.random() < 0.3:
        springs = springs[1:-1]
    k = _spread(rng, stiff, len(springs))
    return _built(mass, springs, k, _random_dampers(rng, n, count), _spread(rng, drag, count))


def offset_masses(rng: Generator) -> System:
    """Rigid bodies whose reference point lies off the centre of gravity, so that mass couples."""
    m, a, share = 10.0 ** rng.uniform(-1, 1), 10.0 ** rng.uniform(-1, 1), 10.0 ** rng.uniform(-6, 0)
    M = np.array([[m, m * a], [m * a, m * a * a * (1 + share)]])
    springs = [np.array([1.0, 10.0 ** rng.uniform(-1, 1) * sign]) for sign in (1, -1)]
    return _built(M, springs, _spread(rng, 2, 2), [springs[0]], _spread(rng, 2, 1))


def oblique_directions(rng: Generator) -> System:
    """Springs and dampers in any direction of a body, some all but dependent."""
    n = int(rng.integers(2, 6))

    def direction() -> Real:
        free = rng.normal(size=n)
        return free if rng.random() < 0.6 else np.round(2 * free) / 2 + _between(n, int(rng.integers(n)))

    springs = [direction() for _ in range(int(rng.integers(max(1, n - 2), n + 3)))]
    dampers = [
        springs[int(rng.integers(len(springs)))] if rng.random() < 0.5 else direction()
        for _ in range(int(rng.integers(1, 4)))
    ]
    k = _spread(rng, float(rng.choice([2, 6, 12])), len(springs))
    return _built(_spread(rng, 4, n), springs, k, dampers, _spread(rng, 7, len(dampers)))


def equal_frequencies(rng: Generator) -> System:
    """The same oscillator several times, coupled by dampers alone."""
    n = int(rng.integers(2, 6))
    count = int(rng.integers(1, 4))
    dampers = [np.round(rng.normal(size=n) * 4) / 4 for _ in range(count)]
    dampers = [part if part.any() else _between(n, 0) for part in dampers]
    springs = [_between(n, index) for index in range(n)]
    k = rng.choice([1.0, 4.0], n)
    return _built(np.ones(n), springs, k, dampers, _spread(rng, 6, count))


def as_numbers(rng: Generator) -> System:
    """Full symmetric matrices given as numbers."""
    n = int(rng.integers(1, 6))
    A, B, D = (rng.normal(size=(n, n)) for _ in range(3))
    M = A @ A.T + 0.1 * np.eye(n)
    C = 10.0 ** rng.uniform(-2, 2) * B[:, : int(rng.integers(1, n + 1))]
    return System.from_matrices(0.5 * (M + M.T), C @ C.T, D @ D.T + 0.01 * np.eye(n))


def rotors(rng: Generator) -> System:
    """Gyroscopic and circulatory terms: unsymmetric C and K."""
    n = 2 * int(rng.integers(1, 3))
    turn = np.kron(np.eye(n // 2), [[0.0, 1.0], [-1.0, 0.0]])
    K = np.diag(_spread(rng, 1, n)) + 10.0 ** rng.uniform(-3, 0) * turn
    C = np.diag(_spread(rng, 1, n)) * 0.1 + 10.0 ** rng.uniform(-1, 1) * turn
    return System.from_matrices(np.diag(_spread(rng, 0.5, n)), C, K)


def colliding_pairs(rng: Generator) -> System:
    """Two complex pairs at or near a double pair: c on one of two masses coupled by c sqrt(k)/2."""
    c, k = 2.0 ** int(rng.integers(-3, 2)), float(rng.integers(1, 10)) ** 2
    off = c * np.sqrt(k) / 2
    detuned = c * (1 + float(rng.choice([0, 1e-16, 1e-14, 1e-12, 1e-10, 1e-8, 1e-6])) * float(rng.choice([-1, 1])))
    if rng.random() < 0.5:
        return System.from_matrices(np.eye(2), np.diag([detuned, 0.0]), [[k + c * c / 4, -off], [-off, k]])
    springs = [_between(2, 0, 1), _between(2, 0), _between(2, 1)]
    return _built(
        np.ones(2), springs, np.array([off, k + c * c / 4 - off, k - off]), [_between(2, 0)], np.array([detuned])
    )


def near_critical(rng: Generator) -> System:
    """One damper bisected to where two roots meet on the real axis, then moved off by a little."""
    while True:
        n = int(rng.integers(1, 5))
        decades = float(rng.choice([0.3, 2.0, 4.0]))
        mass, springs, k = _spread(rng, decades, n), _chain(n), _spread(rng, decades, n)
        dampers = [_between(n, int(rng.integers(n))), *_random_dampers(rng, n, int(rng.integers(0, 2)))]
        rest = _spread(rng, decades, len(dampers) - 1)
        grid = 10.0 ** np.linspace(-5, 5, 21)

        build = partial(_with_first, mass, springs, k, dampers, rest)
        numbers = [_oscillating(build(value)) for value in grid]
        changes = [index for index in range(20) if numbers[index] != numbers[index + 1]]
        if changes:
            break
    index = int(rng.choice(changes))
    low, high, of = float(grid[index]), float(grid[index + 1]), numbers[index]
    while high - low > 3e-16 * high:
        middle = float(np.sqrt(low * high))
        if middle in (low, high):
            break
        low, high = (middle, high) if _oscillating(build(middle)) == of else (low, middle)
    off = float(rng.choice([0, 1e-15, 1e-14, 1e-13, 1e-12, 1e-10, 1e-8])) * float(rng.choice([-1, 1]))
    return build(low * (1 + off))


def _with_first(mass: Real, springs: list[Real], k: Real, dampers: list[Real], rest: Real, first: float) -> System:
    return _built(mass, springs, k, dampers, np.array([first, *rest]))


def _oscillating(system: System) -> int:
    """Number of complex roots, by a plain eigensolver."""
    n = system.size
    M, C, K = system.M.toarray(), system.C.toarray(), system.K.toarray()
    state = np.block([[np.zeros((n, n)), np.eye(n)], [-np.linalg.solve(M, K), -np.linalg.solve(M, C)]])
    return int(np.count_nonzero(np.linalg.eigvals(state).imag))


FAMILIES: dict[str, Callable[[Generator], System]] = {
    "ordinary": ordinary,
    "graded stiffness": graded_stiffness,
    "unequal dampers": unequal_dampers,
    "interlaced real roots": interlaced,
    "near critical": near_critical,
    "colliding pairs": colliding_pairs,
    "oblique directions": oblique_directions,
    "equal frequencies": equal_frequencies,
    "free machines": free_machines,
    "massless joints": massless_joints,
    "offset masses": offset_masses,
    "given as numbers": as_numbers,
    "rotors": rotors,
}
