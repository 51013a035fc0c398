"""The chain drawn on paper, from the same geometry as on the screen. reportlab is met only here."""

from typing import Any

from programme.drawing.chain import CELL, chain_links, chain_size

WORDS_H = 74.0
NAME_PT, WORD_PT = 8.0, 6.2
MOST_LINES = 3
INK = (0.114, 0.165, 0.2)


def _path(stroke: Any, scale: float, top: float) -> Any:
    from reportlab.graphics.shapes import ArcPath
    from reportlab.lib.colors import Color

    path = ArcPath(strokeColor=Color(*INK), strokeWidth=stroke.width * scale, fillColor=None)
    before = (0.0, 0.0)
    for kind, *numbers in stroke.steps:
        x, y = numbers[-2] * scale, top - numbers[-1] * scale
        if kind == "M":
            path.moveTo(x, y)
        elif kind == "L":
            path.lineTo(x, y)
        else:
            # A half turn clockwise on the screen: right end goes down, left end comes up.
            radius = numbers[0] * scale
            is_down = y < before[1]
            centre = (before[0], (before[1] + y) / 2)
            start = 90 if is_down else -90
            path.addArc(*centre, radius, start - 180, start, reverse=True)
        before = (x, y)
    return path


def _lines(text: str, width: float, font: str, size: float) -> list[str]:
    """The words broken to the width, at most so many lines; the last one says that more follows."""
    from reportlab.lib.utils import simpleSplit

    lines: list[str] = simpleSplit(text, font, size, width)
    if len(lines) > MOST_LINES:
        lines = [*lines[: MOST_LINES - 1], f"{lines[MOST_LINES - 1]} ..."]
    return lines


def chain_drawing(chain: Any, *, width_pt: float, font: str, bold: str) -> Any:
    """The chain of six with names, states and figures, as a reportlab Drawing.

    Args:
        chain: a `Chain`.
        width_pt: width on paper, points.
        font: registered font of the words.
        bold: registered font of the names.
    """
    from reportlab.graphics.shapes import Drawing, String

    states = [link.state for link in chain.links]
    wide, high = chain_size(states)
    scale = width_pt / wide
    height = high * scale + WORDS_H
    drawing = Drawing(width_pt, height)
    for drawn in chain_links(states):
        for stroke in drawn.strokes:
            drawing.add(_path(stroke, scale, height))
    cell = CELL * scale
    for index, link in enumerate(chain.links):
        middle, y = (index + 0.5) * cell, WORDS_H - 9
        rows = (
            (link.name, bold, NAME_PT),
            (link.state_says, bold if link.is_broken else font, WORD_PT),
            (link.figure, font, WORD_PT),
            (link.basis, font, WORD_PT),
        )
        for text, face, size in rows:
            for line in _lines(text, cell - 6, face, size):
                drawing.add(
                    String(middle, y, line, fontName=face, fontSize=size, textAnchor="middle")
                )
                y -= size + 1.6
            y -= 1
    return drawing
