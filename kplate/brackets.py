"""Bands of linear goals, for load cases and for any combination of them.

All that a band is made of is linear in the loads but the norm of the gap, which is the
root of a quadratic form: with factors f on cases of gaps G_k, |G|^2 = f' (G_k, G_l) f.
So the band of a combination is the one that it would have as a load case of its own,
a bound where those of the cases are bounds.

Axes: c cases, g goals, m combinations.
"""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from kplate.arrays import Floats
from kplate.functionals import Functional
from kplate.values import Kind, Value

# No band is narrower than this share of the terms whose sum is the value: round-off.
SUMMED = 1e-12


@dataclass(frozen=True, eq=False, kw_only=True)
class Brackets:
    """What bands are made of on one mesh.

    Parameters
    ----------
    kind, reason : str
        What bands are worth, and why they are no bounds if they are not.
    functionals : tuple of Functional
        The goals, those without a band included; g counts the others.
    put : tuple of str, length g
        Why the band of a goal is no bound where the rest is; empty where it is one.
    products : ndarray, shape (c, c)
        Inner products of the cases' gaps.
    oscillations : ndarray, shape (c,)
        What the dual cannot carry of each case, in the same norm.
    goal_norms, goal_oscillations : ndarray, shape (g,)
        The same of each goal's adjoint problem.
    centres : ndarray, shape (g, c)
        Middles of the bands.
    spare : ndarray, shape (g, c)
        What quadrature, round-off and pressures that are known by samples only add to
        half their widths.
    doubts : ndarray, shape (c, c)
        What is not known of the work of the cases' loads on each other's deflections.
    drawn : float
        Share of each value by which estimates are wider where the mesh draws something
        round otherwise than it is stated.
    """

    kind: Kind
    reason: str
    functionals: tuple[Functional, ...]
    put: tuple[str, ...]
    products: Floats
    oscillations: Floats
    goal_norms: Floats
    goal_oscillations: Floats
    centres: Floats
    spare: Floats
    doubts: Floats
    drawn: float = 0.0

    def values(
        self, factors: Floats, names: Sequence[str]
    ) -> tuple[tuple[Value, ...], ...]:
        """Value and band of each goal in combinations.

        Parameters
        ----------
        factors : ndarray, shape (c, m)
            Factors on the cases.
        names : sequence of str, length m
            Names of the combinations.
        """
        norms, widths = self._norms(factors)
        sizes = np.abs(factors)
        goal_widths = self.goal_norms + self.goal_oscillations
        centres = self.centres @ factors
        halves = goal_widths[:, None] * widths
        halves = halves - 0.5 * self.goal_norms[:, None] * norms
        halves = halves + self.spare @ sizes + self.drawn * np.abs(centres)
        found: list[tuple[Value, ...]] = []
        row = 0
        for f in self.functionals:
            if f.reason:
                lost = [Value(value=np.nan, case=n, reason=f.reason) for n in names]
                found.append(tuple(lost))
                continue
            put = self.put[row]
            kind: Kind = "estimate" if put else self.kind
            found.append(
                tuple(
                    Value(
                        value=float(centre),
                        lower=float(centre - half),
                        upper=float(centre + half),
                        kind=kind,
                        place=getattr(f.goal, "at", None),
                        case=name,
                        reason=put or self.reason,
                    )
                    for name, centre, half in zip(
                        names, centres[row], halves[row], strict=True
                    )
                )
            )
            row += 1
        return tuple(found)

    def energies(
        self, factors: Floats, names: Sequence[str], least: Floats
    ) -> tuple[Value, ...]:
        """Strain energy in J of combinations, from those of the elements, (m,)."""
        _, widths = self._norms(factors)
        sizes = np.abs(factors)
        doubts = np.einsum("km,kl,lm->m", sizes, self.doubts, sizes)
        return tuple(
            Value(
                value=float(energy),
                lower=float(energy - doubt),
                upper=float(energy + 0.5 * width**2 + doubt),
                kind=self.kind,
                case=name,
                reason=self.reason,
            )
            for name, energy, width, doubt in zip(
                names, least, widths, doubts, strict=True
            )
        )

    def _norms(self, factors: Floats) -> tuple[Floats, Floats]:
        """Norms of the combinations' gaps, without and with oscillation, (m,)."""
        squared = np.einsum("km,kl,lm->m", factors, self.products, factors)
        sizes = np.abs(factors)
        # Gaps that nearly cancel leave no less than the round-off of their products.
        whole = np.sqrt(np.maximum(np.diagonal(self.products), 0.0)) @ sizes
        norms = np.sqrt(np.maximum(squared, 0.0) + SUMMED * whole**2)
        return norms, norms + self.oscillations @ sizes
