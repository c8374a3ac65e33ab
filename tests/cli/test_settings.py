"""Settings: which database, which door."""

from pathlib import Path

import pytest

from server.settings import Settings, SettingsProblem, check_door, is_loopback, read_settings


def _settings(tmp_path: Path, **more: object) -> Settings:
    return read_settings({}, data=tmp_path, **more)


def test_database_is_a_file_in_the_data_folder_unless_the_environment_names_one(
    tmp_path: Path,
) -> None:
    named = read_settings(
        {"TITRANT_LEDGER_DATABASE_URL": "postgresql://ledger@db/lab"}, data=tmp_path
    )

    assert _settings(tmp_path).database_url == f"sqlite:///{tmp_path}/ledger.sqlite"
    assert _settings(tmp_path).keeps_file
    assert named.database_url == "postgresql://ledger@db/lab"
    assert not named.keeps_file


@pytest.mark.parametrize(
    ("host", "wanted"),
    [
        ("127.0.0.1", True),
        ("127.9.9.9", True),
        ("localhost", True),
        ("::1", True),
        ("[::1]", True),
        ("0.0.0.0", False),  # noqa: S104 - that is what is asked about
        ("::", False),
        ("192.168.1.4", False),
        ("bench-server", False),
        ("localhost.elsewhere.example", False),
    ],
)
def test_only_this_machine_is_loopback(host: str, *, wanted: bool) -> None:
    assert is_loopback(host) is wanted


def test_door_to_the_network_needs_tls_a_proxy_or_the_plain_word(tmp_path: Path) -> None:
    certificate, key = tmp_path / "cert.pem", tmp_path / "key.pem"
    certificate.touch()
    key.touch()
    with pytest.raises(SettingsProblem, match="in the clear"):
        check_door(_settings(tmp_path, host="192.168.1.4"))

    check_door(_settings(tmp_path))
    check_door(_settings(tmp_path, host="192.168.1.4", plain_http=True))
    check_door(_settings(tmp_path, host="192.168.1.4", behind_proxy=True))
    check_door(_settings(tmp_path, host="192.168.1.4", tls_cert=certificate, tls_key=key))


def test_half_of_a_tls_pair_and_a_missing_file_are_refused(tmp_path: Path) -> None:
    with pytest.raises(SettingsProblem, match="come together"):
        check_door(_settings(tmp_path, tls_cert=tmp_path / "cert.pem"))
    with pytest.raises(SettingsProblem, match="no file"):
        check_door(_settings(tmp_path, tls_cert=tmp_path / "a", tls_key=tmp_path / "b"))


@pytest.mark.parametrize("port", [-1, 65536])
def test_port_that_is_none_is_refused(tmp_path: Path, port: int) -> None:
    with pytest.raises(SettingsProblem, match="--port"):
        check_door(_settings(tmp_path, port=port))


def test_cookies_are_bound_to_https_where_all_traffic_is(tmp_path: Path) -> None:
    assert _settings(tmp_path, behind_proxy=True).is_secure
    assert not _settings(tmp_path, plain_http=True).is_secure
    assert not _settings(tmp_path).is_secure
