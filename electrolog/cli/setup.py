from __future__ import annotations

import typer

from electrolog.cli.options import Json


def command(ctx: typer.Context, json: Json = False) -> None:
    """Make a record, or bring an older one up to date; a copy is made first.

    electrolog --db lab.db setup
    """
    from electrolog.lab import set_up
    from electrolog.show.machine import print_json
    from electrolog.show.text import one_line

    done = set_up(ctx.obj.db)
    if json:
        print_json(done)
        return
    typer.echo(f"record {one_line(done.where)}: {done.what} (revision {done.revision})")
    if done.copy is not None:
        typer.echo(f"the copy from before: {one_line(done.copy)}")
