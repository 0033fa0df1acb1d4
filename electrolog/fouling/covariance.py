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
    """diag(diagonal) + root root'; indexed by [rows, columns] like the matrix it stands for."""

    diagonal: Floats  # (F + 1,)
    root: Floats  # (F + 1, p)

    def __getitem__(self, key: tuple[Any, Any]) -> Any:
        rows, columns = (np.arange(len(self.diagonal))[part] for part in key)
        if all(isinstance(part, slice) for part in key):
            rows, columns = rows[:, None], columns[None, :]
        alike = np.where(rows == columns, self.diagonal[rows], 0.0)
        return alike + (self.root[rows] * self.root[columns]).sum(axis=-1)


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
        return (covariance.diagonal + (covariance.root**2).sum(axis=1))[:-1]
    return np.diag(covariance)[:-1]


def extended(covariance: Covariance, more: Floats) -> Covariance:
    """With further effects of variance `more`, independent of the others, put before the last ("no effect")."""
    if isinstance(covariance, Thin):
        diagonal = np.concatenate([covariance.diagonal[:-1], more, [0.0]])
        root = np.insert(covariance.root, [len(covariance.root) - 1] * len(more), 0.0, axis=0)
        return Thin(diagonal, root)
    n, extra = len(covariance) - 1, len(more)
    wide = np.zeros((n + extra + 1, n + extra + 1))
    wide[:n, :n] = covariance[:n, :n]
    wide[range(n, n + extra), range(n, n + extra)] = more
    return wide
