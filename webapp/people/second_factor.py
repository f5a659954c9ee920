"""The second factor: codes of a device that change with the time (TOTP, RFC 6238), each good once.

A code holds for the 30 seconds in which it is shown, and no longer.
"""

from __future__ import annotations

import hmac
import time

import pyotp
import segno

ISSUER = "Cant"
SECONDS = 30


def new_secret() -> str:
    """Make a secret: 160 random bits, base 32."""
    return pyotp.random_base32()


def step_now() -> int:
    """Give the number of the time step that it is now."""
    return int(time.time() // SECONDS)


def step_of(secret: str, code: str) -> int | None:
    """Give the time step for which a code is right, None where it is not right now."""
    given = "".join(code.split())
    step = step_now()
    right = pyotp.TOTP(secret).generate_otp(step)
    return step if hmac.compare_digest(right.encode(), given.encode("utf-8", "replace")) else None


def address_of(secret: str, name: str) -> str:
    """Give the address that a device takes the secret from."""
    return pyotp.TOTP(secret).provisioning_uri(name=name, issuer_name=ISSUER)


def picture_of(secret: str, name: str) -> str:
    """Give that address as a QR code: an SVG element without style or script."""
    code = segno.make(address_of(secret, name), error="m", micro=False)
    return code.svg_inline(scale=5, border=4, dark="#000", light="#fff", svgclass="qr", lineclass=None)


def in_groups(secret: str) -> str:
    """Give a secret as it is typed by hand."""
    return " ".join(secret[i : i + 4] for i in range(0, len(secret), 4))
