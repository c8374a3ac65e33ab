"""The spread of earlier standardizations by a recipe, for what the next one may expect."""

import json
from collections.abc import Mapping
from typing import Any

from sqlalchemy import select
from sqlalchemy.orm import Session

from server.records.tables.bench import Evaluation, Sheet
from server.records.tables.stores import Recipe

#: The last so many countersigned sheets tell what a laboratory repeats to now.
MOST_SHEETS = 12


def spreads_of_recipe(session: Session, name: str) -> list[Mapping[str, Any]]:
    """Return ``spread`` of the last countersigned results by any version of a recipe."""
    asked = (
        select(Evaluation.snapshot)
        .join(Sheet, Sheet.evaluation_id == Evaluation.id)
        .join(Recipe, Recipe.id == Sheet.recipe_id)
        .where(Recipe.name == name, Sheet.countersigned_at.is_not(None))
        .order_by(Sheet.countersigned_at.desc())
        .limit(MOST_SHEETS)
    )
    return [json.loads(text)["result"]["spread"] for text in session.scalars(asked)]
