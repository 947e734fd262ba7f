"""`audiokit open`: put the notebooks into a folder and start JupyterLab there, on this machine only."""

import argparse
import os
import shutil
import sys
from collections.abc import Sequence
from importlib import resources
from pathlib import Path
from typing import Any

from audiokit.cli.console import printable
from audiokit.core.errors import CohortError, OutputError

FIRST_NOTEBOOK = "yearly_review.ipynb"
COHORT_VARIABLE = "AUDIOKIT_COHORT"
"""Environment variable that tells the notebook which cohort to begin with."""

_LOOPBACK = ("127.0.0.1", "localhost", "::1")


class _PassingParser(argparse.ArgumentParser):
    """Keeps the options it does not know, for JupyterLab, instead of refusing them."""

    def parse_known_args(self, args: Any = None, namespace: Any = None) -> Any:
        known, unknown = super().parse_known_args(args, namespace)
        known.passed_on = unknown
        return known, []


def register(subparsers: Any) -> None:
    """Add the subcommand to the parser of `audiokit`."""
    parser = subparsers.add_parser(
        "open",
        help="open the notebooks in the browser",
        description="Copies the notebooks that are missing into a folder and starts JupyterLab there. The server "
        "listens on this machine only and asks for its token. Options that are not listed here go to JupyterLab, for "
        "example --allow-root.",
        usage="audiokit open [COHORT] [--dir DIR] [--port PORT] [--no-browser] [JupyterLab options ...]",
        allow_abbrev=False,
    )
    parser.__class__ = _PassingParser
    parser.add_argument("cohort", metavar="COHORT", nargs="?", type=Path, help="cohort folder to begin with")
    parser.add_argument(
        "--dir", metavar="DIR", type=Path, default=Path(), help="folder for the notebooks (default: this folder)"
    )
    parser.add_argument("--port", metavar="PORT", type=int, help="port to listen on (default: JupyterLab's own choice)")
    parser.add_argument("--no-browser", action="store_true", help="print the address, open no browser")
    parser.set_defaults(run=_run)


def _run(arguments: argparse.Namespace) -> int:
    _refuse_open_doors(arguments.passed_on)
    if arguments.cohort is not None:
        cohort = arguments.cohort.expanduser().resolve()
        if not cohort.is_dir():
            raise CohortError(f"{cohort}: there is no such folder", "name the folder that holds people and tests")
        os.environ[COHORT_VARIABLE] = str(cohort)
    folder = arguments.dir.expanduser().resolve()
    copied = copy_notebooks(folder)
    told = f"{', '.join(copied)} copied" if copied else "all there, none replaced"
    print(printable(f"notebooks in {folder}: {told}"))
    sys.stdout.flush()
    _start(lab_arguments(folder, arguments.port, arguments.no_browser, arguments.passed_on))
    return 0


def notebooks_home() -> Path:
    """Where the notebooks lie: in the installed package, or beside it in a checkout.

    Raises OutputError where neither has any.
    """
    package = Path(str(resources.files("audiokit")))
    for home in (package / "notebooks", package.parent / "notebooks"):
        if (home / FIRST_NOTEBOOK).is_file():
            return home
    raise OutputError(f"{FIRST_NOTEBOOK} is not part of this installation", "install audiokit again")


def copy_notebooks(folder: Path) -> list[str]:
    """Copy the notebooks that `folder` lacks into it; what is there stays as it is. Returns the names copied.

    Raises OutputError where the folder cannot be made or written.
    """
    copied = []
    try:
        folder.mkdir(parents=True, exist_ok=True)
        for notebook in sorted(notebooks_home().glob("*.ipynb")):
            target = folder / notebook.name
            if not os.path.lexists(target):
                shutil.copyfile(notebook, target)
                copied.append(notebook.name)
    except OSError as error:
        raise OutputError(
            f"{folder}: notebooks cannot be put here ({error.strerror})", "choose another folder with --dir"
        ) from error
    return copied


def lab_arguments(folder: Path, port: int | None, no_browser: bool, passed_on: Sequence[str]) -> list[str]:
    """The arguments JupyterLab is started with: nothing is fetched, and its token is made anew at each start."""
    settings = Path(str(resources.files("audiokit"))) / "widgets" / "lab_settings"
    return [
        f"--ServerApp.root_dir={folder}",
        f"--LabApp.default_url=/doc/tree/{FIRST_NOTEBOOK}",
        f"--LabApp.app_settings_dir={settings}",
        "--LabApp.extension_manager=readonly",
        *([] if port is None else [f"--ServerApp.port={port}", "--ServerApp.port_retries=0"]),
        *(["--no-browser"] if no_browser else []),
        *([] if any(_last_word(option) == "ip" for option in passed_on) else ["--ServerApp.ip=127.0.0.1"]),
        *passed_on,
    ]


def _refuse_open_doors(passed_on: Sequence[str]) -> None:
    """Hearing data are health data: no option may open the server to other machines or take its token away."""
    if passed_on and not passed_on[0].startswith("-"):
        raise CohortError(f"{passed_on[0]!r} was not expected", "name one cohort folder at most")
    for at, option in enumerate(passed_on):
        name, given, value = option.partition("=")
        if not given:
            value = passed_on[at + 1] if at + 1 < len(passed_on) else ""
        value = value.strip("\"'")
        short = _last_word(name)
        if short == "ip" and value not in _LOOPBACK:
            raise OutputError(f"{option}: audiokit serves this machine only", "leave the option out")
        if short in ("token", "password", "hashed_password", "identity_provider_class") and not value:
            raise OutputError(f"{option}: the server keeps its token", "leave the option out")
        if short in ("allow_unauthenticated_access", "disable_check_xsrf", "allow_remote_access") and value != "False":
            raise OutputError(f"{option}: the server keeps its doors closed", "leave the option out")


def _last_word(option: str) -> str:
    """What an option sets: ip for --ip, --ServerApp.ip and --ServerApp.ip=127.0.0.1."""
    return option.partition("=")[0].lstrip("-").rpartition(".")[2]


def _start(argv: list[str]) -> None:
    # jsonschema would build an optional grammar when Jupyter imports it, which takes seconds; it does without.
    sys.modules.setdefault("rfc3987_syntax", None)  # type: ignore[arg-type]
    from jupyterlab.labapp import LabApp

    LabApp.launch_instance(argv=argv)
