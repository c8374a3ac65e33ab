"""Measures a curve's chart data against plotly's figure, and a curve page's bytes.

Run it with ``python tests/bench/curve_page.py``; it prints raw figures and ratios. The yardsticks:
``Figure`` and ``to_json`` of the plotly package with the same traces from the same arrays, and the
package's script as this program serves it, gzipped. It needs half a minute and writes nothing that
stays.
"""

import gzip
import json
import math
import re
import sys
import tempfile
from base64 import b64decode, b64encode
from datetime import UTC, datetime
from pathlib import Path
from statistics import median
from time import perf_counter

import numpy as np

ROOT = Path(__file__).parents[2]
sys.path.insert(0, str(ROOT))

from fastapi.testclient import TestClient  # noqa: E402

from server.app import build_app  # noqa: E402
from server.demo.laboratory import fill_demo  # noqa: E402
from server.drawing.titration.chart_data import chart_data  # noqa: E402
from server.drawing.titration.told import Drawn, Marked  # noqa: E402
from server.records.database import open_database, sqlite_url  # noqa: E402
from server.records.migrating import migrate  # noqa: E402
from server.records.transaction import Transactions  # noqa: E402
from server.settings import Settings  # noqa: E402

POINTS, LINE, TURNS = 3000, 400, 15
NOW = datetime(2026, 12, 1, 13, 5, tzinfo=UTC)
METHODS = (
    "steepest segment", "first derivative", "second derivative",
    "gran acid side", "gran alkaline side", "model fit",
)  # fmt: skip


def arrays(seed=5):
    """A made-up curve of 3000 points with its line, slopes and residuals."""
    random = np.random.default_rng(seed)
    V = np.linspace(0, 25, POINTS)
    y = 8 + 3 * np.tanh(3 * (V - 20)) + random.normal(0, 0.01, POINTS)
    line = np.linspace(0, 25, LINE)
    slopes = (np.diff(y) / np.diff(V), (V[1:] + V[:-1]) / 2)
    return V, y, (line, 8 + 3 * np.tanh(3 * (line - 20))), slopes, random.normal(0, 1, POINTS)


def ours(given):
    V, y, line, slopes, residuals = given
    drawn = Drawn(
        kind="pH",
        V=tuple(V.tolist()),
        y=tuple(y.tolist()),
        aside=frozenset(),
        model=(tuple(line[0].tolist()), tuple(line[1].tolist())),
        marks=tuple(Marked(name, 20.0, 0.001, taken=name == "model fit") for name in METHODS),
    )
    return chart_data(
        drawn,
        residuals=tuple(residuals.tolist()),
        slopes=(tuple(slopes[1].tolist()), tuple(slopes[0].tolist())),
    )


def plotlys(given):
    import plotly.graph_objects as go

    V, y, line, slopes, residuals = given
    traces = [
        go.Scatter(name="fitted curve", x=line[0], y=line[1], mode="lines"),
        go.Scatter(name="readings", x=V, y=y, mode="markers"),
        *(
            go.Scatter(name=name, x=[20.0], y=[8.0], mode="markers",
                       error_x={"type": "constant", "value": 0.002})
            for name in METHODS
        ),
        go.Scatter(name="steepness", x=slopes[1], y=slopes[0], mode="lines", yaxis="y2"),
        go.Scatter(name="residuals", x=V, y=residuals, mode="markers", yaxis="y3"),
    ]  # fmt: skip
    layout = go.Layout(
        xaxis={"title": {"text": "titrant, mL"}},
        yaxis={"domain": [0.52, 1]},
        yaxis2={"domain": [0.27, 0.47]},
        yaxis3={"domain": [0, 0.21]},
    )
    return go.Figure(traces, layout).to_json()


def timed(work, given):
    times = []
    for _ in range(TURNS):
        begun = perf_counter()
        work(given)
        times.append(perf_counter() - begun)
    return median(times)


def same_numbers(given):
    """Both carry the same readings, or the comparison means nothing."""
    told = json.loads(ours(given))["points"]["x"]
    other = json.loads(plotlys(given))["data"][1]["x"]
    first = np.frombuffer(b64decode(told["bdata"]), "<f4")
    second = np.frombuffer(b64decode(other["bdata"]), "<" + other["dtype"])
    return bool(np.allclose(first, second, rtol=1e-6))


def long_curve():
    """A meter's file of 3000 points."""
    lines = ["volume (mL);pH"]
    for at in range(POINTS):
        volume = 25 * at / (POINTS - 1)
        lines.append(f"{volume:.4f};{8 + 3 * math.tanh(3 * (volume - 20)):.3f}")
    return "\n".join(lines) + "\n"


class Wire:
    """A browser that counts what it is sent, packed where the server packs it."""

    def __init__(self, app, summary):
        self.client = TestClient(app, base_url="https://testserver")
        imke = next(one for one in summary.people if one.sign_in_name == "imke")
        told = {"name": "imke", "password": imke.password}
        self.token = self.client.post("/api/session", json=told).json()["form_token"]

    def size(self, url):
        with self.client.stream("GET", url, headers={"Accept-Encoding": "gzip"}) as answer:
            assert answer.status_code == 200, url
            body = b"".join(answer.iter_raw())
            packed = answer.headers.get("content-encoding") == "gzip"
        return len(body), (gzip.decompress(body) if packed else body).decode()

    def page(self, url):
        """Bytes of a page, and of what must be there before it can be read: styles, first script.

        Modules and deferred scripts come after; their bytes are told apart.
        """
        whole, html = self.size(url)
        head = html.partition("</head>")[0]
        first = re.findall(r'<link rel="stylesheet" href="([^"]+)"', head)
        first += re.findall(r'<script src="([^"]+)"', head)
        later = re.findall(r'<script type="module" src="([^"]+)"', head)
        (bundle,) = re.findall(r'<script defer src="([^"]+)"', head)
        return (
            whole,
            sum(self.size(one)[0] for one in first),
            sum(self.size(one)[0] for one in later),
            self.size(bundle)[0],
        )


def main():
    given = arrays()
    plotlys(given)  # the first figure of a process takes much longer
    mine, theirs = timed(ours, given), timed(plotlys, given)
    print(f"chart data of {POINTS} points (same numbers: {same_numbers(given)})")
    print(f"  this program      {1e3 * mine:9.3f} ms, {len(ours(given)):8d} bytes")
    print(f"  Figure + to_json  {1e3 * theirs:9.3f} ms, {len(plotlys(given)):8d} bytes")
    print(f"  ratio             {mine / theirs:9.3f}     (reach: at most 0.1)")
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / "ledger.sqlite"
        database = open_database(sqlite_url(path))
        migrate(database)
        transactions = Transactions(database)
        summary = fill_demo(transactions, now=NOW, zone="Europe/Zurich", progress=lambda _: None)
        settings = Settings(data=Path(folder), database_url=sqlite_url(path))
        app = build_app(settings, transactions=transactions, clock=lambda: NOW)
        wire = Wire(app, summary)
        url = f"/sheets/{summary.curve_sheet_id}/curves/1"
        show("a curve of the demonstration", wire.page(url))
        sheet = summary.open_curve_sheet_id
        content = b64encode(long_curve().encode()).decode()
        entry = {"id": "00000000-0000-4000-8000-00000000b001", "replicate": 4, "slot": "curve",
                 "text": "", "curve": {"file_name": "l", "content_base64": content}}  # fmt: skip
        answer = wire.client.post(
            f"/api/sheets/{sheet}/entries",
            json={"entries": [entry]},
            headers={"X-Form-Token": wire.token},
        )
        assert answer.status_code == 200, answer.text[:500]
        show(f"a curve of {POINTS} points", wire.page(f"/sheets/{sheet}/curves/4"))
        transactions.close()


def show(name, sizes):
    html, first, later, bundle = sizes
    print(f"bytes over the wire: {name}")
    print(f"  page              {html:9d}")
    print(f"  styles, theme     {first:9d}")
    print(f"  its modules       {later:9d}   (after it can be read)")
    print(f"  plotly's script   {bundle:9d}   (after it can be read; gzipped)")
    print(f"  ratio             {(html + first) / bundle:9.4f}   (reach: at most 0.05)")


if __name__ == "__main__":
    main()
