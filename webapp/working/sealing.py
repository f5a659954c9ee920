"""Results as bytes that nobody else can have made: packed, and signed with the service's key.

Objects are pickled, and a pickle from elsewhere could do anything; so nothing is unpacked whose signature
does not fit, and the signature holds for the key under which it is kept alone.
"""

from __future__ import annotations

import hashlib
import hmac
import pickle
import zlib
from typing import Any

SIGNATURE_BYTES = hashlib.sha256().digest_size
LEVEL = 1


class Seal:
    """Signs results and checks them.

    Parameters
    ----------
    secret : str
        The service's signing key.
    """

    def __init__(self, secret: str) -> None:
        self._key = hmac.digest(secret.encode(), b"results of background work", "sha256")

    def close(self, key: str, data: bytes) -> bytes:
        """Give bytes with their signature before them."""
        return self._signature(key, data) + data

    def open(self, key: str, sealed: bytes) -> bytes | None:
        """Give the bytes, None where they were not signed here for this key."""
        given, data = sealed[:SIGNATURE_BYTES], sealed[SIGNATURE_BYTES:]
        return data if hmac.compare_digest(given, self._signature(key, data)) else None

    def _signature(self, key: str, data: bytes) -> bytes:
        made = hmac.new(self._key, f"{len(key)} {key}\n".encode(), "sha256")
        made.update(data)
        return made.digest()


def pack(value: Any) -> bytes:
    """Give an object as bytes."""
    return zlib.compress(pickle.dumps(value, protocol=5), LEVEL)


def unpack(data: bytes) -> Any:
    """Give the object of bytes whose signature has been checked."""
    return pickle.loads(zlib.decompress(data))  # noqa: S301 - signed by this service
