"""The page of a curve over HTTP: its policy, its script, its parts."""

import gzip
import re
from pathlib import Path
from typing import Any

import pytest

from server.web.chart_bundle import ChartBundle, bundle_path

#: Of the map style sheet in the bundle of plotly.js 4.1.1, met in a browser.
MAPS_4_1_1 = "'sha256-ji27qzEtxXZW+7dun6UwjHXJ18e6WAin1VvNtkzIE/o='"
EMPTY = "'sha256-47DEQpj8HBSa+/TImW+5JCeuQeRkm5NMpJWZG3hSuFU='"


def policy(answer: Any) -> dict[str, str]:
    parts = answer.headers["content-security-policy"].split(";")
    return dict(part.strip().split(" ", 1) for part in parts)


@pytest.fixture
def url(shared_web: Any) -> str:
    return f"/sheets/{shared_web.demo.curve_sheet_id}/curves/1"


def test_style_hashes_stand_on_the_page_of_a_curve_and_nowhere_else(
    shared_web: Any, url: str
) -> None:
    reader = shared_web.client("rosa")
    styles = policy(reader.get(url))["style-src"].split()
    assert styles[0] == "'self'"
    assert EMPTY in styles
    assert all(re.fullmatch(r"'sha256-[A-Za-z0-9+/]{43}='", one) for one in styles[1:])
    sheet = shared_web.demo.curve_sheet_id
    for other in (f"{url}/part", f"/countersign/{sheet}", f"/bench/{sheet}", "/"):
        assert policy(reader.get(other))["style-src"] == "'self'"
    for name in ("script-src", "connect-src", "img-src"):
        assert policy(reader.get(url))[name] == "'self'"


def test_chart_script_is_deferred_packed_and_kept_for_good(shared_web: Any, url: str) -> None:
    reader = shared_web.client("rosa")
    html = reader.get(url).text
    script = re.search(r'<script defer src="(/charts/[0-9a-f]{16}/plotly\.min\.js)"', html)
    assert script is not None
    answer = reader.get(script[1], headers={"Accept-Encoding": "gzip"})
    assert answer.headers["content-encoding"] == "gzip"
    assert "immutable" in answer.headers["cache-control"]
    assert answer.headers["content-type"].startswith("text/javascript")
    path = bundle_path()
    assert path is not None
    assert answer.content == path.read_bytes()
    older = reader.get("/charts/0000000000000000/plotly.min.js")
    assert older.headers["cache-control"] == "no-cache"


def test_no_other_page_asks_for_the_chart_script(shared_web: Any) -> None:
    reader = shared_web.client("rosa")
    sheet = shared_web.demo.curve_sheet_id
    for other in (
        "/",
        f"/countersign/{sheet}",
        f"/bench/{sheet}",
        f"/sheets/{sheet}/curves/1/part",
    ):
        assert "/charts/" not in reader.get(other).text


def test_page_is_whole_without_its_script(shared_web: Any, url: str) -> None:
    html = shared_web.client("rosa").get(url).text
    assert html.count('<svg xmlns="http://www.w3.org/2000/svg" viewBox') >= 5
    assert "Believe the" in html
    assert 'id="points"' in html
    assert " style=" not in html


def test_page_of_another_part_of_the_points_shows_it(shared_web: Any, url: str) -> None:
    reader = shared_web.client("rosa")
    assert reader.get(f"{url}?first=1").status_code == 200
    assert reader.get(f"{url}?first=0").status_code in {400, 422}
    assert reader.get(url.replace("/curves/1", "/curves/19")).status_code == 404
    assert reader.get(url.replace("/curves/1", "/curves/x")).status_code in {400, 404, 422}


def test_part_is_a_part_and_no_page(shared_web: Any, url: str) -> None:
    html = shared_web.client("rosa").get(f"{url}/part").text
    assert "<html" not in html
    assert html.count("<details") == 1


def test_hashes_are_read_from_the_script_itself(tmp_path: Path) -> None:
    script = tmp_path / "plotly.min.js"
    script.write_text(
        'var e=document.createElement("style");e.id="x",e.textContent=\'.a{content:"\\\\201C"}\';'
    )
    first, second = ChartBundle(script).style_hashes
    assert first == EMPTY
    assert second == "'sha256-" + _sha256('.a{content:"\\201C"}') + "'"


def _sha256(text: str) -> str:
    import base64
    import hashlib

    return base64.b64encode(hashlib.sha256(text.encode()).digest()).decode()


def test_hashes_of_the_release_that_was_met_in_a_browser_are_the_same() -> None:
    path = bundle_path()
    assert path is not None
    if b"plotly.js v4.1.1" in path.read_bytes()[:60]:
        assert ChartBundle().style_hashes == (EMPTY, MAPS_4_1_1)
    assert len(ChartBundle().style_hashes) >= 1


def test_bundle_is_packed_once_and_unpacks_to_the_same(tmp_path: Path) -> None:
    script = tmp_path / "plotly.min.js"
    script.write_text("window.Plotly = {};" * 50)
    bundle = ChartBundle(script)
    assert bundle.packed() is bundle.packed()
    assert gzip.decompress(bundle.packed()) == bundle.plain()
