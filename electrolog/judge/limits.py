"""Which limits hold for this run: the most specific of those the lab has set, each with its origin."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field

from electrolog.errors import InputError
from electrolog.judge.rules import RULES, Rule, rule_named

__all__ = ["RULES", "Limit", "LimitRow", "Limits", "Rule", "contradictions", "effective", "rule_named"]

DEFAULT_SIGNAL_TO_NOISE = 3.0  # IUPAC's detection limit, Pure Appl. Chem. 45 (1976) 99
RISKS_AGREE_WITHIN = 1.5  # costs are round numbers: a risk within this factor of theirs says the same


@dataclass(frozen=True)
class LimitRow:
    """A limit as the record keeps it; "" for analyte or project: for all of them."""

    rule: str
    value: float
    origin: str
    analyte: str = ""
    project: str = ""


@dataclass(frozen=True)
class Limit:
    rule: str
    value: float
    origin: str
    scope: str


@dataclass(frozen=True)
class Limits:
    """The limits in force for one question, by rule."""

    by_rule: Mapping[str, Limit] = field(default_factory=dict)

    def get(self, rule: str) -> Limit | None:
        return self.by_rule.get(rule_named(rule).name)

    def value(self, rule: str) -> float | None:
        limit = self.get(rule)
        return None if limit is None else limit.value

    def accepted_risk(self) -> Limit | None:
        """As set, or else that at which taking the probe and setting it aside cost the same on average."""
        return self.get("accepted-risk") or self._risk_by_costs()

    def signal_to_noise(self) -> float:
        return self.value("signal-to-noise") or DEFAULT_SIGNAL_TO_NOISE

    def _risk_by_costs(self) -> Limit | None:
        run, probe = self.get("cost-of-wasted-run"), self.get("cost-of-discarded-probe")
        if run is None or probe is None:
            return None
        # Taking it costs p × run, setting it aside (1 − p) × probe: equal at p = probe / (run + probe).
        return Limit("accepted-risk", probe.value / (run.value + probe.value), run.origin, "from the lab's costs")


def effective(
    rows: Iterable[LimitRow], *, analyte: str = "", project: str = "", per_run: Mapping[str, float] | None = None
) -> Limits:
    """Per run before project and analyte, before project, before analyte, before everyone.

    Raises UnknownName for a rule that isn't in the catalogue, InputError for a value per run out of its bounds.
    """
    holding = [row for row in rows if row.analyte in ("", analyte) and row.project in ("", project)]
    found: dict[str, Limit] = {}
    for row in sorted(holding, key=_specificity):
        found[rule_named(row.rule).name] = Limit(row.rule, row.value, row.origin, _scope(row))
    for name, value in (per_run or {}).items():
        found[name] = Limit(name, rule_named(name).checked(value), "this run", "this run")
    return Limits(found)


def _specificity(row: LimitRow) -> tuple[bool, bool]:
    return bool(row.project), bool(row.analyte)


def _scope(row: LimitRow) -> str:
    parts = [f"project {row.project}"] if row.project else []
    return ", ".join([*parts, row.analyte] if row.analyte else parts) or "everyone"


def contradictions(limits: Limits) -> tuple[str, ...]:
    """What can't hold together, in sentences; empty when all is well."""
    return (*_out_of_bounds(limits), *_costs_against_risk(limits))


def _out_of_bounds(limits: Limits) -> list[str]:
    said = []
    for limit in limits.by_rule.values():
        try:
            rule_named(limit.rule).checked(limit.value)
        except InputError as error:
            said.append(error.message)
    return said


def _costs_against_risk(limits: Limits) -> list[str]:
    run, probe, risk = (limits.get(name) for name in ("cost-of-wasted-run", "cost-of-discarded-probe", "accepted-risk"))
    if (run is None) != (probe is None):
        alone, missing = ("cost-of-discarded-probe", "cost-of-wasted-run")[:: 1 if run is None else -1]
        return [f"{alone} is set without {missing}: only their ratio means something"]
    by_costs = limits._risk_by_costs()
    if by_costs is None or risk is None:
        return []
    ratio = max(risk.value / by_costs.value, by_costs.value / risk.value)
    if ratio <= RISKS_AGREE_WITHIN:
        return []
    return [f"accepted-risk is {risk.value:.3g}, but the two costs imply {by_costs.value:.3g}: keep one of them"]
