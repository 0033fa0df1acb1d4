"""The covariance of the shared effects: a full matrix, or for very many effects a diagonal and a few columns."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Integers = NDArray[np.int64]


@dataclass(frozen=True)
class Thin:
    """diag(diagonal) + root root'; indexed by [rows, columns] like the matrix it stands for.

    The diagonal is (1 + couplings) / precision: the inverse of a matrix to second order in its couplings.
    """

    precision: Floats  # (F + 1,) inf where the effect stands in root alone
    couplings: Floats  # (F + 1,)
    root: Floats  # (F + 1, p)

    @property
    def diagonal(self) -> Floats:
        return (1.0 + self.couplings) / self.precision

    def __getitem__(self, key: tuple[Any, Any]) -> Any:
        rows, columns = (np.arange(len(self.precision))[part] for part in key)
        if all(isinstance(part, slice) for part in key):
            rows, columns = rows[:, None], columns[None, :]
        alike = np.where(rows == columns, self.diagonal[rows], 0.0)
        return alike + (self.root[rows] * self.root[columns]).sum(axis=-1)

    def without(self, columns: Integers, own: Floats) -> Floats:
        """Covariances (B, R, R) of the rows, sums of effects (B, R, e), with their own precision (B, R, R) taken out.

        Taken out effect by effect, so that it stays positive definite whatever the couplings are; what one unit adds
        to the root is one part in thousands.
        """
        same = (columns[:, :, None, :] == columns[:, None, :, :]).transpose(0, 3, 1, 2).astype(np.float64)
        taken = ((same @ own[:, None]) * same).sum(axis=-1).transpose(0, 2, 1)  # (B, R, e)
        whole = np.minimum(self.precision[columns], 1e300)
        left = np.maximum(whole - np.maximum(taken, 0.0), 1e-3 * whole)
        alone = (1.0 + self.couplings[columns] * (left / whole)) / left
        root = self.root[columns].sum(axis=2)
        return np.asarray((same * alone.transpose(0, 2, 1)[:, :, :, None]).sum(axis=1) + root @ root.transpose(0, 2, 1))


Covariance = Floats | Thin


def between(covariance: Covariance, rows: Integers, columns: Integers) -> Floats:
    """Covariances (B, R, Q) of sums of effects: rows (B, R, e) with columns (B, Q, e)."""
    if isinstance(covariance, Thin):
        left, right = covariance.root[rows].sum(axis=2), covariance.root[columns].sum(axis=2)
        same = rows[:, :, None, :, None] == columns[:, None, :, None, :]
        alone = np.where(same, covariance.diagonal[rows][:, :, None, :, None], 0.0).sum(axis=(-1, -2))
        return np.asarray(left @ right.transpose(0, 2, 1) + alone)
    return np.asarray(covariance[rows[:, :, None, :, None], columns[:, None, :, None, :]].sum(axis=(-1, -2)))


def variances(covariance: Covariance) -> Floats:
    """(F,)."""
    if isinstance(covariance, Thin):
        return np.asarray((covariance.diagonal + (covariance.root**2).sum(axis=1))[:-1])
    return np.asarray(np.diag(covariance)[:-1])


def extended(covariance: Covariance, more: Floats) -> Covariance:
    """With further effects of variance `more`, independent of the others, put before the last ("no effect")."""
    if isinstance(covariance, Thin):
        precision = np.concatenate([covariance.precision[:-1], 1.0 / more, [np.inf]])
        couplings = np.concatenate([covariance.couplings[:-1], np.zeros(len(more) + 1)])
        root = np.insert(covariance.root, [len(covariance.root) - 1] * len(more), 0.0, axis=0)
        return Thin(precision, couplings, root)
    n, extra = len(covariance) - 1, len(more)
    wide = np.zeros((n + extra + 1, n + extra + 1))
    wide[:n, :n] = covariance[:n, :n]
    wide[range(n, n + extra), range(n, n + extra)] = more
    return wide
