"""Strain energies to measure the gap by: closed forms, series, or a far finer solve."""

import math
from dataclasses import dataclass
from typing import Any

import numpy as np

import kplate as kp
from benchmarks import cases
from kplate.quadrature import triangle_rule

SUPPORTED = "simply supported"
TERMS = 400  # odd ones of Levy's series; they fall with the sixth power
FINER, LEAST = 0.02, 1e-8  # tolerance of a finer solve, of the gap and at least
BUDGET = 15_000  # unknowns
RESOLVED = 0.05  # of the error: what a reference energy may be off by


@dataclass(frozen=True, kw_only=True)
class Energy:
    """A strain energy with its band.

    Parameters
    ----------
    case : str
        Which problem.
    lower, upper, reference : float
        For D = 1: those of kplate, and the value to measure them by.
    doubt : float
        What the reference may be off by.
    source : str
        Where it is from.
    """

    case: str
    lower: float
    upper: float
    reference: float
    doubt: float
    source: str

    @property
    def inside(self) -> bool:
        """Whether the reference lies in the band."""
        return self.lower - self.doubt <= self.reference <= self.upper + self.doubt

    @property
    def effectivity(self) -> float:
        """Gap over true error, in the norm of the energy; nan if not resolved."""
        error = self.reference - self.lower
        if not error > self.doubt / RESOLVED:
            return math.nan
        return math.sqrt((self.upper - self.lower) / error)


def energy(
    problem: dict[str, Any], plate: kp.Plate, loads: list[Any], found: kp.Value
) -> Energy:
    """Set the energy of a problem beside its reference.

    Parameters
    ----------
    problem : dict
        As the reference file states it.
    plate : Plate
        The same.
    loads : list of Load
        What acts.
    found : Value
        The energy in J, with a band.
    """
    assert found.lower is not None
    assert found.upper is not None
    lower, upper = found.lower * cases.STIFFNESS, found.upper * cases.STIFFNESS
    exact, source = _closed(problem)
    doubt = 1e-10 * abs(exact)
    if not source:
        wanted = max(FINER * (upper - lower) / lower, LEAST)
        finer = kp.solve(
            plate, loads, tolerance=wanted, goals=[kp.MeanDeflection()], budget=BUDGET
        ).energies[0]
        assert finer.lower is not None
        assert finer.upper is not None
        exact = 0.5 * (finer.lower + finer.upper) * cases.STIFFNESS
        doubt = 0.5 * (finer.upper - finer.lower) * cases.STIFFNESS
        source = "a far finer solve"
    return Energy(
        case=problem["id"],
        lower=lower,
        upper=upper,
        reference=exact,
        doubt=doubt,
        source=source,
    )


def _closed(problem: dict[str, Any]) -> tuple[float, str]:
    """Energy for D = 1 and where it is from; no source where there is no formula."""
    plain = not any(problem.get(k) for k in ("holes", "zones", "seams", "marks"))
    load = problem["load"]
    if not plain or load["kind"] != "uniform" or load.get("zone"):
        return 0.0, ""
    corners = np.array(problem["outline"]["polygon"], dtype=float)
    held = [problem["supports"].get(s, "free") for s in problem["outline"]["sides"]]
    lengths = np.hypot(*(np.roll(corners, -1, axis=0) - corners).T)
    if len(corners) == 3 and np.ptp(lengths) < 1e-9 and set(held) == {SUPPORTED}:
        return _equilateral(float(lengths[0]), load["pressure"]), "closed form"
    box = [(0.0, 0.0), (lengths[0], 0.0), tuple(lengths[:2]), (0.0, lengths[1])]
    if len(corners) != 4 or not np.allclose(corners, box):
        return 0.0, ""
    a, b = lengths[:2].tolist()
    south, east, north, west = held
    if not (east == west == SUPPORTED):
        a, b, south, north, east, west = b, a, west, east, south, north
    known = {south, north} <= {SUPPORTED, "clamped", "free"}
    if not (east == west == SUPPORTED and known):
        return 0.0, ""
    return levy(a, b, (south, north), problem["nu"], load["pressure"]), "Levy's series"


def _equilateral(side: float, pressure: float) -> float:
    """Energy of a simply supported equilateral triangle for D = 1.

    Source: S. Woinowsky-Krieger, Ingenieur-Archiv 4 (1933) (from memory).
    """
    h, rule = 0.5 * math.sqrt(3.0) * side, triangle_rule(5)
    corners = np.array([(2 * h / 3, 0.0), (-h / 3, side / 2), (-h / 3, -side / 2)])
    x, y = (rule.points @ corners).T
    sides = x**3 - 3.0 * y**2 * x - h * (x**2 + y**2) + 4.0 * h**3 / 27.0
    w = pressure / (64.0 * h) * sides * (4.0 * h**2 / 9.0 - x**2 - y**2)
    return 0.5 * pressure * 0.5 * side * h * float(rule.weights @ w)


def levy(
    a: float, b: float, ends: tuple[str, str], nu: float, pressure: float
) -> float:
    """Energy of a rectangle a x b for D = 1, x = 0 and x = a simply supported.

    Source: S. Timoshenko and S. Woinowsky-Krieger, Theory of Plates and Shells (1959),
    article 29 (from memory): w = sum of Y(y) sin(k x).
    """
    total = 0.0
    for m in range(1, 2 * TERMS, 2):
        k = math.pi * m / a
        even = 4.0 * pressure / (math.pi * m * k**4)  # of an endless strip
        reach, far = k * b, math.exp(-min(k * b, 700.0))
        # Derivatives by k y of exp(-s) and s exp(-s), of s = 0 and s = reach.
        near = np.array([(1.0, 0.0), (-1.0, 1.0), (1.0, -2.0), (-1.0, 3.0)])
        away = far * np.array(
            [(s, s * reach - s * n) for n, s in enumerate((1.0, -1.0, 1.0, -1.0))]
        )
        turn = np.array([1.0, -1.0, 1.0, -1.0])[:, None]
        first = np.hstack([near, turn * away])
        last = np.hstack([turn * away, near])
        rows = [*_held(first, ends[0], nu), *_held(last, ends[1], nu)]
        level = np.zeros((4, 4))
        level[0] = even
        right = [*_held(level, ends[0], nu), *_held(level, ends[1], nu)]
        factors = np.linalg.solve(np.array(rows), -np.array(right)[:, 0])
        own = np.array([1.0 - far, 1.0 - (1.0 + reach) * far] * 2) / k
        total += 2.0 / k * (even * b + float(own @ factors))
    return 0.5 * pressure * total


def _held(derivatives: np.ndarray, support: str, nu: float) -> tuple[Any, Any]:
    """What vanishes at an end, of derivatives (4, n) by k y."""
    w, slope, second, third = derivatives
    match support:
        case "clamped":
            return w, slope
        case "free":
            return second - nu * w, third - (2.0 - nu) * slope
    return w, second
