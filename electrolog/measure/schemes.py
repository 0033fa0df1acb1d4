"""What a scheme of weights is called, without the arrays that it is reckoned with."""

from __future__ import annotations

from electrolog.errors import InputError, shortened
from electrolog.units import CURRENT_NA, FRACTION, parse_quantity

EQUAL = "equal"
_PLAIN = {
    **dict.fromkeys(("equal", "none"), EQUAL),
    **dict.fromkeys(("1/x", "1/c"), "1/x"),
    **dict.fromkeys(("1/x2", "1/x²", "1/x^2", "1/c2"), "1/x2"),
    "replicates": "replicates",
}


def scheme(text: str) -> str:
    """How points are to be weighted, in its one spelling. Raises InputError for what is no scheme.

    equal, 1/x, 1/x2, replicates, or an error model: noise and share of the current, as in 0.2nA+3%.
    """
    plain = _PLAIN.get(text.strip().casefold())
    if plain:
        return plain
    noise_na, share = error_model(text)
    return f"{noise_na:g}nA+{100 * share:g}%"


def error_model(text: str) -> tuple[float, float]:
    """Noise in nA and relative standard deviation of the current. Raises InputError."""
    noise, plus, share = text.partition("+")
    accepted = "accepted: equal, 1/x, 1/x2, replicates, or noise and share of the current such as 0.2nA+3%"
    if not plus or not share.strip().endswith("%"):
        raise InputError(f"weights: '{shortened(text)}' is no scheme; {accepted}")
    noise_na, part = parse_quantity(noise, CURRENT_NA, "noise"), parse_quantity(share, FRACTION, "share")
    if noise_na <= 0 or part < 0:
        raise InputError(
            f"weights: '{shortened(text)}' needs a noise above zero and a share of zero or more; {accepted}"
        )
    return noise_na, part
