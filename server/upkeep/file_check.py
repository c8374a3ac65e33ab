"""Checking that the originals which are kept are those whose hashes the trail noted."""

import hashlib
import re
from typing import Any

from sqlalchemy.orm import Session

from server.records.queries.load_files import kept_originals
from server.records.trail import DoesNotHold

_SHA256 = re.compile(r'sha256":"([0-9a-f]{64})"')


class FileCheck:
    """The hashes of originals that the trail noted, row by row, and then what is kept."""

    def __init__(self) -> None:
        self._noted: set[bytes] = set()

    def take(self, row: Any) -> None:
        """Remember the hashes that a row of the trail tells."""
        if 'sha256":"' in row.body:
            self._noted.update(bytes.fromhex(one) for one in _SHA256.findall(row.body))

    def check(self, session: Session) -> int:
        """Return how many originals are as they came.

        Raises:
            DoesNotHold: one of them is not, or its coming was never noted.
        """
        count = 0
        for name, sha256, content in kept_originals(session):
            found = hashlib.sha256(content)
            if found.hexdigest() != sha256:
                says = f"The file {name} is not as it came: its SHA-256 is another."
                raise DoesNotHold(says)
            if found.digest() not in self._noted:
                says = f"The file {name} was never noted in the trail."
                raise DoesNotHold(says)
            count += 1
        return count
