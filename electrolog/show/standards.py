"""A standard as it was logged: where its concentration came from, and how long it keeps."""

from __future__ import annotations

from electrolog.answers.preparing import PreparedStandard
from electrolog.clock import shown_moment
from electrolog.measure.dilution_plan import DilutionPlan, Step
from electrolog.show import entries
from electrolog.show.machine import plain, print_csv, print_json
from electrolog.show.tables import print_lines, print_table
from electrolog.units import shown_concentration, shown_number, shown_percent


def answer(found: PreparedStandard, json: bool) -> None:
    if json:
        budget = dict(found.prepared.budget) if found.prepared else None
        print_json(
            [{**entries.as_dict(found.entered), "uncertainty_budget": budget, "usual_expiry": found.usual_expiry}]
        )
        return
    print_lines(entries.sentence(found.entered), *_budget(found), *_expiry(found))


def answer_plan(plan: DilutionPlan, json: bool, csv: bool) -> None:
    steps = [plan.intermediate, *plan.steps] if plan.intermediate else list(plan.steps)
    rows = [{**plain(step), "diluent_ml": step.diluent_ml} for step in steps]
    if json:
        print_json(
            {"intermediate": rows[0] if plan.intermediate else None, "steps": rows[len(rows) - len(plan.steps) :]}
        )
    elif csv:
        print_csv(rows)
    else:
        columns = ("gives", "from", "take (mL)", "diluent (mL)", "made up to (mL)")
        print_table(columns, [_row(step) for step in steps], columns)
        if plan.intermediate:
            print_lines("The first row is an intermediate: the others are made from it.")


def _row(step: Step) -> tuple[str, ...]:
    volumes = (step.take_ml, step.diluent_ml, step.make_up_to_ml)
    return (
        shown_concentration(step.concentration_um),
        shown_concentration(step.source_um),
        *[shown_number(volume, 4) for volume in volumes],
    )


def _budget(found: PreparedStandard) -> list[str]:
    made = found.prepared
    if made is None:
        return []
    if not made.budget:
        return ["  no ± was given with masses and volumes: the uncertainty is unknown"]
    shares = ", ".join(f"{name} {shown_percent(share)}" for name, share in made.budget)
    own = shown_concentration(made.uncertainty_um, 2)
    return [f"  standard uncertainty {own} ({made.relative_uncertainty:.2%}); of its variance: {shares}"]


def _expiry(found: PreparedStandard) -> list[str]:
    if found.entered.values.get("expires_at") is not None or found.usual_expiry is None:
        return []
    return [
        f"  keeps until {shown_moment(found.usual_expiry)} by common practice ({found.why_expiry}); --expires usual "
        "writes that on record"
    ]
