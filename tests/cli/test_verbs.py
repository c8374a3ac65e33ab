"""The verbs as a person or script runs them."""

import json
import os
import re
import signal
import socket
import sqlite3
import subprocess
import sys
import time
import urllib.error
import urllib.request
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import pytest

from tests.evaluation.test_back_and_mass_titre import RECORDS as RECORDS_BY_ROUTE

ROOT = Path(__file__).resolve().parents[2]
RECORDS = ROOT / "tests" / "reference" / "records"


def run(*arguments: object, cwd: Path = ROOT) -> subprocess.CompletedProcess[str]:
    """Run a verb and return what it said."""
    return subprocess.run(
        [sys.executable, "-m", "server", *(str(one) for one in arguments)],
        cwd=cwd,
        env=_environment(),
        capture_output=True,
        text=True,
        encoding="utf-8",
        timeout=120,
        check=False,
    )


def _environment() -> dict[str, str]:
    kept = {k: v for k, v in os.environ.items() if not k.startswith("TITRANT_LEDGER")}
    return {**kept, "PYTHONPATH": str(ROOT), "PYTHONUTF8": "1"}


def test_evaluate_prints_the_result_of_a_published_example() -> None:
    """EURACHEM/CITAC CG 4 (QUAM:2012), example A2: 0.10214 mol/L, u 0.00010."""
    done = run("evaluate", RECORDS / "quam-a2.json", "--monte-carlo", "20000", "--seed", "7")

    assert done.returncode == 0, done.stderr
    assert done.stderr == ""
    result = json.loads(done.stdout)
    assert result["format"] == "bench-result/1"
    assert round(result["concentration"]["value"], 5) == 0.10214
    assert round(result["concentration"]["u"], 5) == 0.00010
    assert result["monte_carlo"]["trials"] >= 20000
    assert result["monte_carlo"]["seed"] == 7


@pytest.mark.parametrize(
    ("name", "reported"),
    [("zero by blank", " mol/L (k = 2.0)"), ("mass titre", " mg/mL (k = 2.0)")],
)
def test_evaluate_of_back_titrations_and_mass_titres_prints_the_result(
    tmp_path: Path, name: str, reported: str
) -> None:
    path = tmp_path / "record.json"
    path.write_text(json.dumps(RECORDS_BY_ROUTE[name]()))

    done = run("evaluate", path)

    assert done.returncode == 0, done.stderr
    found = json.loads(done.stdout)["concentration"]
    assert found["value"] == pytest.approx(5.0 if name == "mass titre" else 0.1, rel=1e-9)
    assert found["reported"].endswith(reported)


def test_evaluate_of_a_mass_titre_without_minutes_names_their_place(tmp_path: Path) -> None:
    record = RECORDS_BY_ROUTE["mass titre"]()
    del record["replicates"][0]["minutes"]
    path = tmp_path / "record.json"
    path.write_text(json.dumps(record))

    done = run("evaluate", path)

    assert done.returncode == 2
    assert json.loads(done.stderr)["field"] == "replicates[0].minutes"


def test_evaluate_of_findings_that_fail_still_ends_well() -> None:
    done = run("evaluate", RECORDS / "quam-a2.json")

    assert any(one["verdict"] == "fails" for one in json.loads(done.stdout)["findings"])
    assert done.returncode == 0


@pytest.mark.parametrize(
    ("content", "field"),
    [
        (b"{not json", "FILE.json"),
        (b"\xff\xfe\x00", "FILE.json"),
        (b'{"format": "bench-record/1", "format": "bench-record/1"}', "FILE.json"),
        (b"[" * 100_000, "FILE.json"),
        (b"[]", None),
        (b'{"format": "bench-record/9"}', "format"),
        (b'{"format": "bench-record/1", "colour": "pink"}', "colour"),
    ],
    ids=["no json", "no utf-8", "key twice", "deep", "no object", "other format", "unknown key"],
)
def test_evaluate_of_what_cannot_be_read_ends_with_2_and_a_problem(
    tmp_path: Path, content: bytes, field: str | None
) -> None:
    path = tmp_path / "record.json"
    path.write_bytes(content)

    done = run("evaluate", path)

    assert done.returncode == 2
    assert done.stdout == ""
    problem = json.loads(done.stderr)
    assert problem["title"]
    assert problem["detail"]
    if field is not None:
        assert problem["field"] == field


def test_evaluate_of_a_negative_mass_names_its_place(tmp_path: Path) -> None:
    record = json.loads((RECORDS / "quam-a2.json").read_text())
    record["replicates"][0] = {"mass": "-0.3888", "burette": [["0.00", "18.64"]]}
    path = tmp_path / "record.json"
    path.write_text(json.dumps(record))

    done = run("evaluate", path)

    assert done.returncode == 2
    assert json.loads(done.stderr)["field"].startswith("replicates[0]")


def test_evaluate_of_a_file_that_is_not_there_ends_with_2(tmp_path: Path) -> None:
    done = run("evaluate", tmp_path / "gone.json")

    assert done.returncode == 2
    assert "gone.json" in json.loads(done.stderr)["detail"]


def test_evaluate_agrees_with_every_expected_record() -> None:
    """All of the records from an independent calculation: c within 5e-6, u within 0.5 %, k 0.02."""
    expected = json.loads((RECORDS / "expected.json").read_text())
    from server.evaluation.entrance import evaluate

    names = sorted(path.stem for path in RECORDS.glob("*.json") if path.stem != "expected")
    assert names
    held: Any = expected.get("records", expected)
    for name in names:
        wanted = held.get(name, held.get(f"{name}.json"))
        found = evaluate(json.loads((RECORDS / f"{name}.json").read_text()))["concentration"]
        assert found["value"] == pytest.approx(wanted["c"], rel=5e-6), name
        assert found["u"] == pytest.approx(wanted["u"], rel=5e-3), name
        assert found["k"] == pytest.approx(wanted["k"], abs=0.02), name


def test_selfcheck_prints_every_case_and_writes_it_as_a_pdf(tmp_path: Path) -> None:
    from pypdf import PdfReader

    done = run("selfcheck", "--pdf", tmp_path / "selfcheck.pdf")

    assert done.returncode == 0, done.stdout[-2000:]
    head = done.stdout.splitlines()[0]
    for word in ("source", "published", "computed", "agreement"):
        assert word in head
    for source in ("QUAM:2012", "JCGM 100", "JCGM 101", "CIPM-2007", "CIAAW"):
        assert source in done.stdout
    counted = re.search(r"(\d+) of (\d+) published cases hold", done.stdout)
    assert counted is not None
    assert counted[1] == counted[2]
    text = "".join(page.extract_text() for page in PdfReader(tmp_path / "selfcheck.pdf").pages)
    assert "QUAM" in text
    assert text.count("yes") == int(counted[2])


def test_selfcheck_with_a_case_that_fails_ends_with_1(
    monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    from server.cli import Verbs
    from server.cli import run as run_here
    from server.evaluation import published
    from server.evaluation.published import Check

    wrong = Check("a book", "c of an example", "0.10214", "0.10301", "+87 of the last digit", False)
    monkeypatch.setattr(published, "checks", lambda: [wrong])

    status = run_here(["selfcheck"], Verbs(serve=lambda *_: 0))

    assert status == 1
    assert "FAILS" in capsys.readouterr().out


def test_migrate_brings_an_empty_folder_up_and_finds_nothing_to_do_then(tmp_path: Path) -> None:
    first, second = (run("migrate", "--data", tmp_path / "new") for _ in range(2))

    assert first.returncode == second.returncode == 0, first.stderr
    assert "from empty to" in first.stdout
    assert "nothing was to do" in second.stdout


@pytest.mark.parametrize(
    "arguments",
    [
        ["serve", "--host", "0.0.0.0"],  # noqa: S104 - it must be refused
        ["serve", "--tls-cert", "gone.pem"],
        ["trail", "check", "--data", "gone"],
        ["trail", "check", "--known", "gone.txt"],
        ["backup", "here"],
        ["no-such-verb"],
        [],
    ],
)
def test_what_cannot_be_done_ends_with_2_and_a_sentence(
    arguments: list[str], tmp_path: Path
) -> None:
    done = run(*arguments, cwd=tmp_path)

    assert done.returncode == 2
    assert len(done.stderr.strip()) > 20
    assert "Traceback" not in done.stderr
    assert not (tmp_path / "data").exists()


def test_evaluate_and_help_start_without_web_database_scipy_and_plotly() -> None:
    script = (
        "import sys; import server.__main__, server.evaluation.entrance; "
        "print([m for m in ('fastapi', 'sqlalchemy', 'scipy', 'plotly') if m in sys.modules])"
    )
    done = subprocess.run(
        [sys.executable, "-c", script],
        env=_environment(), capture_output=True, text=True, check=True,
    )  # fmt: skip

    assert done.stdout.strip() == "[]"


def test_application_starts_without_scipy_and_plotly() -> None:
    script = (
        "import sys; import server.app; "
        "print([m for m in ('scipy', 'plotly', 'typst') if m in sys.modules])"
    )
    done = subprocess.run(
        [sys.executable, "-c", script],
        env=_environment(), capture_output=True, text=True, check=True,
    )  # fmt: skip

    assert done.stdout.strip() == "[]"


class Server:
    """A server that was started as a person starts it."""

    def __init__(self, data: Path, *more: str) -> None:
        with socket.socket() as free:
            free.bind(("127.0.0.1", 0))
            port = free.getsockname()[1]
        self.url = f"http://127.0.0.1:{port}"
        self.log = data.parent / f"server-{port}.log"
        with self.log.open("w") as log:
            self.process = subprocess.Popen(
                [sys.executable, "-m", "server", "serve", "--data", str(data), "--port", str(port),
                 *more],
                cwd=ROOT, env=_environment(), stdout=log, stderr=log,
            )  # fmt: skip

    def wait(self) -> None:
        """Wait until it answers."""
        end = time.monotonic() + 180
        while time.monotonic() < end:
            assert self.process.poll() is None, self.log.read_text()
            try:
                self.get("/health")
            except (urllib.error.URLError, ConnectionError):
                time.sleep(0.1)
            else:
                return
        pytest.fail(f"no answer: {self.log.read_text()}")

    def get(self, path: str) -> str:
        with urllib.request.urlopen(self.url + path, timeout=20) as answer:  # noqa: S310 - ours
            return str(answer.read().decode())

    def stop(self) -> int:
        self.process.send_signal(signal.SIGTERM)
        return self.process.wait(timeout=30)


@pytest.fixture
def demo_server(tmp_path: Path) -> Iterator[Server]:
    server = Server(tmp_path / "data", "--demo")
    yield server
    if server.process.poll() is None:
        server.stop()


@pytest.mark.slow
def test_serve_demo_fills_answers_and_ends_cleanly(demo_server: Server, tmp_path: Path) -> None:
    demo_server.wait()
    told = demo_server.log.read_text()
    assert re.search(r"imke\s+\S+-\S+-\S+-\d\d\s+Imke Thorvald \(analyst\)", told)
    bottle = re.search(r"Bottles in force: (\w{8})", told)
    assert bottle is not None
    assert json.loads(demo_server.get(f"/api/bottles/{bottle[1]}"))["in_force"] is True
    assert f'href="/b/{bottle[1]}"' in demo_server.get("/")

    demo_server.stop()

    data = tmp_path / "data"
    checked = run("trail", "check", "--data", data)
    assert checked.returncode == 0, checked.stdout
    kept = tmp_path / "kept elsewhere.txt"
    kept.write_text(checked.stdout)
    assert run("trail", "check", "--data", data, "--known", kept).returncode == 0
    kept.write_text(f"Row 3: {'0' * 64}\n")
    unlike = run("trail", "check", "--data", data, "--known", kept)
    assert unlike.returncode == 1
    assert "Row 3 is not the one" in unlike.stdout
    assert (data / "demo-sign-ins.txt").stat().st_mode & 0o077 == 0
    again = Server(data, "--demo")
    again.wait()
    assert "imke" in again.log.read_text()
    assert bottle[1] in again.get("/")
    again.stop()


@pytest.mark.slow
def test_trail_that_was_changed_behind_the_programs_back_ends_with_1(
    demo_server: Server, tmp_path: Path
) -> None:
    demo_server.wait()
    demo_server.stop()
    data = tmp_path / "data"
    with sqlite3.connect(data / "ledger.sqlite") as connection:
        triggers = connection.execute(
            "SELECT name FROM sqlite_master WHERE type = 'trigger' AND tbl_name = 'trail'"
        ).fetchall()
        for (name,) in triggers:
            connection.execute(f'DROP TRIGGER "{name}"')
        connection.execute("UPDATE trail SET why = 'nothing of note' WHERE seq = 20")
    connection.close()

    done = run("trail", "check", "--data", data)

    assert done.returncode == 1
    assert "Row 20" in done.stdout


def test_serve_of_an_empty_folder_prints_the_set_up_code(tmp_path: Path) -> None:
    server = Server(tmp_path / "data")
    try:
        server.wait()
        told = server.log.read_text()
    finally:
        server.stop()

    assert re.search(r"setup with the code \w{8}", told)
    assert (tmp_path / "data").stat().st_mode & 0o077 == 0


def test_serve_on_a_busy_port_ends_with_2_before_anything_is_written(tmp_path: Path) -> None:
    with socket.socket() as busy:
        busy.bind(("127.0.0.1", 0))
        busy.listen()
        port = busy.getsockname()[1]
        done = run("serve", "--data", tmp_path / "data", "--port", port)

    assert done.returncode == 2
    assert f"port {port} cannot be used" in done.stderr
    assert not list((tmp_path / "data").iterdir())


def test_serve_in_a_folder_that_cannot_be_made_ends_with_2(tmp_path: Path) -> None:
    (tmp_path / "file").write_text("in the way")

    done = run("serve", "--data", tmp_path / "file" / "data")

    assert done.returncode == 2
    assert "cannot be made" in done.stderr


def test_evaluate_with_too_many_trials_ends_with_2() -> None:
    done = run("evaluate", RECORDS / "quam-a2.json", "--monte-carlo", "99999999999")

    assert done.returncode == 2
    assert json.loads(done.stderr)["field"] == "--monte-carlo"


def test_equivalence_of_a_simulated_curve_finds_its_known_volume(tmp_path: Path) -> None:
    """Simulated by charge balance with Davies activities; the equivalence volume is known."""
    held = json.loads((RECORDS.parent / "curves" / "simulated.json").read_text(encoding="utf-8"))
    curve = held.get("curves", held)["khp-manual-burette"]
    rows = zip(curve["V"], curve["y"], strict=True)
    path = tmp_path / "curve.csv"
    path.write_text("mL;pH\n" + "\n".join(f"{v};{y}".replace(".", ",") for v, y in rows))

    done = run(
        "equivalence", path, "--system", "khp-naoh", "--flask-volume-mL", curve["V0_mL"],
        "--amount-mmol", curve["n_acid_mmol"],
    )  # fmt: skip

    assert done.returncode == 0, done.stderr
    found = json.loads(done.stdout)
    assert found["format"] == "equivalence/1"
    fit = next(one for one in found["methods"] if one["method"] == "model fit")
    assert abs(fit["volume_mL"] - curve["equivalence_mL"]) < 0.002


@pytest.mark.parametrize(
    ("option", "value"),
    [("--system", "nope"), ("--amount-mmol", "-1"), ("--temperature-C", "900")],
)
def test_equivalence_names_the_option_that_cannot_be(
    option: str, value: str, tmp_path: Path
) -> None:
    path = tmp_path / "curve.csv"
    path.write_text("0,3\n1,4\n2,5\n3,9\n4,10\n5,11\n6,11.2\n")
    done = run("equivalence", path, option, value)
    assert done.returncode == 2
    assert json.loads(done.stderr)["field"] == option


def test_equivalence_of_a_file_that_is_no_curve_ends_with_2(tmp_path: Path) -> None:
    path = tmp_path / "curve.csv"
    path.write_text("mL,pH\n0.0,4.0\n")

    done = run("equivalence", path)

    assert done.returncode == 2
    assert json.loads(done.stderr)["detail"]
