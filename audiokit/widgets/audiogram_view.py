"""The audiogram of one ear on the screen: the same drawing that a document would hold, with points that take focus."""

from collections.abc import Sequence

import traitlets

from audiokit.widgets.audiogram_svg import Curve, draw_audiogram
from audiokit.widgets.look import STATIC, LookWidget


class AudiogramView(LookWidget):
    """One ear's audiogram; one Tab stop, and arrow keys go from point to point."""

    _esm = STATIC / "audiogram.js"
    svg = traitlets.Unicode().tag(sync=True)

    def __init__(self, ear: str) -> None:
        self.ear = ear
        super().__init__(svg=draw_audiogram(ear, ()))

    def show(self, curves: Sequence[Curve], marked_hz: Sequence[int] = ()) -> None:
        """Draw other tests; see `audiogram_svg.draw_audiogram`."""
        self.svg = draw_audiogram(self.ear, curves, marked_hz)
