"""By which ways the end points of a sheet were taken on its curves, and what it is good for."""

from collections.abc import Mapping
from typing import Any

from server.lab.recipe import RecipeDocument


def methods_taken(result: Mapping[str, Any]) -> list[dict[str, Any]]:
    """Return the ways that the counted replicates' end points were taken by on their curves.

    Each is ``method`` and the labels of its ``replicates``; the list is empty where no curve was
    taken. ``result`` is a bench result.
    """
    taken: dict[str, list[str]] = {}
    for one in result.get("methods") or ():
        if one["excluded"] is None and one["taken"]:
            taken.setdefault(one["taken"], []).append(str(one["label"]))
    return [{"method": method, "replicates": labels} for method, labels in taken.items()]


def valid_for_of(recipe: RecipeDocument, result: Mapping[str, Any]) -> str:
    """Return what a number is good for: the recipe's words, with the ways that were really taken.

    Where the recipe's words name its way to the end point and a person took another one, the
    other one stands in its place.
    """
    asked, words = recipe.end_point.method, recipe.valid_for
    taken = [one["method"] for one in methods_taken(result)]
    if asked is None or not taken or taken == [asked]:
        return words
    return words.replace(asked, " and ".join(taken))
