"""The one look of all figures. Functions elsewhere draw onto Axes made here; matplotlib is loaded when one is drawn.

Meaning is never carried by colour alone: marks and line styles differ too.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import TYPE_CHECKING, Any

from electrolog.errors import ElectrologError, InputError, shortened

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.colors import Colormap
    from matplotlib.figure import Figure

INK, QUIET, BLUE, BROWN = "#1c1c1c", "#6b6b6b", "#00437d", "#975c3e"
MARKS = ("o", "s", "^", "D", "v", "P", "X", "<", ">", "*")
LINES: tuple[Any, ...] = ("-", "--", "-.", ":", (0, (5, 1)), (0, (3, 1, 1, 1)), (0, (1, 1)), (0, (8, 2)))
FORMATS = (".png", ".svg", ".pdf")

# Even steps of lightness in CIELAB from L* = 28 through 96 to 28, blue below zero and brown above: the two sides
# stay apart for every kind of colour-blindness, and a grey print still shows how far from zero.
_BELOW = ("#00437d", "#31578b", "#516b9a", "#6d80a8", "#8896b7", "#a2acc6", "#bdc4d5", "#d8dbe4")
_ABOVE = ("#e6d9d3", "#d8bfb3", "#c9a594", "#b98c77", "#a8745a", "#975c3e", "#844524", "#712d08")
TWO_SIDED = (*_BELOW, "#f3f3f3", *_ABOVE)

_LOOK: dict[str, Any] = {
    "axes.spines.top": False,
    "axes.spines.right": False,
    "axes.edgecolor": QUIET,
    "axes.labelcolor": INK,
    "axes.titlesize": 10,
    "axes.titlelocation": "left",
    "axes.labelsize": 9,
    "xtick.color": QUIET,
    "ytick.color": QUIET,
    "xtick.labelcolor": INK,
    "ytick.labelcolor": INK,
    "xtick.labelsize": 8,
    "ytick.labelsize": 8,
    "legend.fontsize": 8,
    "legend.frameon": False,
    "lines.linewidth": 1.2,
    "lines.markersize": 5,
    "savefig.dpi": 160,
    "svg.hashsalt": "electrolog",  # the same picture gives the same file
    "svg.fonttype": "none",
    "pdf.fonttype": 42,
    "text.parse_math": False,  # a dollar sign in a name begins no formula
    "agg.path.chunksize": 10_000,
}


def refuse_undrawable(path: Path) -> None:
    """Before anything is logged: an ending that is no picture's, a folder that isn't there, no matplotlib."""
    if path.suffix.casefold() not in FORMATS:
        raise InputError(f"figure: '{shortened(path.name)}' has no ending of a picture; accepted: {', '.join(FORMATS)}")
    if not path.absolute().parent.is_dir():
        raise InputError(f"figure: the folder '{shortened(str(path.parent))}' isn't there; accepted: one that is")
    _matplotlib()


@contextmanager
def figure(path: Path, width_in: float, height_in: float) -> Iterator[Figure]:
    """A figure to draw on, written to `path` at the end. Raises InputError where it can't be written there."""
    refuse_undrawable(path)
    with _matplotlib().rc_context(_LOOK):
        from matplotlib.figure import Figure

        drawn = Figure(figsize=(width_in, height_in), layout="constrained")
        yield drawn
        undated = {".png": {"Software": None}, ".svg": {"Date": None}, ".pdf": {"CreationDate": None}}
        drawn.savefig(path, metadata=undated[path.suffix.casefold()])


@contextmanager
def on_axes(axes: Axes | None) -> Iterator[Axes]:
    """The Axes to draw on in the house's look: the caller's own, or that of a new figure which a notebook shows."""
    with _matplotlib().rc_context(_LOOK):
        if axes is None:
            from matplotlib import pyplot

            axes = pyplot.figure(figsize=(7.2, 3.9), layout="constrained").add_subplot()
        yield axes


@contextmanager
def figures_of_pages(path: Path, width_in: float, height_in: float) -> Iterator[Callable[[], Figure]]:
    """A function that adds a page to the PDF at `path`; pages are written at the end."""
    matplotlib = _matplotlib()
    with matplotlib.rc_context(_LOOK):
        from matplotlib.backends.backend_pdf import PdfPages
        from matplotlib.figure import Figure

        pages: list[Figure] = []

        def add_page() -> Figure:
            pages.append(Figure(figsize=(width_in, height_in)))
            return pages[-1]

        yield add_page
        with PdfPages(path, metadata={"CreationDate": None}) as book:
            for page in pages:
                book.savefig(page)


def two_sided() -> Colormap:
    from matplotlib.colors import LinearSegmentedColormap

    return LinearSegmentedColormap.from_list("below-and-above", TWO_SIDED)


def legend_above(axes: Axes, columns: int = 3) -> None:
    axes.legend(loc="lower right", bbox_to_anchor=(1.0, 1.0), ncols=columns, borderaxespad=0.1)


def legend_beside(axes: Axes) -> None:
    """Where lines go everywhere."""
    axes.legend(loc="upper left", bbox_to_anchor=(1.01, 1.0), borderaxespad=0.0)


def labelled(axes: Axes, title: str, along: str, up: str) -> Axes:
    axes.set_title(title)
    axes.set_xlabel(along)
    axes.set_ylabel(up)
    return axes


def _matplotlib() -> Any:
    try:
        import matplotlib as found
    except ModuleNotFoundError:
        raise ElectrologError(
            "drawing needs matplotlib, which isn't installed",
            "install it with: python -m pip install matplotlib; all numbers are there without it",
        ) from None
    return found
