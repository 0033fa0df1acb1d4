"""How long a standard may be used: a rule per analyte and diluent.

All hours are common practice without a source: solutions for the flow cell, at room temperature, in air and
light. They err on the short side. What a lab writes on its own bottle (`expires_at`) goes before them.
"""

from __future__ import annotations

from dataclasses import dataclass
from datetime import datetime, timedelta

CATECHOLS = (
    "dopamine",
    "norepinephrine",
    "epinephrine",
    "3,4-dihydroxyphenylacetic acid",
)
INDOLES = ("serotonin", "5-hydroxyindole-3-acetic acid", "melatonin")
STEADY = ("homovanillic acid", "3-methoxytyramine", "tyramine", "octopamine", "histamine", "adenosine", "uric acid")
ACID_WORDS = ("acid", "hcl", "hclo4", "h2so4")


@dataclass(frozen=True)
class UseBy:
    buffer_h: float
    acid_h: float
    why: str

    def hours(self, diluent: str | None) -> float:
        """An unknown diluent is taken for a buffer, where solutions keep less long."""
        named = (diluent or "").casefold()
        return self.acid_h if any(word in named for word in ACID_WORDS) else self.buffer_h


RULES: dict[str, UseBy] = {
    **dict.fromkeys(CATECHOLS, UseBy(4, 24 * 7, "catechols oxidise in air within hours, slower in acid")),
    **dict.fromkeys(INDOLES, UseBy(6, 24 * 7, "indoles oxidise in air and light within hours, slower in acid")),
    **dict.fromkeys(STEADY, UseBy(24, 24 * 14, "steady for a day, then bacteria and slow oxidation tell")),
    "ascorbic acid": UseBy(2, 24, "ascorbate oxidises within hours, faster with traces of metal"),
    "hydrogen peroxide": UseBy(4, 8, "dilute peroxide decomposes within hours"),
}


def use_by(analyte: str, diluent: str | None, prepared_at: datetime) -> datetime | None:
    """None: no rule is known for this analyte."""
    rule = RULES.get(analyte.casefold())
    return None if rule is None else prepared_at + timedelta(hours=rule.hours(diluent))


def past_use_by(
    analyte: str,
    diluent: str | None,
    prepared_at: datetime | None,
    expires_at: datetime | None,
    used_at: datetime,
) -> str | None:
    if expires_at is not None:
        late_h = _hours(used_at - expires_at)
        return f"the standard was used {_said(late_h)} after it expired" if late_h > 0 else None
    if prepared_at is None or (last := use_by(analyte, diluent, prepared_at)) is None or used_at <= last:
        return None
    rule, age_h = RULES[analyte.casefold()], _hours(used_at - prepared_at)
    return (
        f"the standard was {_said(age_h)} old; {analyte} in {diluent or 'an unknown diluent'} keeps "
        f"{_said(rule.hours(diluent))} ({rule.why}; common practice)"
    )


def _hours(span: timedelta) -> float:
    return span.total_seconds() / 3600


def _said(hours: float) -> str:
    return f"{hours:.2g} h" if hours < 48 else f"{hours / 24:.0f} days"
