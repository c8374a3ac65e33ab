"""Titrant Ledger: from the first weighing to the number on the bottle."""
