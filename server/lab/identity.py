"""What is known of an instrument besides its scale (ISO/IEC 17025, 6.4.13)."""

import re

from server.lab.refusal import Unacceptable

#: What describes an instrument and may be written anew, with a reason.
DESCRIBED = (
    "maker", "type", "serial", "location", "software", "verification", "adjustments",
    "acceptance", "references",
)  # fmt: skip
NOT_APPLICABLE = "not applicable"
_WITH_REASON = re.compile(r"not applicable\s*[:,;(–-]+\s*(?P<why>.*?)\s*\)?", re.IGNORECASE)
_EXAMPLE = "not applicable: glass, nothing in it computes"


def is_not_applicable(text: str) -> bool:
    """Say whether somebody wrote that a field does not apply."""
    return text.strip().lower().startswith(NOT_APPLICABLE)


def check_described(text: str, field: str) -> None:
    """Refuse "not applicable" without its reason."""
    if not is_not_applicable(text):
        return
    found = _WITH_REASON.fullmatch(text.strip())
    if found is None or not found["why"]:
        says = f"{field}: say why it is not applicable."
        raise Unacceptable(says, field=field, example=_EXAMPLE)
