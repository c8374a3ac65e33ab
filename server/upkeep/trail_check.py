"""Checking that the trail's chain holds."""

from server.records.trail import TrailCheck, check
from server.records.transaction import Transactions


def check_trail(transactions: Transactions) -> TrailCheck:
    """Return whether the chain of the trail holds, and up to where."""
    return transactions.read(check)
