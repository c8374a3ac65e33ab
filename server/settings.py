"""Settings: read once from arguments and environment, handed down as values."""

import ipaddress
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path

from server.upkeep.mail_server import MailProblem, MailServer, read_mail_server

DATABASE_VARIABLE = "TITRANT_LEDGER_DATABASE_URL"
MAIL_VARIABLE = "TITRANT_LEDGER_SMTP_URL"
DEFAULT_HOST, DEFAULT_PORT = "127.0.0.1", 8017
DATABASE_FILE = "ledger.sqlite"
KEY_FOLDER = "keys"


class SettingsProblem(Exception):
    """Settings with which the program will not start, in a sentence."""


@dataclass(frozen=True, slots=True)
class Settings:
    """How this program was started. ``database_url`` names the file in ``data`` where absent."""

    data: Path
    database_url: str
    host: str = DEFAULT_HOST
    port: int = DEFAULT_PORT
    tls_cert: Path | None = None
    tls_key: Path | None = None
    behind_proxy: bool = False
    plain_http: bool = False
    mail: MailServer | None = None

    @property
    def is_secure(self) -> bool:
        """Whether browsers reach this server by https only."""
        return self.behind_proxy or self.tls_cert is not None

    @property
    def key_folder(self) -> Path:
        """Where the laboratory's signing keys lie, readable by the program's owner alone."""
        return self.data / KEY_FOLDER

    @property
    def keeps_file(self) -> bool:
        """Whether the database is a file, so that its folder must be there."""
        return self.database_url.startswith("sqlite")


def read_settings(environment: Mapping[str, str], *, data: Path, **given: object) -> Settings:
    """Return the settings for a data folder; the environment may name another database.

    It may name a server for e-mail as well.

    Raises:
        SettingsProblem: the server for e-mail is none.
    """
    url = environment.get(DATABASE_VARIABLE, "").strip()
    chosen = url or f"sqlite:///{(data / DATABASE_FILE).resolve()}"
    mail: MailServer | None = None
    if environment.get(MAIL_VARIABLE, "").strip():
        try:
            mail = read_mail_server(environment[MAIL_VARIABLE])
        except MailProblem as problem:
            raise SettingsProblem(f"{MAIL_VARIABLE}: {problem}") from problem
    return Settings(data=data, database_url=chosen, mail=mail, **given)  # type: ignore[arg-type]


def check_door(settings: Settings) -> None:
    """Refuse to open a door to the network over which passwords would travel in the clear.

    Raises:
        SettingsProblem: a host other than loopback without TLS, proxy or the plain-http word; half
            of a TLS pair; a port that is none.
    """
    if (settings.tls_cert is None) != (settings.tls_key is None):
        raise SettingsProblem("--tls-cert and --tls-key come together: give both or neither.")
    for path in (settings.tls_cert, settings.tls_key):
        if path is not None and not path.is_file():
            raise SettingsProblem(f"There is no file {path}.")
    if not 0 <= settings.port <= 65535:
        raise SettingsProblem(f"--port must be from 0 to 65535, not {settings.port}.")
    if is_loopback(settings.host) or settings.is_secure or settings.plain_http:
        return
    says = (
        f"{settings.host} can be reached from other machines, and passwords would travel in the "
        "clear. Give --tls-cert and --tls-key, or --behind-proxy where a proxy speaks https, or "
        "say --plain-http if you accept it."
    )
    raise SettingsProblem(says)


def is_loopback(host: str) -> bool:
    """Say whether only this machine can reach a host."""
    if host == "localhost":
        return True
    try:
        return ipaddress.ip_address(host.strip("[]")).is_loopback
    except ValueError:
        return False
