"""Linear mixed models with crossed random effects, by maximum likelihood or REML.

y = X beta + sum over terms of Z b + e, b ~ N(0, sigma^2 Lambda Lambda'), e ~ N(0, sigma^2). beta and sigma are
profiled out
and the relative factors Lambda searched (Bates et al. 2015, doi:10.18637/jss.v067.i01, eq. 18-41). The first
term's groups
are eliminated as small blocks, so a cohort with many units and some hundred days stays cheap.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]


@dataclass(frozen=True)
class Term:
    """Random effects of groups 0..G-1: `group` (N,), `design` (N, r) its coefficients' columns, correlated or not."""

    group: NDArray[np.int64]
    design: Floats
    correlated: bool = True

    @property
    def n_groups(self) -> int:
        return int(self.group.max()) + 1

    def slots(self) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
        """Rows and columns of the entries of Lambda that are searched."""
        r = self.design.shape[1]
        return np.tril_indices(r) if self.correlated else (np.arange(r), np.arange(r))

    def factor(self, entries: Floats) -> Floats:
        matrix = np.zeros((self.design.shape[1], self.design.shape[1]))
        matrix[self.slots()] = entries
        return matrix


@dataclass(frozen=True)
class MixedFit:
    fixed: Floats  # (p,)
    fixed_covariance: Floats  # (p, p)
    covariances: tuple[Floats, ...]  # (r, r) of each term
    residual_sd: float
    log_likelihood: float
    effects: tuple[Floats, ...]  # (G, r) of each term: the best linear unbiased predictions
    converged: bool


@dataclass(frozen=True)
class Products:
    """Everything that the search needs of the data: cross-products, made once."""

    inner: Floats  # (G, r, r) Z'Z of the first term's groups
    cross: Floats  # (G, r, C) Z'[other terms, X, y]
    outer: Floats  # (C, C) of [other terms, X, y]
    n: int
    p: int


@dataclass(frozen=True)
class Profile:
    """At one Lambda: the criterion, and what back-substitution needs."""

    deviance: float
    factor: Floats  # Cholesky factor of [other terms, X, y] with the first term eliminated
    solved: Floats  # (G, r, C) inverse(A) Lambda'Z'[others, X, y]


def fit_mixed(y: Floats, fixed: Floats, terms: tuple[Term, ...], *, reml: bool = True) -> MixedFit:
    """y (N,), fixed (N, p)."""
    from scipy.optimize import minimize

    products = cross_products(y, fixed, terms)
    start = np.concatenate([np.eye(t.design.shape[1])[t.slots()] for t in terms])
    bounds = [
        (0.0, None) if row == column else (None, None) for t in terms for row, column in zip(*t.slots(), strict=True)
    ]

    def criterion(theta: Floats) -> float:
        return profile(products, terms, theta, reml).deviance

    found = minimize(criterion, start, method="L-BFGS-B", jac="3-point", bounds=bounds, options={"ftol": 1e-13})
    polished = minimize(
        criterion,
        found.x,
        method="Nelder-Mead",
        bounds=bounds,
        options={"xatol": 1e-8, "fatol": 1e-10, "adaptive": True},
    )
    return answer(products, terms, polished.x, reml, bool(polished.success))


def cross_products(y: Floats, fixed: Floats, terms: tuple[Term, ...]) -> Products:
    first, *others = terms
    rest = np.concatenate([*(expanded(term) for term in others), fixed, y[:, None]], axis=1)
    inner = np.zeros((first.n_groups, first.design.shape[1], first.design.shape[1]))
    cross = np.zeros((first.n_groups, first.design.shape[1], rest.shape[1]))
    np.add.at(inner, first.group, first.design[:, :, None] * first.design[:, None, :])
    np.add.at(cross, first.group, first.design[:, :, None] * rest[:, None, :])
    return Products(inner, cross, rest.T @ rest, len(y), fixed.shape[1])


def expanded(term: Term) -> Floats:
    """(N, G r) the term's columns, a group's coefficients side by side."""
    n, r = term.design.shape
    wide = np.zeros((n, term.n_groups, r))
    wide[np.arange(n), term.group] = term.design
    return wide.reshape(n, -1)


def profile(products: Products, terms: tuple[Term, ...], theta: Floats, reml: bool) -> Profile:
    factors = split(terms, theta)
    inner = factors[0].T @ products.inner @ factors[0] + np.eye(len(factors[0]))
    scale = outer_scale(terms, factors, products.p)
    cross = factors[0].T @ products.cross @ scale
    solved = np.linalg.solve(inner, cross)
    rest = scale.T @ products.outer @ scale - np.einsum("gri,grj->ij", cross, solved)
    q = len(rest) - products.p - 1
    rest[:q, :q] += np.eye(q)
    root = np.linalg.cholesky(rest)
    diagonal = np.diag(root)
    log_det = np.linalg.slogdet(inner)[1].sum() + 2.0 * np.log(diagonal[:q]).sum()
    free = products.n - (products.p if reml else 0)
    if reml:
        log_det += 2.0 * np.log(diagonal[q:-1]).sum()
    deviance = log_det + free * (1.0 + np.log(2.0 * np.pi * diagonal[-1] ** 2 / free))
    return Profile(float(deviance), root.astype(np.float64), solved.astype(np.float64))


def split(terms: tuple[Term, ...], theta: Floats) -> list[Floats]:
    sizes = np.cumsum([len(term.slots()[0]) for term in terms])[:-1]
    return [term.factor(part) for term, part in zip(terms, np.split(theta, sizes), strict=True)]


def outer_scale(terms: tuple[Term, ...], factors: list[Floats], p: int) -> Floats:
    """Block diagonal: every other term's Lambda for each of its groups, then ones for X and y."""
    blocks = [np.kron(np.eye(term.n_groups), factor) for term, factor in zip(terms[1:], factors[1:], strict=True)]
    blocks.append(np.eye(p + 1))
    scale = np.zeros((sum(map(len, blocks)),) * 2)
    at = 0
    for block in blocks:
        scale[at : at + len(block), at : at + len(block)] = block
        at += len(block)
    return scale


def answer(products: Products, terms: tuple[Term, ...], theta: Floats, reml: bool, converged: bool) -> MixedFit:
    best = profile(products, terms, theta, reml)
    factors = split(terms, theta)
    p = products.p
    free = products.n - (p if reml else 0)
    variance = best.factor[-1, -1] ** 2 / free
    # [other terms, fixed] solve the triangle against the last row; the first term follows from them.
    rest = np.asarray(np.linalg.solve(best.factor[:-1, :-1].T, best.factor[-1, :-1]), dtype=np.float64)
    inverse = np.linalg.inv(best.factor[:-1, :-1])
    covariance = np.asarray(variance * (inverse.T @ inverse)[-p:, -p:], dtype=np.float64)
    first = best.solved[:, :, -1] - best.solved[:, :, :-1] @ rest
    spherical: list[Floats] = [first]
    at = 0
    for term in terms[1:]:
        r = term.design.shape[1]
        spherical.append(rest[at : at + term.n_groups * r].reshape(-1, r).astype(np.float64))
        at += term.n_groups * r
    effects = tuple(b @ factor.T for b, factor in zip(spherical, factors, strict=True))
    covariances = tuple(variance * factor @ factor.T for factor in factors)
    return MixedFit(
        rest[-p:], covariance, covariances, float(np.sqrt(variance)), -0.5 * best.deviance, effects, converged
    )
