"""The verbs of the command line."""

import argparse
import json
import os
import sys
from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from datetime import UTC, datetime
from pathlib import Path
from typing import Any

from server.settings import (
    DATABASE_VARIABLE,
    DEFAULT_HOST,
    DEFAULT_PORT,
    Settings,
    SettingsProblem,
    check_door,
    read_settings,
)

GOOD, NOT_SO, REFUSED = 0, 1, 2
MOST_TRIALS = 10_000_000


@dataclass(frozen=True, slots=True)
class Verbs:
    """What the roof hands down to the verbs: they start the web and the demonstration."""

    serve: Callable[[Settings, bool], int]


def run(arguments: Sequence[str], verbs: Verbs) -> int:
    """Do what the arguments say; return the exit status."""
    given = _parser().parse_args(arguments)
    try:
        status: int = given.do(given, verbs)
    except SettingsProblem as problem:
        print(problem, file=sys.stderr)  # noqa: T201 - the command line speaks by printing
        return REFUSED
    return status


def _parser() -> argparse.ArgumentParser:
    parser = argparse.ArgumentParser(
        prog="titrant-ledger",
        description="From the first weighing to the number on the bottle, and true until empty.",
    )
    verbs = parser.add_subparsers(required=True, metavar="VERB")
    _add_serve(verbs)
    _add_evaluate(verbs)
    _add_equivalence(verbs)
    selfcheck = verbs.add_parser("selfcheck", help="check the calculations on published examples")
    selfcheck.add_argument("--pdf", type=Path, metavar="FILE", help="write the table as a PDF too")
    selfcheck.set_defaults(do=_selfcheck)
    _add_keys(verbs)
    benching = verbs.add_parser("bench", help="measure speed and error against yardsticks")
    benching.add_argument("name", nargs="?", metavar="NAME", help="which; without it: their names")
    benching.set_defaults(do=_bench)
    migrating = verbs.add_parser("migrate", help="bring the database to this release")
    _add_data(migrating)
    migrating.set_defaults(do=_migrate)
    trail = verbs.add_parser("trail", help="the trail of what was done")
    trail_verbs = trail.add_subparsers(required=True, metavar="VERB")
    checking = trail_verbs.add_parser(
        "check", help="check that its chain holds, and that the record is what it noted"
    )
    _add_data(checking)
    checking.add_argument(
        "--known",
        type=Path,
        metavar="FILE",
        help="lines “Row N: HASH” as this verb printed them, kept elsewhere",
    )
    checking.set_defaults(do=_trail_check)
    return parser


def _add_data(parser: argparse.ArgumentParser) -> None:
    parser.add_argument(
        "--data", type=Path, default=Path("data"), metavar="DIR", help="data folder (./data)"
    )


def _add_serve(verbs: Any) -> None:
    serve = verbs.add_parser("serve", help="migrate, then serve")
    _add_data(serve)
    serve.add_argument("--host", default=DEFAULT_HOST, metavar="H")
    serve.add_argument("--port", type=int, default=DEFAULT_PORT, metavar="P")
    serve.add_argument("--demo", action="store_true", help="fill an empty data folder")
    serve.add_argument("--tls-cert", type=Path, metavar="F")
    serve.add_argument("--tls-key", type=Path, metavar="F")
    serve.add_argument("--behind-proxy", action="store_true", help="a proxy speaks https")
    serve.add_argument("--plain-http", action="store_true", help="accept http on a network")
    serve.set_defaults(do=_serve)


def _add_evaluate(verbs: Any) -> None:
    evaluating = verbs.add_parser("evaluate", help="a bench record in, a bench result out")
    evaluating.add_argument("file", type=Path, metavar="FILE.json")
    evaluating.add_argument(
        "--monte-carlo",
        type=int,
        default=0,
        metavar="N",
        help="trials at least; more are drawn until it settles",
    )
    evaluating.add_argument("--seed", type=int, default=1, metavar="S")
    evaluating.set_defaults(do=_evaluate)


def _add_equivalence(verbs: Any) -> None:
    curve = verbs.add_parser("equivalence", help="a curve in, every method's volume out")
    curve.add_argument("file", type=Path, metavar="FILE.csv")
    curve.add_argument("--system", metavar="NAME", help="khp-naoh, tris-hcl, carbonate-hcl, none")
    curve.add_argument("--flask-volume-mL", type=float, dest="flask", metavar="V")
    curve.add_argument("--amount-mmol", type=float, dest="amount", metavar="N")
    curve.add_argument("--temperature-C", type=float, default=25.0, dest="celsius", metavar="T")
    curve.set_defaults(do=_equivalence)


def _add_keys(verbs: Any) -> None:
    keys = verbs.add_parser("keys", help="the keys that certificates are signed with")
    _add_data(keys)
    keys.add_argument(
        "--retire",
        action="store_true",
        help="make a new key; the old one signs no more and goes on verifying",
    )
    keys.set_defaults(do=_keys)


def _say(*lines: object) -> None:
    for line in lines:
        print(line, flush=True)  # noqa: T201 - the command line speaks by printing


def _settings(given: argparse.Namespace) -> Settings:
    settings = read_settings(os.environ, data=given.data)
    if settings.keeps_file and not given.data.is_dir():
        raise SettingsProblem(f"There is no data folder {given.data}.")
    return settings


def _serve(given: argparse.Namespace, verbs: Verbs) -> int:
    settings = read_settings(
        os.environ,
        data=given.data,
        host=given.host,
        port=given.port,
        tls_cert=given.tls_cert,
        tls_key=given.tls_key,
        behind_proxy=given.behind_proxy,
        plain_http=given.plain_http,
    )
    check_door(settings)
    return verbs.serve(settings, given.demo)


def _evaluate(given: argparse.Namespace, _: Verbs) -> int:
    from server.evaluation.entrance import RecordProblem, evaluate  # noqa: PLC0415 - numpy waits

    if not 0 <= given.monte_carlo <= MOST_TRIALS or given.seed < 0:
        says = f"--monte-carlo takes a whole number from 0 to {MOST_TRIALS}, --seed one from 0."
        return _problem(says, "--monte-carlo")
    try:
        document = json.loads(given.file.read_bytes(), object_pairs_hook=_no_key_twice)
    except OSError as problem:
        return _problem(f"{given.file} cannot be read: {problem.strerror}.", "FILE.json")
    except (ValueError, RecursionError) as problem:
        return _problem(f"{given.file} is no JSON: {problem}.", "FILE.json")
    try:
        result = evaluate(document, trials=given.monte_carlo or None, seed=given.seed)
    except RecordProblem as problem:
        return _problem(problem.says, problem.path, problem.example)
    _say(json.dumps(result, ensure_ascii=False, indent=2, allow_nan=False))
    return GOOD


def _equivalence(given: argparse.Namespace, _: Verbs) -> int:
    from server.curves.entrance import equivalence  # noqa: PLC0415 - numpy waits
    from server.curves.points import CurveProblem  # noqa: PLC0415 - the same
    from server.intake.curve_workbook import read_curve_file  # noqa: PLC0415 - the same
    from server.lab.refusal import Unacceptable  # noqa: PLC0415 - the same

    try:
        points = read_curve_file(given.file.read_bytes()).points()
        result = equivalence(
            points,
            system=given.system,
            flask_volume_mL=given.flask,
            amount_mmol=given.amount,
            temperature_C=given.celsius,
        )
    except OSError as problem:
        return _problem(f"{given.file} cannot be read: {problem.strerror}.", "FILE.csv")
    except Unacceptable as refusal:
        return _problem(refusal.says, refusal.field or "FILE.csv", refusal.example)
    except CurveProblem as problem:
        option = None if problem.field is None else f"--{problem.field.replace('_', '-')}"
        return _problem(str(problem), option or "FILE.csv")
    _say(json.dumps(result, ensure_ascii=False, indent=2, allow_nan=False))
    return GOOD


def _no_key_twice(pairs: list[tuple[str, Any]]) -> dict[str, Any]:
    found = dict(pairs)
    if len(found) < len(pairs):
        keys = [key for key, _ in pairs]
        twice = next(key for key in keys if keys.count(key) > 1)
        raise ValueError(f"the key “{twice}” is there twice in one object")
    return found


def _problem(detail: str, field: str, example: str | None = None) -> int:
    """Say on stderr, as JSON, why a record cannot be read."""
    problem = {
        "type": "/about#cannot-be-taken",
        "title": "It cannot be read",
        "status": 422,
        "detail": detail,
        "field": field,
    }
    if example is not None:
        problem["example"] = example
    print(json.dumps(problem, ensure_ascii=False), file=sys.stderr)  # noqa: T201 - the same
    return REFUSED


def _selfcheck(given: argparse.Namespace, _: Verbs) -> int:
    from server.evaluation.published import checks  # noqa: PLC0415 - numpy waits

    found = checks()
    for line in _table(found):
        _say(line)
    failed = sum(1 for one in found if not one.holds)
    says = f"{len(found) - failed} of {len(found)} published cases hold."
    _say("", says)
    if given.pdf is not None:
        from server.reports.selfcheck_pdf import selfcheck_pdf  # noqa: PLC0415 - typst waits

        day = datetime.now(UTC).date().isoformat()
        pdf = selfcheck_pdf(found, release=_release(), day=day, says=says)
        given.pdf.write_bytes(pdf)
        _say(f"Written to {given.pdf}.")
    return NOT_SO if failed or not found else GOOD


def _keys(given: argparse.Namespace, _: Verbs) -> int:
    from server.credentials.signing_keys import (  # noqa: PLC0415 - seldom needed
        KeyProblem,
        open_signing_keys,
        retire_signing_key,
    )

    folder, now = read_settings(os.environ, data=given.data).key_folder, datetime.now(UTC)
    if not given.data.is_dir():
        raise SettingsProblem(f"There is no data folder {given.data}.")
    try:
        opened = (retire_signing_key if given.retire else open_signing_keys)(folder, now=now)
    except (KeyProblem, OSError) as problem:
        raise SettingsProblem(
            f"The signing keys in {folder} cannot be used: {problem}"
        ) from problem
    for key in opened.keys:
        end = f"retired {key.retired_at:%Y-%m-%d}" if key.retired_at else "signs"
        _say(f"{key.number:4d}  {key.kid}  made {key.made_at:%Y-%m-%d}  {end}")
    if given.retire:
        _say("Start the server anew: until then it signs with the key that is retired now.")
    return GOOD


def _bench(given: argparse.Namespace, _: Verbs) -> int:
    from server.upkeep.bench.named import BENCHES, bench_named  # noqa: PLC0415 - seldom needed

    names = [f"{one.name:10s} {one.says}" for one in BENCHES]
    if given.name is None:
        _say("bench NAME measures one of these:", *names)
        return GOOD
    chosen = bench_named(given.name)
    if chosen is None:
        for line in (f"There is no measurement {given.name}. There are:", *names):
            print(line, file=sys.stderr)  # noqa: T201 - the command line speaks by printing
        return REFUSED
    missed = 0
    for measured in chosen.lines():
        _say(measured.text())
        missed += len(measured.missed)
    _say("All figures are reached." if not missed else f"Not reached: {missed} figures.")
    return NOT_SO if missed else GOOD


def _table(found: Sequence[Any]) -> Iterator[str]:
    """Return the lines of the table, the cases of one source under its name."""
    heads = ("source and what", "published", "computed", "agreement", "")
    rows = [
        (f"  {one.what}", one.published, one.computed, one.agreement, _verdict(one.holds))
        for one in found
    ]
    widths = [max(len(row[i]) for row in (heads, *rows)) for i in range(len(heads))]
    lines = [
        "  ".join(cell.ljust(width) for cell, width in zip(row, widths, strict=True)).rstrip()
        for row in (heads, *rows)
    ]
    yield lines[0]
    source = None
    for one, line in zip(found, lines[1:], strict=True):
        if one.source != source:
            source = one.source
            yield source
        yield line


def _verdict(holds: bool) -> str:
    return "holds" if holds else "FAILS"


def _release() -> str:
    from importlib.metadata import PackageNotFoundError, version  # noqa: PLC0415 - seldom needed

    try:
        return f"Titrant Ledger {version('titrant-ledger')}"
    except PackageNotFoundError:
        return "Titrant Ledger"


def _open(settings: Settings) -> Any:
    """Return the database of the settings.

    Raises:
        SettingsProblem: it cannot be opened; the sentence names the setting.
    """
    from server.records.database import DatabaseProblem, open_database  # noqa: PLC0415 - waits

    try:
        return open_database(settings.database_url)
    except DatabaseProblem as problem:
        raise SettingsProblem(f"{problem} ({DATABASE_VARIABLE} or --data)") from problem


def _migrate(given: argparse.Namespace, _: Verbs) -> int:
    from server.records.migrating import migrate  # noqa: PLC0415 - the same

    settings = read_settings(os.environ, data=given.data)
    if settings.keeps_file:
        given.data.mkdir(parents=True, exist_ok=True)
    database = _open(settings)
    try:
        report = migrate(database)
    finally:
        database.dispose()
    if report.before == report.after:
        _say(f"The database is at {report.after}; nothing was to do.")
    else:
        _say(f"The database was brought from {report.before or 'empty'} to {report.after}.")
    return GOOD


def _trail_check(given: argparse.Namespace, _: Verbs) -> int:
    from server.records.transaction import Transactions  # noqa: PLC0415 - the same
    from server.upkeep.trail_check import check_trail, read_known  # noqa: PLC0415 - the same

    known = {}
    if given.known is not None:
        try:
            known = read_known(given.known.read_text(encoding="utf-8"))
        except (OSError, ValueError) as problem:
            raise SettingsProblem(f"--known {given.known} cannot be read: {problem}") from problem
    transactions = Transactions(_open(_settings(given)))
    try:
        found = check_trail(transactions, known=known)
    finally:
        transactions.close()
    _say(found.says, f"Row {found.seq}: {found.hash}")
    return GOOD if found.holds else NOT_SO
