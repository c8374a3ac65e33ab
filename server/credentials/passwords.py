"""Passwords: argon2id, two at once at most; what a new one must be."""

import threading
from collections.abc import Iterable

from argon2 import PasswordHasher
from argon2.exceptions import InvalidHashError, VerificationError
from argon2.low_level import Type

from server.lab.refusal import Unacceptable

LEAST_CHARACTERS = 8
MOST_CHARACTERS = 256
# OWASP's argon2id minimum with one pass: 46 MiB, t = 1, p = 1
_HASHER = PasswordHasher(
    time_cost=1, memory_cost=47104, parallelism=1, hash_len=32, salt_len=16, type=Type.ID
)
# 46 MiB each: more than two at once would starve the benches
_SLOTS = threading.BoundedSemaphore(2)

_COMMON = frozenset(
    """
    12345678 123456789 1234567890 11111111 00000000 88888888 87654321 password password1 password12
    password123 passw0rd qwertyui qwertyuiop qwerty123 qwerty12 1q2w3e4r 1qaz2wsx asdfghjk asdfghjkl
    zxcvbnm1 iloveyou sunshine princess football baseball superman trustno1 letmein1 welcome1
    welcome123 admin123 administrator changeme changeme1 abcd1234 abc12345 abcdefgh 12341234
    1234qwer computer internet whatever starwars michelle jennifer laboratory labor123 chemistry
    titrant1 titrantledger titration permanganate
    """.split()
)


def hash_password(password: str) -> str:
    """Return the argon2id hash of a password, with its parameters and salt."""
    with _SLOTS:
        return _HASHER.hash(password)


def verify_password(password_hash: str, password: str) -> bool:
    """Say whether a password is the one that was hashed."""
    if len(password) > MOST_CHARACTERS:
        return False
    with _SLOTS:
        try:
            return _HASHER.verify(password_hash, password)
        except (VerificationError, InvalidHashError):
            return False


def needs_rehash(password_hash: str) -> bool:
    """Say whether a hash was made with other parameters than today's."""
    return _HASHER.check_needs_rehash(password_hash)


def check_new_password(password: str, *, names: Iterable[str] = ()) -> None:
    """Refuse a new password that is too short, too long, very common, or made of a name.

    Raises:
        Unacceptable: in words; there are no rules about kinds of characters.
    """
    field = "password"
    if len(password) < LEAST_CHARACTERS:
        says = f"The password has {len(password)} characters; it needs {LEAST_CHARACTERS} at least."
        raise Unacceptable(says, field=field, example="four words that only you would put together")
    if len(password) > MOST_CHARACTERS:
        says = f"The password is longer than {MOST_CHARACTERS} characters."
        raise Unacceptable(says, field=field)
    plain = password.strip().lower()
    if plain in _COMMON or len(set(plain)) < 3:
        says = "This password is among the most common ones; others would try it first."
        raise Unacceptable(says, field=field)
    if any(plain == name.strip().lower() for name in names if name.strip()):
        raise Unacceptable("The password must not be your name.", field=field)
