"""What a reader needs of a figure: everything inside the page, axes named, legends apart from titles."""

from __future__ import annotations

from matplotlib.backends.backend_agg import FigureCanvasAgg, RendererAgg
from matplotlib.figure import Figure
from matplotlib.text import Text
from matplotlib.transforms import Bbox

SLACK = 1.0
"""Pixels."""


def drawn(figure: Figure) -> tuple[RendererAgg, list[Text]]:
    """The renderer, and the texts that reach the page (ticks outside the limits have labels that do not)."""
    canvas = FigureCanvasAgg(figure)
    canvas.draw()
    renderer = canvas.get_renderer()
    shown: list[Text] = []

    class Spy(RendererAgg):
        def draw_text(self, gc, x, y, s, prop, angle, ismath=False, mtext=None):
            if mtext is not None:
                shown.append(mtext)
            super().draw_text(gc, x, y, s, prop, angle, ismath, mtext)

    figure.draw(Spy(int(figure.bbox.width), int(figure.bbox.height), figure.dpi))
    return renderer, list(dict.fromkeys(shown))


def visible_texts(figure: Figure) -> list[tuple[str, Bbox]]:
    """Every text that is drawn, with its extent in pixels."""
    renderer, texts = drawn(figure)
    return [(text.get_text(), text.get_window_extent(renderer)) for text in texts if text.get_text().strip()]


def clipped(figure: Figure) -> list[str]:
    """Texts that reach beyond the page."""
    page = figure.bbox
    return [
        text for text, box in visible_texts(figure)
        if box.x0 < page.x0 - SLACK or box.y0 < page.y0 - SLACK or box.x1 > page.x1 + SLACK or box.y1 > page.y1 + SLACK
    ]  # fmt: skip


def overlapping(figure: Figure) -> list[tuple[str, str]]:
    """Headings and legends that lie on each other."""
    renderer, _ = drawn(figure)
    boxes: list[tuple[str, Bbox]] = []
    if figure.get_suptitle():
        boxes.append(("heading", figure._suptitle.get_window_extent(renderer)))  # type: ignore[attr-defined]
    titles = [title for a in figure.axes for title in (a.title, a._left_title, a._right_title)]  # type: ignore[attr-defined]
    boxes += [(title.get_text(), title.get_window_extent(renderer)) for title in titles if title.get_text()]
    boxes += [("legend", legend.get_window_extent(renderer)) for legend in figure.legends]
    found = []
    for n, (name, box) in enumerate(boxes):
        for other, second in boxes[n + 1 :]:
            if box.x0 < second.x1 and second.x0 < box.x1 and box.y0 < second.y1 and second.y0 < box.y1:
                found.append((name, other))
    return found
