"""Forms of lots and bottles."""

from server.procedures.lots import FillBottles, MakeUpLot
from server.web.forms.typed import Typed


def read_make_up(form: Typed) -> MakeUpLot:
    """Return a lot as its maker wrote it."""
    return MakeUpLot(
        titrant=form.text("titrant"),
        nominal=form.decimal("nominal"),
        name=form.text("name"),
        medium=form.text("medium", "water"),
        prepared_on=form.text("prepared_on"),
        made_from=form.text("made_from"),
        preparation=form.text("preparation"),
        recipe_name=form.text("recipe_name"),
        use_by=form.text("use_by"),
        opened_days=form.text("opened_days"),
    )


def read_fill(form: Typed, lot_code: str) -> FillBottles:
    """Return bottles to be filled."""
    return FillBottles(
        lot_code=lot_code,
        place=form.text("place"),
        volume_mL=form.decimal("volume_mL"),
        count=form.whole("count", example="2"),
    )
