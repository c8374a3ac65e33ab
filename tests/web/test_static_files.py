"""Static files: kinds, addresses by content, packed."""

import re
from pathlib import Path
from typing import Any

import pytest

from server.files import find_folder
from server.web.static_files import StaticFiles


def test_address_changes_when_any_file_changes(tmp_path: Path) -> None:
    (tmp_path / "one.css").write_text("a { color: red }")
    (tmp_path / "two.js").write_text("export {};")
    before = StaticFiles(tmp_path)
    (tmp_path / "two.js").write_text("export {}; //")

    after = StaticFiles(tmp_path)

    assert before.url("one.css") != after.url("one.css")
    assert StaticFiles(tmp_path).url("one.css") == after.url("one.css")


def test_file_that_is_not_there_is_an_error_of_the_template(tmp_path: Path) -> None:
    with pytest.raises(KeyError):
        StaticFiles(tmp_path).url("gone.css")


def test_every_file_is_served_with_its_kind_plain_and_packed(shared_web: Any) -> None:
    kinds = {".css": "text/css", ".js": "text/javascript", ".svg": "image/svg+xml"}
    folder, visitor = find_folder("static"), shared_web.visitor()
    digest = re.search(r"/static/([0-9a-f]+)/", visitor.get("/about").text)
    assert digest is not None
    for path in folder.rglob("*"):
        if path.suffix not in kinds:
            continue
        url = f"/static/{digest[1]}/{path.relative_to(folder).as_posix()}"
        plain = visitor.get(url, headers={"Accept-Encoding": "identity"})
        packed = visitor.get(url, headers={"Accept-Encoding": "gzip"})

        assert plain.headers["content-type"].startswith(kinds[path.suffix])
        assert plain.content == packed.content == path.read_bytes()
        assert packed.headers["content-encoding"] == "gzip"
        assert "content-encoding" not in plain.headers
        assert packed.headers["vary"] == "Accept-Encoding"


def test_modules_find_each_other_under_the_same_digest(shared_web: Any) -> None:
    """Relative imports stay in the folder of the digest, so that all are of one release."""
    folder = find_folder("static")
    for path in (folder / "js").rglob("*.js"):
        for target in re.findall(r'^import .* from "([^"]+)";', path.read_text(), re.MULTILINE):
            assert target.startswith("."), (path, target)
            assert (path.parent / target).resolve().is_file(), (path, target)
