"""Standard lots and recipes."""

from typing import Annotated, Any

from fastapi import APIRouter, Query, Response

from server.lab.refusal import SavedFirst
from server.procedures.stores import receive_standard_lot, write_recipe
from server.records.queries.load_papers import load_recipe_fact
from server.sheets.standard_lot_page import open_standard_lot
from server.sheets.stores_page import open_recipe, open_stores
from server.web.forms.posts import Again, Posted
from server.web.forms.stores import fill_recipe_form, read_recipe_form, read_standard_lot
from server.web.pages.keeping import open_for_keeper
from server.web.showing import show
from server.web.visits import AtDesk

router = APIRouter()
_LOT_NEW, _RECIPE_NEW = "stores/standard_lot_new.html", "stores/recipe_new.html"


@router.get("/stores")
def home(visit: AtDesk) -> Response:
    """Show standard lots and recipes."""
    return show(visit, "stores/home.html", open_stores)


@router.get("/stores/standard-lots/new")
def standard_lot_form(visit: AtDesk) -> Response:
    """Show the form for a new standard lot."""
    return show(visit, _LOT_NEW, open_for_keeper)


@router.post("/stores/standard-lots/new")
def receive(post: Posted) -> Response:
    """Receive a standard lot."""

    def work() -> str:
        made = post.act(receive_standard_lot, read_standard_lot(post.form))
        return f"/stores/standard-lots/{made}"

    return post.answer(work, again=Again(_LOT_NEW, open_for_keeper))


@router.get("/stores/standard-lots/{standard_lot_id}")
def standard_lot(visit: AtDesk, standard_lot_id: str) -> Response:
    """Show a standard lot."""
    return show(visit, "stores/standard_lot.html", open_standard_lot, standard_lot_id)


@router.get("/stores/recipes/new")
def recipe_form(visit: AtDesk, before: Annotated[str, Query(alias="from")] = "") -> Response:
    """Show the form for a recipe, filled from the version that it follows."""

    def opened(session: Any, **who: Any) -> Any:
        open_for_keeper(session, **who)
        return load_recipe_fact(session, before) if before else None

    return show(
        visit,
        _RECIPE_NEW,
        opened,
        with_page=lambda page: {"typed": fill_recipe_form(page) if page else {}},
    )


@router.post("/stores/recipes/new")
def write(post: Posted) -> Response:
    """Write a recipe, or its next version."""

    def work() -> str:
        try:
            made = post.act(write_recipe, read_recipe_form(post.form))
        except SavedFirst as refusal:
            standing = refusal.shown.get("standing", {}).get("version", 0)
            refusal.shown["typed"] = {"version": str(standing)}
            raise
        return f"/stores/recipes/{made}"

    return post.answer(work, again=Again(_RECIPE_NEW, open_for_keeper))


@router.get("/stores/recipes/{recipe_id}")
def recipe(visit: AtDesk, recipe_id: str) -> Response:
    """Show one version of a recipe."""
    return show(visit, "stores/recipe.html", open_recipe, recipe_id)
