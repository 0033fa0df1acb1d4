"""The shapes of loss, one a file."""

from __future__ import annotations

from electrolog.fouling.shapes.exponential import Exponential
from electrolog.fouling.shapes.fast_then_slow import FastThenSlow
from electrolog.fouling.shapes.growing_patch import GrowingPatch
from electrolog.fouling.shapes.none import NoLoss
from electrolog.fouling.shapes.plateau import Plateau
from electrolog.fouling.shapes.shape import Shape
from electrolog.fouling.shapes.square_root import SquareRoot

SHAPES: dict[str, Shape] = {
    shape.name: shape for shape in (Exponential(), SquareRoot(), Plateau(), FastThenSlow(), GrowingPatch(), NoLoss())
}
ALL_SHAPES: tuple[str, ...] = tuple(SHAPES)
