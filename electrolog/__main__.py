"""`python -m electrolog` is the same as `electrolog`."""

from electrolog.cli.main import run

run()
