"""Mean and covariance of the shared effects from all stand-ins: precision assembled once per sweep, then solved.

Up to MOST_DENSE effects the solution is exact. Beyond, the few effects that nearly every unit sees (the means,
groups of
few values) are eliminated exactly, by conjugate gradients over the many (days, batches); among the many, the inverse is
taken to second order in their couplings, which are weak when each day sees many probes.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from electrolog.fouling.covariance import Covariance, Thin
from electrolog.fouling.effects import Effects

Floats = NDArray[np.float64]
Integers = NDArray[np.int64]
MOST_DENSE = 400
MOST_FEW = 60


@dataclass(frozen=True)
class BatchAssembly:
    """Entry `source` of one batch's precisions, laid end to end, adds to its `slot`, which is slot `place` of all."""

    source: NDArray[np.int32]
    slot: NDArray[np.int32]
    place: Integers


@dataclass(frozen=True)
class Assembly:
    """Where each entry of the stand-ins' precisions goes: batch by batch, or all entries at once would fill the
    memory."""

    batches: tuple[BatchAssembly, ...]
    row: Integers  # per slot
    column: Integers  # per slot


@dataclass(frozen=True)
class Solved:
    mean: Floats  # (F,)
    covariance: Covariance
    half_log_det: float  # of the precision


def plan_assembly(columns: list[Integers], n_effects: int) -> Assembly:
    """columns: (B, R, e) of every batch."""
    sources, slots, keys = [], [], [np.zeros(0, dtype=np.int64)]
    for at in columns:
        b, r, _ = at.shape
        entry = np.arange(b * r * r, dtype=np.int32).reshape(b, r, r, 1, 1)
        row, column = at[:, :, None, :, None], at[:, None, :, None, :]
        real = (row < n_effects) & (column < n_effects)
        key, slot = np.unique((row * n_effects + column)[real], return_inverse=True)
        sources.append(np.broadcast_to(entry, real.shape)[real])
        slots.append(slot.astype(np.int32))
        keys.append(key)
    kinds, place = np.unique(np.concatenate(keys), return_inverse=True)
    places = np.split(place, np.cumsum([len(key) for key in keys[1:]])[:-1]) if columns else []
    batches = tuple(BatchAssembly(*each) for each in zip(sources, slots, places, strict=True))
    return Assembly(batches, kinds // n_effects, kinds % n_effects)


def assemble(plan: Assembly, precisions: list[Floats]) -> Floats:
    """Value of every slot."""
    values = np.zeros(len(plan.row))
    for batch, precision in zip(plan.batches, precisions, strict=True):
        entries = precision.ravel()[batch.source]
        values[batch.place] += np.bincount(batch.slot, weights=entries, minlength=len(batch.place))
    return values


def solve(effects: Effects, plan: Assembly, values: Floats, prior: Floats, pull: Floats) -> Solved:
    if len(prior) <= MOST_DENSE:
        return solve_exactly(plan, values, prior, pull)
    return solve_thinly(effects, plan, values, prior, pull)


def solve_exactly(plan: Assembly, values: Floats, prior: Floats, pull: Floats) -> Solved:
    from scipy.linalg.lapack import dpotrf, dpotri  # from the factor: half the work of inverting anew

    n = len(prior)
    precision = np.diag(prior)
    precision[plan.row, plan.column] += values
    factor, failed = dpotrf(precision, lower=True)
    if failed:
        raise np.linalg.LinAlgError("the shared effects' precision is not positive definite")
    lower = np.tril(dpotri(factor, lower=True)[0])
    covariance = np.zeros((n + 1, n + 1))
    covariance[:n, :n] = lower + np.tril(lower, -1).T
    return Solved(covariance[:n, :n] @ pull, covariance, float(np.log(np.diag(factor)).sum()))


def solve_thinly(effects: Effects, plan: Assembly, values: Floats, prior: Floats, pull: Floats) -> Solved:
    from scipy.sparse import csr_array, diags_array

    n = len(prior)
    precision = csr_array((values, (plan.row, plan.column)), shape=(n, n)) + diags_array(prior)
    few = seen_by_most(effects)
    many = np.setdiff1d(np.arange(n), few)
    inner = precision[many][:, many].tocsr()
    cross = precision[many][:, few].toarray()
    own = inner.diagonal()
    solved = conjugate_gradients(inner, np.column_stack([cross, pull[many]]))
    through, alone = solved[:, :-1], solved[:, -1]
    rest = precision[few][:, few].toarray() - cross.T @ through
    rest = 0.5 * (rest + rest.T)
    of_few = np.linalg.inv(rest)
    mean = np.zeros(n)
    mean[few] = of_few @ (pull[few] - cross.T @ alone)
    mean[many] = alone - through @ mean[few]
    squares = couplings(inner, own)
    alone_precision, coupled, root = np.full(n + 1, np.inf), np.zeros(n + 1), np.zeros((n + 1, len(few)))
    alone_precision[many], coupled[many] = own, squares
    root[few] = np.linalg.cholesky(0.5 * (of_few + of_few.T))
    root[many] = -through @ root[few]
    log_det = np.log(own).sum() - 0.5 * squares.sum() + np.linalg.slogdet(rest)[1]
    return Solved(mean, Thin(alone_precision, coupled, root), 0.5 * float(log_det))


def couplings(inner: Any, own: Floats) -> Floats:
    """Per row the sum of squared couplings to the others, each relative to the two diagonals."""
    entries = inner.tocoo()
    off = entries.row != entries.col
    row, column = entries.row[off], entries.col[off]
    return np.bincount(row, weights=entries.data[off] ** 2 / (own[row] * own[column]), minlength=len(own)).astype(
        np.float64
    )


def seen_by_most(effects: Effects) -> Integers:
    """Means, and groups of few values."""
    sizes: dict[tuple[str, ...], int] = {}
    for name in effects.names:
        sizes[name[:-1]] = sizes.get(name[:-1], 0) + 1
    few = [
        k
        for k, name in enumerate(effects.names)
        if name[0] in ("level", "latent", "rate") and (len(name) < 3 or sizes[name[:-1]] <= MOST_FEW // 4)
    ]
    return np.array(few, dtype=np.int64)


def conjugate_gradients(matrix: Any, right: Floats, tolerance: float = 1e-6, most: int = 200) -> Floats:
    """Solves for all right-hand sides at once, preconditioned by the diagonal."""
    inverse = 1.0 / matrix.diagonal()[:, None]
    x = inverse * right
    left = right - matrix @ x
    z = inverse * left
    direction, size = z, (left * z).sum(axis=0)
    enough = tolerance**2 * np.maximum((right * inverse * right).sum(axis=0), 1e-300)
    for _ in range(most):
        if np.all(size <= enough):
            break
        through = matrix @ direction
        step = size / np.maximum((direction * through).sum(axis=0), 1e-300)
        x, left = x + step * direction, left - step * through
        z = inverse * left
        renewed = (left * z).sum(axis=0)
        direction, size = z + renewed / np.maximum(size, 1e-300) * direction, renewed
    return np.asarray(x)
