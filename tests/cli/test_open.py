"""`audiokit open`: what it copies, what it starts, and what it refuses to open."""

import json
import os
import sys
import types
from pathlib import Path

import pytest

from audiokit.cli import open as command
from audiokit.cli.main import DONE, FAILED, main
from audiokit.core.errors import OutputError

NOTEBOOK = "yearly_review.ipynb"


@pytest.fixture
def started(monkeypatch: pytest.MonkeyPatch) -> list[list[str]]:
    """The arguments of each start of JupyterLab, which does not really start."""
    calls: list[list[str]] = []
    module = types.ModuleType("jupyterlab.labapp")
    module.LabApp = types.SimpleNamespace(launch_instance=lambda argv: calls.append(argv))  # type: ignore[attr-defined]
    monkeypatch.setitem(sys.modules, "jupyterlab.labapp", module)
    monkeypatch.delenv(command.COHORT_VARIABLE, raising=False)
    return calls


def test_it_copies_the_notebook_and_starts_on_this_machine(tmp_path: Path, started: list[list[str]]) -> None:
    folder = tmp_path / "new" / "work"
    assert main(["open", "--dir", str(folder), "--no-browser"]) == DONE
    assert json.loads((folder / NOTEBOOK).read_text(encoding="utf-8"))["nbformat"] == 4
    (argv,) = started
    assert f"--ServerApp.root_dir={folder}" in argv
    assert "--ServerApp.ip=127.0.0.1" in argv
    assert f"--LabApp.default_url=/doc/tree/{NOTEBOOK}" in argv
    assert "--LabApp.extension_manager=readonly" in argv
    assert "--no-browser" in argv
    assert not [option for option in argv if "token" in option or "port" in option or "root=" in option]


def test_the_default_folder_is_the_one_it_is_called_in(
    tmp_path: Path, started: list[list[str]], monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.chdir(tmp_path)
    assert main(["open"]) == DONE
    assert (tmp_path / NOTEBOOK).is_file()
    assert f"--ServerApp.root_dir={tmp_path.resolve()}" in started[0]
    assert "--no-browser" not in started[0]


def test_what_is_there_is_never_overwritten(tmp_path: Path, started: list[list[str]]) -> None:
    (tmp_path / NOTEBOOK).write_text("mine", encoding="utf-8")
    assert main(["open", "--dir", str(tmp_path)]) == DONE
    assert (tmp_path / NOTEBOOK).read_text(encoding="utf-8") == "mine"
    assert command.copy_notebooks(tmp_path) == []


def test_a_link_to_nowhere_is_left_alone(tmp_path: Path) -> None:
    (tmp_path / "work").mkdir()
    (tmp_path / "work" / NOTEBOOK).symlink_to(tmp_path / "elsewhere.ipynb")
    assert command.copy_notebooks(tmp_path / "work") == []
    assert not (tmp_path / "elsewhere.ipynb").exists()


def test_the_cohort_reaches_the_notebook(
    tmp_path: Path, started: list[list[str]], monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setenv(command.COHORT_VARIABLE, "to be replaced, and put back after the test")
    (tmp_path / "mine").mkdir()
    monkeypatch.chdir(tmp_path)
    assert main(["open", "mine", "--dir", "work"]) == DONE
    assert os.environ[command.COHORT_VARIABLE] == str((tmp_path / "mine").resolve())


def test_both_sides_name_the_same_variable() -> None:
    from audiokit.widgets import folders

    assert folders.COHORT_VARIABLE == command.COHORT_VARIABLE


def test_a_cohort_that_is_not_there_starts_nothing(
    tmp_path: Path, started: list[list[str]], capsys: pytest.CaptureFixture[str]
) -> None:
    assert main(["open", str(tmp_path / "nowhere"), "--dir", str(tmp_path / "work")]) == FAILED
    assert "there is no such folder" in capsys.readouterr().err
    assert started == []
    assert not (tmp_path / "work").exists()


def test_a_folder_that_is_a_file_is_a_message(
    tmp_path: Path, started: list[list[str]], capsys: pytest.CaptureFixture[str]
) -> None:
    (tmp_path / "file").write_text("x", encoding="utf-8")
    assert main(["open", "--dir", str(tmp_path / "file")]) == FAILED
    assert "choose another folder with --dir" in capsys.readouterr().err
    assert started == []


def test_options_of_jupyterlab_are_passed_on(tmp_path: Path, started: list[list[str]]) -> None:
    words = [
        "open",
        "--allow-root",
        "--dir",
        str(tmp_path),
        "--port",
        "9123",
        "--IdentityProvider.token=abc",
        "--debug",
    ]
    assert main(words) == DONE
    (argv,) = started
    for option in ("--allow-root", "--IdentityProvider.token=abc", "--debug"):
        assert option in argv
    assert argv.count("--ServerApp.port=9123") == 1
    assert "--ServerApp.port_retries=0" in argv


@pytest.mark.parametrize(
    "options",
    [
        ["--ip=0.0.0.0"],
        ["--ip", "0.0.0.0"],
        ["--ip=*"],
        ["--ServerApp.ip="],
        ["--ServerApp.ip=192.168.0.7"],
        ["--IdentityProvider.token="],
        ["--IdentityProvider.token=''"],
        ["--ServerApp.token", ""],
        ["--ServerApp.token="],
        ["--ServerApp.allow_unauthenticated_access=True"],
        ["--ServerApp.allow_remote_access=True"],
        ["--ServerApp.disable_check_xsrf=True"],
        ["second_cohort"],
    ],
)
def test_no_option_opens_a_door(
    tmp_path: Path, started: list[list[str]], capsys: pytest.CaptureFixture[str], options: list[str]
) -> None:
    (tmp_path / "mine").mkdir()
    assert main(["open", str(tmp_path / "mine"), "--dir", str(tmp_path), *options]) == FAILED
    assert capsys.readouterr().err.startswith("audiokit: ")
    assert started == []


@pytest.mark.parametrize("option", ["--ip=localhost", "--ServerApp.ip=127.0.0.1"])
def test_this_machine_may_be_named(tmp_path: Path, started: list[list[str]], option: str) -> None:
    assert main(["open", "--dir", str(tmp_path), option]) == DONE
    assert [given for given in started[0] if "ip" in given.partition("=")[0]] == [option]


def test_the_shipped_settings_ask_nobody_anything() -> None:
    argv = command.lab_arguments(Path(), None, False, [])
    (settings,) = [Path(option.partition("=")[2]) for option in argv if option.startswith("--LabApp.app_settings_dir=")]
    overrides = json.loads((settings / "overrides.json").read_text(encoding="utf-8"))
    asked = overrides["@jupyterlab/apputils-extension:notification"]
    assert asked == {"fetchNews": "false", "checkForUpdates": False}
    page = json.loads((settings / "page_config.json").read_text(encoding="utf-8"))
    assert page["disabledExtensions"]["@jupyterlab/extensionmanager-extension"] is True


def test_an_installation_without_notebooks_says_so(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(command.resources, "files", lambda _package: tmp_path / "audiokit")
    with pytest.raises(OutputError, match="not part of this installation"):
        command.notebooks_home()


def test_installed_notebooks_come_before_those_beside_the_package(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    for home in (tmp_path / "audiokit" / "notebooks", tmp_path / "notebooks"):
        home.mkdir(parents=True)
        (home / NOTEBOOK).write_text("{}", encoding="utf-8")
    monkeypatch.setattr(command.resources, "files", lambda _package: tmp_path / "audiokit")
    assert command.notebooks_home() == tmp_path / "audiokit" / "notebooks"


def test_help_says_what_is_passed_on(capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["open", "--help"]) == DONE
    assert "--allow-root" in capsys.readouterr().out
