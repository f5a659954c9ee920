"""What a password must be, how it is kept, and the single-use ones that the operator hands out.

Long enough and hard to guess is all that is asked: no rule on kinds of characters. How many guesses a
password takes is estimated by zxcvbn, which knows the passwords most used, names, keyboard rows, dates and
repeats; the words of the service and of the account count as known to who guesses. Kept is an Argon2id hash.
"""

from __future__ import annotations

import re
import secrets
import unicodedata
from collections.abc import Iterable

from argon2 import PasswordHasher
from argon2.exceptions import InvalidHashError, VerificationError
from zxcvbn import zxcvbn

from cant.errors import InputError

SHORTEST = 12
LONGEST = 128
LONGEST_TYPED = 1_000
"""Of a longer text the rest is not looked at: no password is so long, however its letters are composed."""
STRENGTH = 3
"""At least, of zxcvbn's 0 to 4: more than a hundred million guesses."""
BESIDE = 6
"""Letters and digits that must stand beside words of the service and of the account."""
LOOKED_AT = 72
"""Characters that the estimate looks at; a beginning that is hard to guess is enough."""
WORDS_OF_THE_SERVICE = (
    "cant", "superelevation", "railway", "railroad", "rail", "track", "curve", "curves", "permanent way",
    "permanentway", "equilibrium", "deficiency", "plan", "engineer", "password", "passphrase", "sign in",
)  # fmt: skip
"""Words that come to mind first at this service, and so to who guesses."""
SINGLE_USE_HOURS = 24
LETTERS = "abcdefghjkmnpqrstuvwxyz23456789"
"""Letters and digits that nobody takes for one another."""

_HASHER = PasswordHasher(time_cost=2, memory_cost=19_456, parallelism=1)
"""Argon2id with 19 MiB, two passes and one lane: the first of the settings that OWASP recommends."""
_NOBODYS = _HASHER.hash(secrets.token_urlsafe(32))


def as_kept(password: str) -> str:
    """Give a password in the one form in which it is hashed, however a keyboard composes its letters."""
    return unicodedata.normalize("NFC", password)


def check(password: str, about: Iterable[str] = ()) -> None:
    """Check a new password; InputError says what would be right.

    Parameters
    ----------
    password : str
    about : iterable of str
        Names of whose it is.
    """
    found = as_kept(password)
    if not SHORTEST <= len(found) <= LONGEST:
        message = f"a password needs {SHORTEST} to {LONGEST} characters; this has {len(found)}"
        raise InputError(message)
    known = {word for text in (*about, *WORDS_OF_THE_SERVICE) for word in _words(text)}
    if _beside(found, known) < BESIDE or _is_guessed(found, known):
        message = (
            "this password is easy to guess: it is much used, or made of names, words of this service, rows "
            "of keys, dates or repeats. Several words that have nothing to do with each other are a good one"
        )
        raise InputError(message)


def _words(text: str) -> list[str]:
    plain = text.casefold()
    return [word for word in (plain, *re.split(r"[\W_]+", plain)) if word]


def _beside(password: str, known: set[str]) -> int:
    """Give how many letters and digits stand in a password beside words that come to mind first."""
    rest = password.casefold()
    for word in sorted((word for word in known if len(word) >= 4), key=len, reverse=True):
        rest = rest.replace(word, " ")
    return len(re.sub(r"[\W_]+", "", rest)) if rest != password.casefold() else len(password)


def _is_guessed(password: str, known: set[str]) -> bool:
    plain = password[:LOOKED_AT]
    joined = re.sub(r"[\W_]+", "", plain.casefold())
    forms = [plain, plain.casefold(), *([joined] if joined else [])]
    guesses = (zxcvbn(form, user_inputs=sorted(known)) for form in forms)
    return any(guess["score"] < STRENGTH for guess in guesses)


def hashed(password: str) -> str:
    """Give what is kept of a password."""
    return _HASHER.hash(as_kept(password))


def matches(kept: str, password: str) -> bool:
    """Tell whether a password is the one kept; the work is the same where nothing is kept or known."""
    try:
        return _HASHER.verify(kept or _NOBODYS, as_kept(password[:LONGEST_TYPED])) and bool(kept)
    except (VerificationError, InvalidHashError, UnicodeEncodeError):
        return False


def is_outdated(kept: str) -> bool:
    """Tell whether a hash was made with other settings than today's."""
    return _HASHER.check_needs_rehash(kept)


def single_use() -> str:
    """Make a password for a single use: 79 random bits in four groups."""
    return "-".join("".join(secrets.choice(LETTERS) for _ in range(4)) for _ in range(4))
