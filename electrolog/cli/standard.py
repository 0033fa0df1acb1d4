from __future__ import annotations

from typing import Annotated

import typer

from electrolog.cli.options import Json, Note
from electrolog.cli.session import lab_of
from electrolog.errors import InputError


def command(
    ctx: typer.Context,
    label: Annotated[str, typer.Argument(metavar="STANDARD", help="Its label.")],
    analyte: Annotated[str, typer.Argument(metavar="ANALYTE", help="What is in it.")],
    concentration: Annotated[
        str | None, typer.Argument(metavar="[CONCENTRATION]", help="10mM, 500uM; or let it be computed.")
    ] = None,
    mass: Annotated[str | None, typer.Option("--mass", help="Weighed: 18.96mg±0.05mg (± or +-: tolerance)")] = None,
    molar_mass: Annotated[
        str | None, typer.Option("--molar-mass", help="Of what was weighed (default: the analyte's, with --salt).")
    ] = None,
    salt: Annotated[
        list[str] | None,
        typer.Option("--salt", help="hydrochloride, hydrobromide, bitartrate, sodium, hydrate; may be repeated."),
    ] = None,
    purity: Annotated[str | None, typer.Option("--purity", help="By mass: 98%±1%")] = None,
    volume: Annotated[str | None, typer.Option("--volume", help="Dissolved in: 10mL±0.02mL")] = None,
    source: Annotated[str | None, typer.Option("--from", metavar="STANDARD", help="Made by diluting this one.")] = None,
    dilute: Annotated[
        list[str] | None, typer.Option("--dilute", metavar="TAKEN:MADE-UP-TO", help="1mL±0.01mL:100mL±0.1mL; repeated.")
    ] = None,
    prepared: Annotated[str, typer.Option("--prepared", metavar="TIME", help="When it was made.")] = "now",
    uncertainty: Annotated[
        str | None, typer.Option("--uncertainty", help="Standard uncertainty as a share: 2%, 0.02")
    ] = None,
    diluent: Annotated[str | None, typer.Option("--diluent", help="What it is dissolved in.")] = None,
    expires: Annotated[
        str | None, typer.Option("--expires", metavar="TIME", help="Use-by; usual: as common practice has it.")
    ] = None,
    note: Note = None,
    json: Json = False,
) -> None:
    """Log a standard solution. Amines oxidise in air within hours to days: give its use-by.

    electrolog standard S-48-DA dopamine 10mM --uncertainty 2% --diluent "0.1 M acid"

    electrolog standard S-49-DA DA --mass 18.96mg±0.05mg --salt hydrochloride --purity 98%±1% --volume 10mL±0.02mL

    electrolog standard S-50-DA DA --from S-49-DA --dilute 0.1mL:10mL --diluent PBS --expires usual
    """
    from electrolog.answers.preparing import Preparation
    from electrolog.show import standards

    values = {
        "standard": label,
        "analyte": analyte,
        "prepared_at": prepared,
        "concentration_um": concentration,
        "relative_uncertainty": uncertainty,
        "diluent": diluent,
        "expires_at": None if expires == "usual" else expires,
        "note": note,
    }
    how = Preparation(mass, molar_mass, tuple(salt or ()), purity, volume, source, tuple(dilute or ()))
    if (how == Preparation()) == (concentration is None):
        raise InputError(
            "concentration: accepted is one of: the concentration, --mass with --volume, or --from with --dilute",
            "such as: electrolog standard S-48-DA dopamine 10mM",
        )
    if uncertainty is not None and concentration is None:
        raise InputError("uncertainty: it follows from the ± of masses and volumes; accepted: one of both")
    known = {name: text for name, text in values.items() if text is not None}
    chosen = None if concentration is not None else how
    standards.answer(lab_of(ctx).prepare_standard(known, chosen, usual_expiry=expires == "usual"), json)
