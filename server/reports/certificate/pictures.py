"""The certificate's two pictures as numbers from 0 to 1: replicates around the mean, shares."""

from collections.abc import Iterable, Mapping
from typing import Any

from server.metrology.rounding import rounded
from server.sheets.parts.outcome import printed

_SMALL_PERCENT = 1.0
_MARGIN = 0.06
_LABEL_WIDTH = 0.03


def dots_told(result: Mapping[str, Any]) -> dict[str, Any] | None:
    """Return where the replicates lie between the ends of an axis, or None where none has a value.

    ``low`` and ``high`` are the ends of the mean's 95 % interval, None where one value has none.
    """
    spread = result["spread"]
    values = [one for one in result["replicates"] if one["value"] is not None]
    if not values:
        return None
    interval = spread["ci95"] or ()
    all_values = [one["value"] for one in values] + [spread["mean"], *interval]
    low, high = min(all_values), max(all_values)
    span = (high - low) or abs(spread["mean"]) * 1e-4 or 1.0
    start, width = low - _MARGIN * span, (1 + 2 * _MARGIN) * span

    def at(value: float) -> float:
        return round(float((value - start) / width), 5)

    decimals = printed(result).decimals
    dots = _on_levels(
        {"label": one["label"], "at": at(one["value"]), "out": one["excluded"] is not None}
        for one in values
    )
    return {
        "dots": dots,
        "levels": max(dot["level"] for dot in dots),
        "mean": at(spread["mean"]),
        "low": at(interval[0]) if interval else None,
        "high": at(interval[1]) if interval else None,
        "mean_words": rounded(spread["mean"], -decimals - 1),
        "low_words": rounded(interval[0], -decimals - 1) if interval else "",
        "high_words": rounded(interval[1], -decimals - 1) if interval else "",
        "unit": result["concentration"]["unit"],
    }


def _on_levels(dots: Iterable[dict[str, Any]]) -> list[dict[str, Any]]:
    """Return dots from left to right, each label one level higher where it would hide another."""
    placed: list[dict[str, Any]] = []
    for dot in sorted(dots, key=lambda one: one["at"]):
        near = {one["level"] for one in placed if dot["at"] - one["at"] < _LABEL_WIDTH}
        placed.append({**dot, "level": next(n for n in range(len(near) + 1) if n not in near)})
    return placed


def bars_told(result: Mapping[str, Any]) -> list[dict[str, Any]]:
    """Return the bars of the budget, the longest first; sources under 1 % are one bar."""
    ordered = sorted(result["budget"], key=lambda one: -one["share_percent"])
    large = [one for one in ordered if abs(one["share_percent"]) >= _SMALL_PERCENT]
    small = [one for one in ordered if abs(one["share_percent"]) < _SMALL_PERCENT and one["u"] > 0]
    longest = max((one["share_percent"] for one in large), default=0.0)
    bars = [
        _bar(one["source"], one["share_percent"], longest, shared=one["shared"]) for one in large
    ]
    if small:
        together = sum(one["share_percent"] for one in small)
        name = "1 smaller source" if len(small) == 1 else f"{len(small)} smaller sources together"
        shared = any(one["shared"] for one in small)
        bars.append(_bar(name, together, longest or together, shared=shared))
    return bars


def _bar(label: str, share: float, longest: float, *, shared: bool) -> dict[str, Any]:
    words = "< 1 %" if abs(share) < _SMALL_PERCENT / 2 else f"{share:.0f} %".replace("-", "−")
    length = max(share, 0.0) / longest if longest > 0 else 0.0
    return {"label": label, "share": words, "length": round(min(length, 1.0), 4), "shared": shared}
