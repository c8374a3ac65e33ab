"""The post office: writes letters about what changed and hands them over, apart from every act.

It is woken after each commit and looks by itself now and then, for time changes states as well.
No act waits for it, and none fails because a letter does.
"""

import logging
import threading
from collections.abc import Callable
from datetime import datetime

from server.procedures.letters import (
    NewLetter,
    TakenLetter,
    keep_letters,
    record_sent,
    record_unsent,
    take_letter,
)
from server.records.queries.list_letters import due_letters
from server.records.transaction import Transactions
from server.sheets.letters import open_letters
from server.upkeep.mail_server import MailProblem, MailServer, send_letter

_LOG = logging.getLogger(__name__)
_LOOKS_EVERY_S = 300.0
_RESTS_S = 1.0
_MOST_A_ROUND = 100


class PostOffice:
    """Sends notices by e-mail in a thread of its own."""

    def __init__(
        self, transactions: Transactions, server: MailServer, *, clock: Callable[[], datetime]
    ) -> None:
        self._transactions, self._server, self._clock = transactions, server, clock
        self._woken, self._ended = threading.Event(), threading.Event()
        self._thread = threading.Thread(target=self._loop, name="post office", daemon=True)

    def start(self) -> None:
        """Begin, and be woken after every commit from now on."""
        self._transactions.after_commit(self._woken.set)
        self._thread.start()

    def close(self) -> None:
        """Finish the letter that is on its way, then end the thread."""
        self._ended.set()
        self._woken.set()
        self._thread.join()

    def round(self) -> int:
        """Write and send what is due; return how many letters the server has taken."""
        now = self._clock()
        drafts = self._transactions.read(lambda session: open_letters(session, now=now))
        if drafts:
            letters = [
                NewLetter(one.watch_id, one.changed_at, one.address, one.subject, one.body)
                for one in drafts
            ]
            self._transactions.write(lambda session: keep_letters(session, letters, now=now))
        due = self._transactions.read(lambda session: due_letters(session, now=now))
        sent = 0
        for _ in due[:_MOST_A_ROUND]:
            if self._ended.is_set():
                break
            taken = self._transactions.write(lambda session: take_letter(session, now=now))
            sent += taken is not None and self._send(taken)
        return sent

    def _send(self, letter: TakenLetter) -> bool:
        try:
            send_letter(self._server, to=letter.address, subject=letter.subject, body=letter.body)
        except MailProblem as problem:
            says = str(problem)
            _LOG.warning("A letter was not sent: %s", says)
            self._transactions.write(lambda session: record_unsent(session, letter.id, says))
            return False
        sent_at = self._clock()
        self._transactions.write(lambda session: record_sent(session, letter.id, now=sent_at))
        return True

    def _loop(self) -> None:
        while not self._ended.is_set():
            self._woken.clear()
            try:
                self.round()
            except Exception:  # noqa: BLE001 - a letter that fails must not end the thread
                _LOG.exception("The post office could not work this time; it tries again.")
            self._ended.wait(_RESTS_S)
            if not self._ended.is_set():
                self._woken.wait(_LOOKS_EVERY_S)
