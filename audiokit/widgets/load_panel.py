"""Choosing a cohort folder and its settings, loading it, and saying how far that is."""

import datetime
from collections.abc import Callable
from pathlib import Path
from typing import Any

import ipywidgets as widgets

from audiokit.core.errors import AudiokitError
from audiokit.io.cohort import read_cohort
from audiokit.surveillance.review import Review, review
from audiokit.widgets.folders import cohort_folders, first_choice
from audiokit.widgets.look import status

ANOTHER = "another folder …"
_FILE_SAYS = "as cohort.toml says"
_OWN_WIDTH = {"description_width": "initial"}


class LoadPanel(widgets.VBox):
    """The settings of a review, the button that runs it, and a line that says what happened.

    on_start  : called before loading, so that nobody reads an old answer for a new one
    on_loaded : called with the finished review
    """

    def __init__(
        self, base: Path, cohort: str | Path | None, on_start: Callable[[], None], on_loaded: Callable[[Review], None]
    ) -> None:
        self._base, self._on_start, self._on_loaded = base, on_start, on_loaded
        folders = cohort_folders(base)
        first = first_choice(folders) if cohort is None else str(cohort)
        if first and (base / first).is_relative_to(base):
            first = (base / first).relative_to(base).as_posix()
        listed = list(dict.fromkeys([*([first] if first else []), *folders]))
        self.folder = widgets.Dropdown(
            options=[*((name, name) for name in listed), (ANOTHER, "")],
            value=first,
            description="Cohort",
            style=_OWN_WIDTH,
        )
        self.other = widgets.Text(
            description="Folder", placeholder="path of a cohort folder", style=_OWN_WIDTH, continuous_update=False
        )
        self.as_of = widgets.DatePicker(description="As of", style=_OWN_WIDTH)
        self.age_correction = widgets.Dropdown(
            options=[(_FILE_SAYS, "file"), ("on", "on"), ("off", "off")], description="Age correction", style=_OWN_WIDTH
        )
        self.revision = widgets.Dropdown(
            options=[
                (_FILE_SAYS, "file"),
                ("by reviewers' decisions", "reviewed"),
                ("by the published rules", "automatic"),
            ],
            description="Baselines revised",
            style=_OWN_WIDTH,
        )
        self.button = widgets.Button(description="Load", icon="refresh", button_style="primary")
        self.bar = widgets.IntProgress(min=0, max=100, description="Progress", style=_OWN_WIDTH)
        self.told = widgets.HTML()
        self.button.on_click(lambda _: self.load())
        for control in self._settings():
            control.observe(self._changed, "value")
        self._show_other()
        self.bar.layout.display = "none"
        row = widgets.Box([*self._settings(), self.button]).add_class("ak-controls")
        super().__init__([row, widgets.Box([self.bar, self.told]).add_class("ak-told")])
        self.tell("Choose a cohort folder, then press Load. A blank date means: as cohort.toml says, else today.")

    def _settings(self) -> tuple[Any, ...]:
        return self.folder, self.other, self.as_of, self.age_correction, self.revision

    def tell(self, message: str, mend: str = "", kind: str = "note") -> None:
        """Say what happened, in the line that screen readers follow."""
        self.told.value = status(message, mend, kind)

    def chosen(self) -> Path | None:
        """The folder chosen, None where none is; a relative one counts from the notebook's folder."""
        name = self.folder.value or self.other.value.strip()
        return self._base / Path(name).expanduser() if name else None

    def load(self) -> None:
        """Read and review the chosen folder; a problem becomes a message with its mend."""
        self._on_start()
        folder = self.chosen()
        if folder is None:
            self.tell("No folder is named.", "type the path of a cohort folder into the field Folder", "error")
            return
        self.button.disabled = True
        self.bar.value, self.bar.layout.display = 0, ""
        try:
            found = self._review(folder)
            self._progress("drawing", 95)
            self._on_loaded(found)
            self.tell(f"Loaded: {found.cohort.settings.name}.")
        except AudiokitError as error:
            self.tell(error.message, error.mend, "error")
        except OSError as error:
            self.tell(f"{folder}: {error.strerror or error}", "check the path and the right to read it", "error")
        except Exception as error:  # A defect: say so rather than leave the reader waiting, and let it be logged.
            self._on_start()
            self.tell(f"This cohort cannot be shown: {error!r}", "report this message with the version used", "error")
            raise
        finally:
            self.button.disabled = False
            self.bar.layout.display = "none"

    def _review(self, folder: Path) -> Review:
        self._progress(f"opening {folder.name}", 5)
        as_of: datetime.date | None = self.as_of.value
        cohort = read_cohort(
            folder,
            as_of=as_of,
            age_correction={"on": True, "off": False}.get(self.age_correction.value),
            baseline_revision=None if self.revision.value == "file" else self.revision.value,
            progress=lambda words: self._progress(words, min(60, self.bar.value + 10)),
        )

        def judged(words: str, done: int | None, total: int | None) -> None:
            self._progress(words, 60 + 30 * done // total if done is not None and total else max(60, self.bar.value))

        return review(cohort, progress=judged)

    def _progress(self, words: str, share: int) -> None:
        self.bar.value = share
        self.tell(words, kind="busy")

    def _changed(self, _change: Any) -> None:
        self._show_other()
        self.tell("The settings were changed: press Load to see what they give.")

    def _show_other(self) -> None:
        self.other.layout.display = "none" if self.folder.value else ""
