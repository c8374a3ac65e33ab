"""The measurements by name."""

from collections.abc import Iterator

from server.upkeep.bench.table import Bench, Line


def _curves() -> Iterator[Line]:
    from server.upkeep.bench.curve_fit import lines  # noqa: PLC0415 - numpy waits

    return lines()


def _upload() -> Iterator[Line]:
    from server.upkeep.bench.curve_upload import lines  # noqa: PLC0415 - the same

    return lines()


BENCHES: tuple[Bench, ...] = (
    Bench(
        "curves",
        "the model fit against lmfit with root finding, its error against the Cramér-Rao bound",
        _curves,
    ),
    Bench("upload", "the whole analysis of an uploaded curve against the model fit alone", _upload),
)


def bench_named(name: str) -> Bench | None:
    """Return the measurement of a name, None where there is none."""
    return next((one for one in BENCHES if one.name == name), None)
