"""The structure's own rules, read from the source."""

import ast
import re
from pathlib import Path

import jinja2
import pytest

ROOT = Path(__file__).parents[2]
SOURCES = sorted((ROOT / "server").rglob("*.py"))
TEMPLATES = sorted((ROOT / "templates").rglob("*.html"))
SCRIPTS = sorted((ROOT / "static" / "js").rglob("*.js"))


def named(path):
    return str(path.relative_to(ROOT))


@pytest.mark.parametrize("path", [p for p in SOURCES if p.name == "__init__.py"], ids=named)
def test_package_init_holds_a_docstring_and_nothing_else(path):
    body = ast.parse(path.read_text(encoding="utf-8")).body
    assert len(body) == 1
    assert isinstance(body[0], ast.Expr)


def test_commit_and_rollback_are_spelled_in_one_place():
    found = {
        named(path)
        for path in SOURCES
        if re.search(r"\.(commit|rollback)\(", path.read_text(encoding="utf-8"))
    }
    assert found == {"server/records/transaction.py"}


def test_sql_text_lives_in_records_only():
    pattern = re.compile(r"\b(SELECT .+ FROM|INSERT INTO|UPDATE \w+ SET|DELETE FROM)\b")
    found = {
        named(path)
        for path in SOURCES
        if pattern.search(path.read_text(encoding="utf-8")) and "records" not in path.parts
    }
    assert found == set()


def test_only_the_clock_of_the_roof_asks_for_the_time():
    pattern = re.compile(r"datetime\.(now|utcnow|today)\(|\btime\.time\(|date\.today\(")
    found = {named(p) for p in SOURCES if pattern.search(p.read_text(encoding="utf-8"))}
    assert found <= {"server/app.py", "server/cli.py", "server/settings.py", "server/clock.py"}


def test_scipy_and_plotly_wait_until_they_are_needed():
    found = set()
    for path in SOURCES:
        for node in ast.parse(path.read_text(encoding="utf-8")).body:
            names = [alias.name for alias in getattr(node, "names", [])]
            module = getattr(node, "module", None) or ""
            if isinstance(node, ast.Import | ast.ImportFrom) and any(
                one.split(".")[0] in {"scipy", "plotly"} for one in [*names, module]
            ):
                found.add(named(path))
    assert found == set()


@pytest.mark.parametrize("path", TEMPLATES, ids=named)
def test_template_parses_and_has_no_inline_style_script_or_handler(path):
    text = path.read_text(encoding="utf-8")
    jinja2.Environment(autoescape=True).parse(text)
    assert not re.search(r"\sstyle=", text)
    assert not re.search(r"\son[a-z]+=\"", text)
    assert not re.search(r"<style", text)
    for script in re.findall(r"<script([^>]*)>", text):
        assert "src=" in script or 'type="application/json"' in script


@pytest.mark.parametrize("path", [*TEMPLATES, *SCRIPTS], ids=named)
def test_page_asks_no_other_host_for_anything(path):
    urls = re.findall(r"https?://[^\s\"'<>)]+", path.read_text(encoding="utf-8"))
    assert [url for url in urls if not url.startswith("http://www.w3.org/")] == []


def test_template_does_no_arithmetic():
    pattern = re.compile(r"\{[{%][^}]*?[\w)\]]\s(?:\+|\*|/|-)\s[\w(][^}]*?[}%]\}")
    found = {named(p) for p in TEMPLATES if pattern.search(p.read_text(encoding="utf-8"))}
    assert found == set()


def test_js_lib_is_free_of_the_dom():
    pattern = re.compile(r"\b(document|window|localStorage|navigator)\b")
    lib = [path for path in SCRIPTS if path.parent.name == "lib"]
    assert lib
    assert {
        named(path) for path in lib if pattern.search(path.read_text(encoding="utf-8"))
    } == set()


def test_js_floors_import_downward_only():
    floors = {"lib": 0, "outbox": 1, "widgets": 1, "pages": 2}
    for path in SCRIPTS:
        for target in re.findall(r"from \"\.\./(\w+)/", path.read_text(encoding="utf-8")):
            assert floors[target] < floors[path.parent.name], named(path)


def test_migrations_are_linear_with_one_head():
    from alembic.script import ScriptDirectory

    script = ScriptDirectory(str(ROOT / "migrations"))
    revisions = list(script.walk_revisions())
    assert len(script.get_heads()) == 1
    assert all(not isinstance(one.down_revision, tuple) for one in revisions)
    assert [one.revision for one in reversed(revisions)] == [
        f"{i:04d}" for i in range(1, len(revisions) + 1)
    ]
