"""The command's promise: exit 0 and everything written, or exit 2, nothing written and one line."""

from __future__ import annotations

import json
import subprocess
import sys
from collections.abc import Callable
from pathlib import Path

import pytest
from canonical import tables, xlsx
from openpyxl import load_workbook

from cant import cli, service
from cant.limit_sets import names

Outcome = tuple[int, str, str]
Run = Callable[..., Outcome]


@pytest.fixture
def run(capfd: pytest.CaptureFixture[str]) -> Run:
    def call(*arguments: object) -> Outcome:
        with pytest.raises(SystemExit) as ended:
            cli.main([str(argument) for argument in arguments])
        out, err = capfd.readouterr()
        return int(ended.value.code or 0), out, err

    return call


@pytest.fixture
def here(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    monkeypatch.chdir(tmp_path)
    return tmp_path


def refused(outcome: Outcome) -> str:
    """Assert that a command was refused as promised; give its one line."""
    code, out, err = outcome
    assert code == 2
    assert out == ""
    assert err.endswith("\n")
    assert err.count("\n") == 1
    assert "Traceback" not in err
    assert "error of the program itself" not in err
    return err


def test_the_sample_line_is_planned(run: Run, here: Path, sample_file: Path) -> None:
    code, out, err = run("plan", sample_file)
    assert code == 0
    assert sorted(p.name for p in here.iterdir()) == [
        "dunmarrow_keldrith-plan.json",
        "dunmarrow_keldrith-plan.xlsx",
    ]
    for name in ("dunmarrow_keldrith-plan.json", "dunmarrow_keldrith-plan.xlsx"):
        assert name in out
    assert "planning aid" in out
    assert err.count("\n") == 1
    assert "not assessed" in err
    document = json.loads((here / "dunmarrow_keldrith-plan.json").read_text(encoding="utf-8"))
    assert set(document) >= {"curves", "rejected", "questions", "limits", "settings", "findings"}
    sheets = load_workbook(here / "dunmarrow_keldrith-plan.xlsx").sheetnames
    assert sheets[:4] == ["Curves", "Traffic", "Limits", "Settings"]
    assert "Plan summary" in sheets


def test_only_what_is_asked_for_is_written(run: Run, here: Path, sample_file: Path) -> None:
    code, out, _ = run("plan", sample_file, "--json", "p.json")
    assert code == 0
    assert [p.name for p in here.iterdir()] == ["p.json"]
    assert "p.json" in out


def test_csv_with_a_named_set_and_a_method(run: Run, here: Path, root: Path) -> None:
    samples = root / "sample_data"
    code, out, _ = run(
        "plan",
        samples / "ostwell_branch.csv",
        "--traffic",
        samples / "ostwell_traffic.csv",
        "--limits",
        "typical",
        "--method",
        "rms",
        "--out",
        "b.xlsx",
        "--json",
        "b.json",
    )
    assert code == 0
    assert "UNVERIFIED" in out
    document = json.loads((here / "b.json").read_text(encoding="utf-8"))
    assert len(document["curves"]) == 4
    assert document["limits"]["verified"] is False
    assert document["settings"]["method"] == "rms"
    assert load_workbook(here / "b.xlsx").sheetnames


def test_read_shows_and_writes_how_a_file_is_understood(run: Run, here: Path, sample_file: Path) -> None:
    code, out, err = run("read", sample_file, "--json", "r.json")
    assert code == 0
    assert "Radius" in out
    assert err.count("\n") == 1
    assert json.loads((here / "r.json").read_text(encoding="utf-8"))


def test_limit_sets_are_listed_and_printed(run: Run) -> None:
    code, out, err = run("limits")
    assert (code, err) == (0, "")
    for name in names():
        assert name in out
    for name in names():
        code, out, err = run("limits", name)
        assert (code, err) == (0, "")
        assert "Quantity" in out


def test_the_template_is_a_workbook(run: Run, here: Path) -> None:
    code, out, _ = run("template", "empty.xlsx")
    assert code == 0
    assert "empty.xlsx" in out
    assert {"Curves", "Traffic", "Limits", "Settings"} <= set(load_workbook(here / "empty.xlsx").sheetnames)


@pytest.mark.parametrize(
    ("arguments", "says"),
    [
        ([], "command"),
        (["fly"], "fly"),
        (["plan"], "CURVES"),
        (["plan", "{sample}", "--colour", "red"], "--colour"),
        (["plan", "{sample}", "--method", "guess"], "guess"),
        (["plan", "{sample}", "--limits", "nowhere"], "typical"),
        (["plan", "none.xlsx"], "no such file"),
        (["plan", "."], "folder"),
        (["plan", "{sample}", "--traffic", "none.csv"], "none.csv"),
        (["plan", "{sample}", "--out", "no/such/folder.xlsx"], "folder does not exist"),
        (["plan", "{sample}", "--out", "a.xlsx", "--json", "a.xlsx"], "two outputs"),
        (["plan", "{sample}", "--out", "plan.pdf"], ".xlsx"),
        (["plan", "{copy}", "--out", "{copy}"], "overwritten"),
        (["plan", "noise.xlsx"], "noise.xlsx"),
        (["plan", "empty.csv"], "empty.csv"),
        (["plan", "{branch}"], "--traffic"),
        (["plan", "{branch}", "--traffic", "{traffic}"], "--limits"),
        (["plan", "{sample}", "--reading", "noise.xlsx"], "JSON or TOML"),
        (["read", "none.xlsx"], "no such file"),
        (["limits", "nothing"], "typical"),
        (["template", "empty.csv"], ".xlsx"),
        (["serve", "--port", "many"], "many"),
    ],
)
def test_what_cannot_be_done_is_refused_in_one_line(
    arguments: list[str], says: str, run: Run, here: Path, root: Path, sample_file: Path
) -> None:
    (here / "copy.xlsx").write_bytes(sample_file.read_bytes())
    (here / "noise.xlsx").write_bytes(bytes(range(256)) * 20)
    (here / "empty.csv").write_bytes(b"")
    before = {p.name: p.read_bytes() for p in here.iterdir()}
    named = {
        "sample": sample_file,
        "copy": here / "copy.xlsx",
        "branch": root / "sample_data" / "ostwell_branch.csv",
        "traffic": root / "sample_data" / "ostwell_traffic.csv",
    }
    line = refused(run(*(argument.format(**named) for argument in arguments)))
    assert says in line
    assert {p.name: p.read_bytes() for p in here.iterdir()} == before


def test_an_output_that_fails_leaves_no_other(
    run: Run, here: Path, sample_file: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    def full(self: object, also: object) -> object:
        yield b"{"
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(service.PlannedLine, "json_chunks", full)
    assert "No space left" in refused(run("plan", sample_file))
    assert list(here.iterdir()) == []


def test_a_fault_of_the_program_is_one_line_too(
    run: Run, here: Path, sample_file: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    def broken(*_: object, **__: object) -> None:
        message = "a\nfault"
        raise RuntimeError(message)

    monkeypatch.setattr(service, "make_plan", broken)
    monkeypatch.delenv("CANT_TRACEBACK", raising=False)
    code, out, err = run("plan", sample_file)
    assert (code, out, err.count("\n")) == (2, "", 1)
    assert "CANT_TRACEBACK" in err


def test_the_module_and_the_console_script_are_the_same_command(root: Path) -> None:
    module = subprocess.run(
        [sys.executable, "-m", "cant", "limits"], capture_output=True, text=True, cwd=root, check=True
    )
    script = subprocess.run(
        [str(Path(sys.executable).with_name("cant")), "limits"],
        capture_output=True,
        text=True,
        cwd=root,
        check=True,
    )
    assert module.stdout == script.stdout
    assert "typical" in module.stdout


def test_serve_finds_the_web_service_by_name(run: Run, monkeypatch: pytest.MonkeyPatch) -> None:
    called: list[tuple[str, int]] = []

    class Entry:
        def load(self) -> Callable[..., None]:
            return lambda host, port: called.append((host, port))

    monkeypatch.setattr(cli, "entry_points", lambda **_: [Entry()])
    assert run("serve", "--port", "9001")[0] == 0
    assert called == [("127.0.0.1", 9001)]


def test_a_list_of_nothing_but_bad_rows_is_still_answered(run: Run, here: Path) -> None:
    sheets = tables()
    for row in sheets["Curves"][1:]:
        row[5] = "sharp"
    (here / "bad.xlsx").write_bytes(xlsx(sheets))
    code, _, err = run("plan", "bad.xlsx", "--out", "o.xlsx", "--json", "o.json")
    assert code == 0
    assert "4 rows were not assessed" in err
    document = json.loads((here / "o.json").read_text(encoding="utf-8"))
    assert document["curves"] == []
    assert len(document["rejected"]) == 4
    head, *rows = load_workbook(here / "o.xlsx")["Curves"].iter_rows(values_only=True)
    assert [row[head.index("Status")] for row in rows] == ["not assessed"] * 4


def test_answers_reach_the_reading(run: Run, here: Path) -> None:
    (here / "line.xlsx").write_bytes(xlsx(tables()))
    (here / "answers.json").write_text(
        json.dumps({"columns": {"Curves": {"Cant (mm)": {"meaning": "Cant", "unit": "in"}}}})
    )
    code, _, _ = run("plan", "line.xlsx", "--reading", "answers.json", "--json", "o.json")
    assert code == 0
    document = json.loads((here / "o.json").read_text(encoding="utf-8"))
    assert all(row["column"].startswith("Cant") for row in document["rejected"])
    assert len(document["rejected"]) == 4, "40 to 70 inches of cant are refused"
