"""Size, type and colours of every figure, and its bytes.

Figures are made without pyplot and without the reader's own plotting settings, so that one record gives one figure on
every machine, byte for byte.
"""

from __future__ import annotations

import io
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from functools import cache, wraps
from pathlib import Path
from typing import TYPE_CHECKING, Any, Final, Literal, ParamSpec

from ehmo.errors import InputError, visible
from ehmo.report.look import FIGURE_FONT, LIGHT, LINE_STYLES, LOOKS, Look

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

COLUMN_CM: Final = 8.4
"""Width of one column of a journal [cm]."""

DOUBLE_COLUMN_CM: Final = 17.4
"""Width of two columns [cm]."""

FORMATS: Final = ("svg", "pdf", "png")
"""Formats of a figure, as the end of a file name tells them."""

PIXELS_PER_INCH: Final = 300
"""Resolution of PNG [1/inch]."""

TEXT_POINTS: Final = 7.0
SMALL_POINTS: Final = 6.0
"""Sizes of type [point]."""

CM_PER_INCH: Final = 2.54
POINTS_PER_CM: Final = 72.0 / CM_PER_INCH

_REPLACEMENT = "\ufffd"
Parameters = ParamSpec("Parameters")


def drawn(function: Callable[Parameters, Figure]) -> Callable[Parameters, Figure]:
    """Decorator of a function that makes a figure: it runs under the settings of its ``look``."""

    @wraps(function)
    def under_settings(*args: Parameters.args, **kwargs: Parameters.kwargs) -> Figure:
        look = kwargs.get("look", LIGHT)
        with settings(look if isinstance(look, Look) else LIGHT):
            return function(*args, **kwargs)

    return under_settings


@contextmanager
def settings(look: Look) -> Iterator[None]:
    """Plotting settings of a look, in place of those of the reader."""
    import matplotlib as mpl

    # The back end is the reader's own: nothing here touches it.
    usual = {key: value for key, value in mpl.rcParamsDefault.items() if "backend" not in key}
    chosen: Any = {**usual, **_settings(look)}
    with mpl.rc_context(chosen):
        yield


def _settings(look: Look) -> dict[str, Any]:
    return {
        "font.family": [FIGURE_FONT],
        "font.size": TEXT_POINTS,
        "axes.titlesize": TEXT_POINTS,
        "axes.labelsize": TEXT_POINTS,
        "xtick.labelsize": SMALL_POINTS,
        "ytick.labelsize": SMALL_POINTS,
        "legend.fontsize": SMALL_POINTS,
        "figure.facecolor": look.paper,
        "axes.facecolor": look.paper,
        "savefig.facecolor": "auto",
        "text.color": look.ink,
        "axes.labelcolor": look.ink,
        "axes.edgecolor": look.ink,
        "xtick.color": look.ink,
        "ytick.color": look.ink,
        "grid.color": look.grid,
        "axes.linewidth": 0.6,
        "xtick.major.width": 0.6,
        "ytick.major.width": 0.6,
        "xtick.major.size": 2.5,
        "ytick.major.size": 2.5,
        "lines.linewidth": 1.0,
        "axes.spines.top": False,
        "axes.spines.right": False,
        "figure.constrained_layout.w_pad": 0.03,
        "figure.constrained_layout.h_pad": 0.03,
        "legend.frameon": False,
        "legend.handlelength": 2.2,
        "legend.borderaxespad": 0.2,
        "svg.fonttype": "path",
        "svg.hashsalt": "ehmo",
        "pdf.fonttype": 42,
        "axes.unicode_minus": True,
        "axes.formatter.use_mathtext": False,
        "axes.formatter.useoffset": False,
        "text.usetex": False,
        "text.parse_math": False,
    }


def new_figure(width_cm: float, height_cm: float, *, layout: Literal["constrained"] | None = "constrained") -> Figure:
    """Empty figure of a size on paper.

    Parameters
    ----------
    width_cm, height_cm : float
        [cm]
    layout : {"constrained"} or None
        Layout engine; None where the figure places everything itself.

    Returns
    -------
    figure : Figure
    """
    from matplotlib.figure import Figure

    return Figure(figsize=(width_cm / CM_PER_INCH, height_cm / CM_PER_INCH), layout=layout)


def paper_axes(figure: Figure, below: float = 0.0) -> Axes:
    """Axes over the whole figure whose coordinates are centimetres on paper, from the lower left corner.

    Parameters
    ----------
    figure : Figure
    below : float
        Height of a strip at the lower edge that lies below zero [cm].

    Returns
    -------
    axes : Axes
    """
    width, height = figure.get_size_inches() * CM_PER_INCH
    axes = figure.add_axes((0.0, 0.0, 1.0, 1.0))
    axes.set_xlim(0, width)
    axes.set_ylim(-below, height - below)
    axes.set_xticks([])
    axes.set_yticks([])
    axes.set_axis_off()
    return axes


def axes_at(figure: Figure, left: float, bottom: float, width: float, height: float) -> Axes:
    """Axes at a place on paper, from the lower left corner [cm]."""
    whole_width, whole_height = figure.get_size_inches() * CM_PER_INCH
    return figure.add_axes((left / whole_width, bottom / whole_height, width / whole_width, height / whole_height))


def dashes(symmetry: str) -> Any:
    """Line style of a bond part, as the plotting library takes it."""
    pattern = LINE_STYLES[symmetry]
    return (0, pattern) if pattern else "-"


def plain(text: str) -> str:
    r"""Text from anywhere, such that it can only be drawn: on one line, without letters the font lacks.

    Examples
    --------
    >>> plain("V\u200b1"), plain("Å")
    ('V\\u200b1', 'Å')
    """
    return "".join(char if ord(char) in _letters() else _REPLACEMENT for char in visible(text))


@cache
def _letters() -> frozenset[int]:
    """Letters that the font of the figures has."""
    import matplotlib as mpl
    from matplotlib.ft2font import FT2Font

    path = Path(mpl.get_data_path()) / "fonts" / "ttf" / f"{FIGURE_FONT.replace(' ', '')}.ttf"
    return frozenset(FT2Font(str(path)).get_charmap())


def figure_format(path: str) -> str:
    """Format that the end of a file name asks for.

    Raises
    ------
    InputError
        If it is none of `FORMATS`.
    """
    ending = Path(path).suffix.lower().lstrip(".")
    if ending not in FORMATS:
        raise InputError(
            f"the file name ends in {f'.{ending}' if ending else 'nothing'}, which is no figure format",
            place=path,
            mend=f"end it in {', '.join(f'.{name}' for name in FORMATS[:-1])} or .{FORMATS[-1]}",
        )
    return ending


def figure_bytes(figure: Figure, form: str) -> bytes:
    """Figure as a file: text outlined in SVG, embedded in PDF, no date.

    Parameters
    ----------
    figure : Figure
    form : str
        One of `FORMATS`.

    Returns
    -------
    content : bytes
        The same for the same figure.
    """
    metadata: dict[str, dict[str, Any]] = {
        "svg": {"Date": None, "Creator": "ehmo"},
        "pdf": {"CreationDate": None, "Creator": "ehmo", "Producer": None},
        "png": {"Software": None},
    }
    out = io.BytesIO()
    with settings(LIGHT):
        figure.savefig(out, format=form, dpi=PIXELS_PER_INCH, metadata=metadata[form])
    return out.getvalue()


def look_named(name: str) -> Look:
    """Look by its name.

    Raises
    ------
    InputError
        If there is none of that name.
    """
    if name not in LOOKS:
        raise InputError(f"there is no look {name!r}", mend=f"use {' or '.join(LOOKS)}")
    return LOOKS[name]
