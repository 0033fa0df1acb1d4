"""The linear mixed core beside lme4 and nlme.

Numbers: R 4.2.2 with lme4 1.1-31 (bobyqa) and nlme 3.1-162; standard errors of ML fits are the raw ones. Each data
set's own
source stands at the head of its CSV.
"""

from __future__ import annotations

import csv
import json
from pathlib import Path

import numpy as np
import pytest

from electrolog.fouling.mixed import MixedFit, Term, fit_mixed

REFERENCE = Path(__file__).parents[1] / "reference" / "mixed"
RESULTS = json.loads((REFERENCE / "lmm_results.json").read_text(encoding="utf-8"))
DIGITS = 2e-5  # relative: five digits


def table(name: str) -> dict[str, np.ndarray]:
    lines = [x for x in (REFERENCE / f"{name}.csv").read_text(encoding="utf-8").splitlines() if not x.startswith("#")]
    rows = list(csv.DictReader(lines))
    return {column: np.array([row[column] for row in rows]) for column in rows[0]}


def numbers(data: dict[str, np.ndarray], column: str) -> np.ndarray:
    return data[column].astype(float)


def codes(values: np.ndarray) -> np.ndarray:
    return np.unique(values, return_inverse=True)[1]


def one(group: np.ndarray) -> Term:
    return Term(codes(group), np.ones((len(group), 1)))


def slope(group: np.ndarray, x: np.ndarray) -> Term:
    return Term(codes(group), np.column_stack([np.ones(len(x)), x]))


def model(name: str) -> tuple[np.ndarray, np.ndarray, tuple[Term, ...]]:  # noqa: PLR0911
    """y, fixed effects' design and random terms of one reference fit."""
    data = table(name.split("_", maxsplit=1)[0].replace("OrthodontF", "Orthodont"))
    if name.startswith("sleepstudy"):
        x, who = numbers(data, "Days"), data["Subject"]
        apart = (one(who), Term(codes(who), x[:, None]))
        terms = {"corr": (slope(who, x),), "uncorr": apart, "intercept": (one(who),)}[name.split("_")[1]]
        return numbers(data, "Reaction"), np.column_stack([np.ones(len(x)), x]), terms
    if name.startswith("Orthodont"):
        age, who = numbers(data, "age"), data["Subject"]
        female = (data["Sex"] == "Female").astype(float)
        y, centred, ones = numbers(data, "distance"), age - 11.0, np.ones(len(age))
        if name == "OrthodontF_intercept":
            girls = female > 0
            return y[girls], np.column_stack([ones, age])[girls], (one(who[girls]),)
        if name == "Orthodont_sex":
            return y, np.column_stack([ones, female, centred, female * centred]), (slope(who, centred),)
        x = age if name == "Orthodont_raw_age" else centred
        return y, np.column_stack([ones, x]), (slope(who, x),)
    if name == "Machines":
        pair = np.char.add(np.char.add(data["Worker"], ":"), data["Machine"])
        fixed = np.column_stack([np.ones(len(pair)), data["Machine"] == "B", data["Machine"] == "C"]).astype(float)
        return numbers(data, "score"), fixed, (one(pair), one(data["Worker"]))
    if name == "ergoStool":
        fixed = np.column_stack([np.ones(len(data["Type"])), *(data["Type"] == t for t in ("T2", "T3", "T4"))]).astype(
            float
        )
        return numbers(data, "effort"), fixed, (one(data["Subject"]),)
    y, groups = {
        "Penicillin_crossed": ("diameter", ("plate", "sample")),
        "Pastes_nested": ("strength", ("sample", "batch")),
        "Dyestuff": ("Yield", ("Batch",)),
        "Dyestuff2_boundary": ("Yield", ("Batch",)),
        "Rail": ("travel", ("Rail",)),
    }[name]
    return numbers(data, y), np.ones((len(data[y]), 1)), tuple(one(data[g]) for g in groups)


NAMES = [
    name
    for name in RESULTS
    if not name.startswith(("_", "xcheck"))
    and name != "Orthodont_lme_het"  # a residual sd per sex is no part of the core
]


@pytest.mark.parametrize("reml", [True, False], ids=["REML", "ML"])
@pytest.mark.parametrize("name", NAMES)
def test_equals_lme4(name: str, reml: bool) -> None:
    y, fixed, terms = model(name)
    fit = fit_mixed(y, fixed, terms, reml=reml)
    wanted = RESULTS[name]["REML" if reml else "ML"]
    assert fit.converged
    assert fit.log_likelihood == pytest.approx(wanted["logLik"], rel=1e-8)
    np.testing.assert_allclose(fit.fixed, list(wanted["fixed"].values()), rtol=DIGITS)
    np.testing.assert_allclose(np.sqrt(np.diag(fit.fixed_covariance)), list(wanted["se"].values()), rtol=DIGITS)
    np.testing.assert_allclose(fit.residual_sd, sd_of(wanted, "Residual"), rtol=DIGITS)
    check_components(fit, terms, wanted)
    check_predictions(name, fit, wanted)


def sd_of(wanted: dict, group: str) -> float:
    return next(row["sdcor"] for row in wanted["varcomp"] if row["grp"] == group)


def check_components(fit: MixedFit, terms: tuple[Term, ...], wanted: dict) -> None:
    found = sorted(float(v) for c in fit.covariances for v in np.diag(c))
    variances = sorted(r["vcov"] for r in wanted["varcomp"] if r["var2"] is None and r["grp"] != "Residual")
    # lme4 itself stops at a tolerance in the standard deviations relative to the residual's
    np.testing.assert_allclose(np.sqrt(found), np.sqrt(variances), rtol=DIGITS, atol=1e-5 * fit.residual_sd)
    between = [r["vcov"] for r in wanted["varcomp"] if r["var2"] is not None]
    if between:
        scale = np.sqrt(np.prod(np.diag(fit.covariances[0])))
        np.testing.assert_allclose(fit.covariances[0][0, 1] / scale, between[0] / scale, atol=DIGITS)


def check_predictions(name: str, fit: MixedFit, wanted: dict) -> None:
    """Best linear unbiased predictions of the first term, each level by its own name."""
    if name not in ("sleepstudy_corr", "Penicillin_crossed", "Dyestuff", "Rail", "Orthodont_slope"):
        return
    grouping = {"Penicillin_crossed": "plate", "Dyestuff": "Batch", "Rail": "Rail"}.get(name, "Subject")
    data = table(name.split("_", maxsplit=1)[0])
    levels = list(np.unique(data[grouping]))
    for row in wanted["blup"][grouping]:
        values = [v for key, v in row.items() if key not in ("level", "_row")]
        mine = fit.effects[0][levels.index(str(row["level"]))]
        np.testing.assert_allclose(mine, values, rtol=1e-4, atol=2e-5 * np.abs(fit.effects[0]).max())
