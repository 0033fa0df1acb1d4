"""A cohort's fit as plain data, never as code: JSON-able, and read back without any fitting library.

What is kept of each unit stands apart, by its label: whoever asks about one needs no other's. Arrays stand as base64 of
little-endian bytes beside their shape: exact, and quick to read.
"""

from __future__ import annotations

import base64
from collections import defaultdict
from collections.abc import Mapping
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
STAND_IN = ("columns", "precision", "shift")


def to_dict(fit: CohortFit) -> dict[str, Any]:
    """What all units share under "shared", what is each unit's own under "units" by its label."""
    plain = {name: getattr(fit, name) for name in PLAIN}
    line = {"typical_variance": fit.line_error.typical_variance, "prior_df": fit.line_error.prior_df}
    shared = plain | {
        "line_error": line,
        "notes": list(fit.notes),
        "components": [_component(part) for part in fit.components],
    }
    return {"shared": shared, "units": _units(fit)}


def from_dict(kept: Mapping[str, Any]) -> CohortFit:
    """With those units that are given. Raises DataError when the fit was kept by another version of the method, or its
    layout is none that is known.
    """
    try:
        shared = kept["shared"]
        if shared.get("method") == METHOD:
            return _read(shared, kept["units"])
    except (AttributeError, KeyError, TypeError, ValueError) as fault:
        raise DataError(f"the kept fit can't be read: {fault!r}", "fit the cohort again") from fault
    raise DataError(
        f"the kept fit was made by method {shared.get('method')}; this version makes {METHOD}", "fit the cohort again"
    )


def _read(kept: dict[str, Any], units: Mapping[str, Any]) -> CohortFit:
    stand_ins = _read_units(units, len(kept["components"]))
    parts = tuple(_read_component(part, own) for part, own in zip(kept["components"], stand_ins, strict=True))
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
    } | {name: _packed(getattr(part, name)) for name in ARRAYS}


def _read_component(kept: dict[str, Any], units: tuple[KeptUnits, ...]) -> Component:
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


def _units(fit: CohortFit) -> dict[str, list[dict[str, Any]]]:
    """By label: the unit's stand-in in each component that has one."""
    found: dict[str, list[dict[str, Any]]] = defaultdict(list)
    for number, part in enumerate(fit.components):
        for batch in part.units:
            arrays = (getattr(batch, name) for name in STAND_IN)
            for label, *own in zip(batch.labels, *arrays, strict=True):
                packed = {name: _packed(array) for name, array in zip(STAND_IN, own, strict=True)}
                found[label].append({"component": number, **packed})
    return dict(found)


def _read_units(units: Mapping[str, Any], n_components: int) -> list[tuple[KeptUnits, ...]]:
    """Those of each component, units with as many readings together."""
    alike: dict[tuple[int, tuple[int, ...]], list[tuple[str, list[NDArray[Any]]]]] = defaultdict(list)
    for label, parts in units.items():
        for part in parts:
            arrays = [_unpacked(part[name]) for name in STAND_IN]
            alike[part["component"], arrays[0].shape].append((label, arrays))
    found: list[list[KeptUnits]] = [[] for _ in range(n_components)]
    for (number, _), together in alike.items():
        labels = tuple(label for label, _ in together)
        columns, precision, shift = (np.stack(arrays) for arrays in zip(*(own for _, own in together), strict=True))
        found[number].append(KeptUnits(labels, columns, precision, shift))
    return [tuple(own) for own in found]


def _packed(array: NDArray[Any]) -> dict[str, Any]:
    kind = KINDS[array.dtype.kind]
    data = base64.b64encode(np.ascontiguousarray(array, dtype=kind).tobytes()).decode("ascii")
    return {"kind": kind, "shape": list(array.shape), "data": data}


def _unpacked(packed: dict[str, Any]) -> NDArray[Any]:
    flat = np.frombuffer(base64.b64decode(packed["data"]), dtype=packed["kind"])
    return flat.reshape(packed["shape"])
