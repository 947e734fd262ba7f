"""A heading to which the keyboard's focus can be sent, so that what a click opened is where the reader is."""

import traitlets

from audiokit.widgets.look import STATIC, LookWidget


class Spot(LookWidget):
    """A heading of two parts: plain words, and a name that keeps its own direction of writing."""

    _esm = STATIC / "spot.js"
    lead = traitlets.Unicode().tag(sync=True)
    name = traitlets.Unicode().tag(sync=True)

    def reveal(self) -> None:
        """Scroll to the heading and put the focus on it."""
        self.send({"do": "reveal"})
