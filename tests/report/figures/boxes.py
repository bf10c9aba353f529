"""Where the words of a figure stand."""

import numpy as np
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.text import Text

from ehmo.report.figures.canvas import settings
from ehmo.report.look import LIGHT


def words(figure):
    """Every piece of text that shows, with its rectangle in pixels of 1/100 inch."""
    with settings(LIGHT):
        canvas = FigureCanvasAgg(figure)
        canvas.draw()
        renderer = canvas.get_renderer()
        return [
            (text.get_text(), np.array(Text.get_window_extent(text, renderer).extents))
            for text in texts(figure)
            if text.get_visible() and text.get_text().strip()
        ]


def texts(figure):
    """Text of a figure that is drawn; tick labels beyond the limits of an axis are not."""
    found = [*figure.texts]
    for legend in figure.legends:
        found += legend.get_texts()
    for axes in figure.axes:
        found += [*axes.texts, axes.title, axes._left_title, axes._right_title]
        if axes.get_legend():
            found += axes.get_legend().get_texts()
        if axes.axison:
            for axis in (axes.xaxis, axes.yaxis):
                low, high = sorted(axis.get_view_interval())
                ticks = [tick for tick in axis.get_major_ticks() if low - 1e-9 <= tick.get_loc() <= high + 1e-9]
                found += [axis.label, *(label for tick in ticks for label in (tick.label1, tick.label2))]
    return found


def overlapping(figure, slack=0.5):
    """Pairs of words whose rectangles overlap by more than the slack [pixel]."""
    found = words(figure)
    pairs = []
    for k, (one, a) in enumerate(found):
        for other, b in found[k + 1 :]:
            width = min(a[2], b[2]) - max(a[0], b[0])
            height = min(a[3], b[3]) - max(a[1], b[1])
            if width > slack and height > slack:
                pairs.append((one, other))
    return pairs


def outside(figure, slack=0.5):
    """Words that run over the edge of the figure."""
    width, height = figure.get_size_inches() * figure.dpi
    return [
        text
        for text, box in words(figure)
        if box[0] < -slack or box[1] < -slack or box[2] > width + slack or box[3] > height + slack
    ]
