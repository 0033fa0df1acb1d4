"""A cohort's fit as plain data, never as code: JSON-able, and read back without any fitting library.

Arrays stand as base64 of little-endian bytes beside their shape: exact, and quick to read.
"""

from __future__ import annotations

import base64
from typing import Any

import numpy as np
from numpy.typing import NDArray

from electrolog.errors import DataError
from electrolog.fouling.covariance import Covariance, Thin
from electrolog.fouling.effects import Effects
from electrolog.fouling.fit import METHOD, CohortFit, Component, KeptUnits
from electrolog.fouling.line_error import LineError
from electrolog.fouling.parameters import Layout
from electrolog.fouling.shapes import SHAPES

KINDS = {"f": "<f8", "i": "<i8", "b": "|b1"}
PLAIN = ("method", "fingerprint", "shape_weights", "n_units", "n_readings", "converged", "notes", "summary")
ARRAYS = ("theta", "theta_draws", "theta_covariance", "mean", "mean_draws")


def to_dict(fit: CohortFit) -> dict[str, Any]:
    plain = {name: getattr(fit, name) for name in PLAIN}
    line = {"typical_variance": fit.line_error.typical_variance, "prior_df": fit.line_error.prior_df}
    return plain | {
        "line_error": line,
        "notes": list(fit.notes),
        "components": [_component(part) for part in fit.components],
    }


def from_dict(kept: dict[str, Any]) -> CohortFit:
    """Raises DataError when the fit was kept by another version of the method, or its layout is none that is known."""
    if kept.get("method") != METHOD:
        raise DataError(
            f"the kept fit was made by method {kept.get('method')}; this version makes {METHOD}", "fit the cohort again"
        )
    try:
        return _read(kept)
    except (KeyError, TypeError, ValueError) as fault:
        raise DataError(f"the kept fit can't be read: {fault!r}", "fit the cohort again") from fault


def _read(kept: dict[str, Any]) -> CohortFit:
    parts = tuple(_read_component(part) for part in kept["components"])
    plain = {name: kept[name] for name in PLAIN}
    return CohortFit(
        **(plain | {"line_error": LineError(**kept["line_error"]), "notes": tuple(kept["notes"]), "components": parts})
    )


def _component(part: Component) -> dict[str, Any]:
    layout, effects = part.layout, part.effects
    return {
        "shape": layout.shape.name,
        "settings": list(layout.settings),
        "renewals": list(layout.renewals),
        "group_sds": [list(pair) for pair in layout.group_sds],
        "effects": [list(name) for name in effects.names],
        "prior_mean": _packed(effects.prior_mean),
        "fixed_variance": _packed(effects.fixed_variance),
        "variance_slot": _packed(effects.variance_slot),
        "covariance": _covariance(part.covariance),
        "weight": part.weight,
        "units": [_units(kept) for kept in part.units],
    } | {name: _packed(getattr(part, name)) for name in ARRAYS}


def _read_component(kept: dict[str, Any]) -> Component:
    layout = Layout(
        SHAPES[kept["shape"]],
        tuple(kept["settings"]),
        tuple(kept["renewals"]),
        tuple((what, factor) for what, factor in kept["group_sds"]),
    )
    effects = Effects(
        tuple(tuple(name) for name in kept["effects"]),
        _unpacked(kept["prior_mean"]),
        _unpacked(kept["fixed_variance"]),
        _unpacked(kept["variance_slot"]),
    )
    units = tuple(_read_units(one) for one in kept["units"])
    arrays = {name: _unpacked(kept[name]) for name in ARRAYS}
    return Component(
        layout=layout,
        effects=effects,
        weight=float(kept["weight"]),
        units=units,
        covariance=_read_covariance(kept["covariance"]),
        **arrays,
    )


def _covariance(covariance: Covariance) -> dict[str, Any]:
    if isinstance(covariance, Thin):
        return {name: _packed(getattr(covariance, name)) for name in ("precision", "couplings", "root")}
    return {"matrix": _packed(covariance)}


def _read_covariance(kept: dict[str, Any]) -> Covariance:
    if "matrix" in kept:
        return _unpacked(kept["matrix"])
    return Thin(*(_unpacked(kept[name]) for name in ("precision", "couplings", "root")))


def _units(kept: KeptUnits) -> dict[str, Any]:
    arrays = {name: _packed(getattr(kept, name)) for name in ("columns", "precision", "shift")}
    return {"labels": list(kept.labels)} | arrays


def _read_units(kept: dict[str, Any]) -> KeptUnits:
    arrays = (_unpacked(kept[name]) for name in ("columns", "precision", "shift"))
    return KeptUnits(tuple(kept["labels"]), *arrays)


def _packed(array: NDArray[Any]) -> dict[str, Any]:
    kind = KINDS[array.dtype.kind]
    data = base64.b64encode(np.ascontiguousarray(array, dtype=kind).tobytes()).decode("ascii")
    return {"kind": kind, "shape": list(array.shape), "data": data}


def _unpacked(packed: dict[str, Any]) -> NDArray[Any]:
    flat = np.frombuffer(base64.b64decode(packed["data"]), dtype=packed["kind"])
    return flat.reshape(packed["shape"])
