"""The laboratory's signing keys: ES256, in the data folder; a retired key's public half stays.

ES256 (ECDSA on P-256, RFC 7518) rather than Ed25519, because tablets that are some years old can
verify it in the browser. The signature's nonce is made from key and text (RFC 6979), so that the
same text signed by the same key is the same, byte by byte.
"""

import base64
import binascii
import hashlib
import json
import os
import stat
from collections.abc import Mapping
from dataclasses import dataclass, field
from datetime import datetime
from pathlib import Path
from typing import Any
from uuid import uuid4

from cryptography.exceptions import InvalidSignature
from cryptography.hazmat.primitives import hashes
from cryptography.hazmat.primitives.asymmetric import ec
from cryptography.hazmat.primitives.asymmetric.utils import (
    decode_dss_signature,
    encode_dss_signature,
)

ALGORITHM = "ES256"
_CURVE = ec.SECP256R1()
_SIZE = 32
_FOLDER_MODE, _FILE_MODE = 0o700, 0o600
_NAME = "signing-"


class KeyProblem(Exception):
    """The signing keys cannot be used; the text says which file, and what to do."""


@dataclass(frozen=True, slots=True)
class SigningKey:
    """One key: its number, its id (RFC 7638 thumbprint), when it was made and retired."""

    number: int
    kid: str
    made_at: datetime
    retired_at: datetime | None
    public: Mapping[str, str]
    _private: ec.EllipticCurvePrivateKey | None = field(repr=False)

    def sign(self, data: bytes) -> bytes:
        """Return the signature of bytes: 64 bytes, r before s.

        Raises:
            KeyProblem: the key is retired.
        """
        if self._private is None:
            raise KeyProblem(f"Signing key {self.kid} is retired and signs no more.")
        signed = self._private.sign(data, ec.ECDSA(hashes.SHA256(), deterministic_signing=True))
        r, s = decode_dss_signature(signed)
        return r.to_bytes(_SIZE) + s.to_bytes(_SIZE)


@dataclass(frozen=True, slots=True)
class SigningKeys:
    """All keys that the laboratory ever signed with, the oldest first."""

    keys: tuple[SigningKey, ...]

    @property
    def current(self) -> SigningKey:
        """The key that signs today."""
        return self.keys[-1]

    def jwks(self) -> dict[str, Any]:
        """Return the public halves, retired ones too, as a JWK set (RFC 7517), newest first."""
        return {"keys": [dict(key.public) for key in reversed(self.keys)]}


def open_signing_keys(folder: Path, *, now: datetime) -> SigningKeys:
    """Return the keys of a folder; make the first one where there is none.

    Raises:
        KeyProblem: a file is readable by others, or is no key.
    """
    _open_folder(folder)
    if not any(folder.glob(f"{_NAME}*.json")):
        _add_key(folder, 1, now)
    return _read_keys(folder)


def retire_signing_key(folder: Path, *, now: datetime) -> SigningKeys:
    """Make a new key and retire the one that signed: its secret goes, its public half stays.

    Raises:
        KeyProblem: a file is readable by others, or is no key.
    """
    before = open_signing_keys(folder, now=now)
    _add_key(folder, before.current.number + 1, now)
    for key in before.keys:
        if key.retired_at is None:
            _write(_path(folder, key.number), _document(key.public, key.made_at, retired_at=now))
    return _read_keys(folder)


def signature_is_by(public: Mapping[str, Any], data: bytes, signature: bytes) -> bool:
    """Say whether a signature of bytes is by the key with this public half."""
    if len(signature) != 2 * _SIZE:
        return False
    r, s = int.from_bytes(signature[:_SIZE]), int.from_bytes(signature[_SIZE:])
    try:
        key = _public_numbers(public).public_key()
        key.verify(encode_dss_signature(r, s), data, ec.ECDSA(hashes.SHA256()))
    except (InvalidSignature, ValueError, KeyError):
        return False
    return True


def to_base64url(data: bytes) -> str:
    """Return bytes as base64url without padding (RFC 7515)."""
    return base64.urlsafe_b64encode(data).rstrip(b"=").decode("ascii")


def from_base64url(text: str) -> bytes:
    """Return the bytes of base64url without padding.

    Raises:
        ValueError: it is none, or not in the one spelling that its bytes have.
    """
    try:
        data = base64.b64decode(text + "=" * (-len(text) % 4), altchars=b"-_", validate=True)
    except binascii.Error as problem:
        raise ValueError(f"no base64url: {problem}") from problem
    if to_base64url(data) != text:
        raise ValueError("no base64url in its one spelling")
    return data


def _open_folder(folder: Path) -> None:
    folder.mkdir(mode=_FOLDER_MODE, parents=True, exist_ok=True)
    if os.name == "posix" and stat.S_IMODE(folder.stat().st_mode) & 0o022:
        raise KeyProblem(f"Others may write in the key folder {folder}: chmod 700 {folder}")


def _read_keys(folder: Path) -> SigningKeys:
    found = [_read_key(path) for path in folder.glob(f"{_NAME}*.json")]
    keys = sorted(found, key=lambda key: key.number)
    if keys[-1].retired_at is not None:
        raise KeyProblem(f"The newest signing key in {folder} is retired: its successor is gone.")
    return SigningKeys(tuple(keys))


def _read_key(path: Path) -> SigningKey:
    mode = stat.S_IMODE(path.stat().st_mode)
    if os.name == "posix" and mode & 0o077:
        raise KeyProblem(f"Others may read the signing key {path}: chmod 600 {path}")
    try:
        held = json.loads(path.read_text("utf-8"))
        numbers = _public_numbers(held)
        private = None
        if "d" in held:
            private = ec.EllipticCurvePrivateNumbers(_number(held["d"]), numbers).private_key()
        public = _public_jwk(numbers)
        retired = held.get("retired_at")
        return SigningKey(
            number=int(path.stem.removeprefix(_NAME)),
            kid=public["kid"],
            made_at=datetime.fromisoformat(held["made_at"]),
            retired_at=datetime.fromisoformat(retired) if retired else None,
            public=public,
            _private=private,
        )
    except (ValueError, KeyError, TypeError, AttributeError) as problem:
        says = f"{path} is no signing key ({problem}): put it back from a backup."
        raise KeyProblem(says) from problem


def _add_key(folder: Path, number: int, now: datetime) -> None:
    """Add a key under a number; where another process was first, its key stays."""
    private = ec.generate_private_key(_CURVE)
    public = _public_jwk(private.public_key().public_numbers())
    secret = to_base64url(private.private_numbers().private_value.to_bytes(_SIZE))
    _write(_path(folder, number), _document(public, now, secret=secret), only_if_new=True)


def _document(
    public: Mapping[str, str],
    made_at: datetime,
    *,
    secret: str | None = None,
    retired_at: datetime | None = None,
) -> str:
    held = {**public, "made_at": made_at.isoformat()}
    if secret is not None:
        held["d"] = secret
    if retired_at is not None:
        held["retired_at"] = retired_at.isoformat()
    return json.dumps(held, indent=1, sort_keys=True) + "\n"


def _write(path: Path, text: str, *, only_if_new: bool = False) -> None:
    """Write a file whole or not at all, never readable by others, and wait until it is on disk."""
    draft = path.with_name(f".{uuid4()}.draft")
    handle = os.open(draft, os.O_WRONLY | os.O_CREAT | os.O_EXCL, _FILE_MODE)
    try:
        with os.fdopen(handle, "w", encoding="utf-8") as file:
            file.write(text)
            file.flush()
            os.fsync(file.fileno())
        if not only_if_new:
            draft.replace(path)
            return
        try:
            path.hardlink_to(draft)
        except FileExistsError:
            return
    finally:
        draft.unlink(missing_ok=True)


def _path(folder: Path, number: int) -> Path:
    return folder / f"{_NAME}{number:04d}.json"


def _public_jwk(numbers: ec.EllipticCurvePublicNumbers) -> dict[str, str]:
    """Return the public half with its thumbprint (RFC 7638) as key id."""
    required = {
        "crv": "P-256",
        "kty": "EC",
        "x": to_base64url(numbers.x.to_bytes(_SIZE)),
        "y": to_base64url(numbers.y.to_bytes(_SIZE)),
    }
    spelled = json.dumps(required, sort_keys=True, separators=(",", ":"))
    kid = to_base64url(hashlib.sha256(spelled.encode("ascii")).digest())
    return {**required, "kid": kid, "use": "sig", "alg": ALGORITHM}


def _public_numbers(held: Mapping[str, Any]) -> ec.EllipticCurvePublicNumbers:
    return ec.EllipticCurvePublicNumbers(_number(held["x"]), _number(held["y"]), _CURVE)


def _number(text: str) -> int:
    return int.from_bytes(from_base64url(text))
