"""How much may be asked of the service, and how much it keeps: every bound in one record, with its default.

The defaults let a busy office of thirty people behind one address work without noticing them.
"""

from __future__ import annotations

import os
from collections.abc import Mapping
from dataclasses import dataclass, fields

from cant.errors import InputError

PREFIX = "CANT_"


@dataclass(frozen=True)
class Bounds:
    """Bounds of one running service; each is set by the variable of its name in capitals behind ``CANT_``.

    Attributes
    ----------
    requests_per_minute : int
        Requests of one person: a browser, the holder of a key, or an account.
    requests_per_minute_address : int
        Requests from one address (of IPv6 addresses the first 64 bits count).
    uploads_per_minute, uploads_per_minute_address : int
        Requests that make a plan or bring a file.
    sign_ins_per_minute : int
        Tries to sign in from one address as one account; as any account six times as many.
    wrong_links_per_minute : int
        Share links from one address that open nothing.
    wrong_plans_per_minute : int
        Addresses of plans, asked for from one address, that are not there for who asks.
    plans_per_person : int
        Plans that one person keeps at the same time.
    mb_per_person : int
        Their files together [MB of 1e6 bytes].
    mb_decided_per_person : int
        The decisions on one person's plans and the limits that he keeps, together [MB].
    mb_in_all : int
        The files of everybody together [MB]; 0 is as much as the disk takes.
    mb_kept_free : int
        Room that must stay free on the disk of the data folder [MB].
    computing_at_once : int
        Requests that compute at the same time in one process; 0 is one more than there are processors.
    wait_seconds : int
        How long a request waits for its turn before it is told that the service is busy.
    header_kb : int
        Largest header of a request [kB of 1e3 bytes].
    seconds_to_send : int
        How long a request may take to arrive, and a minute more for each 10 MB of it.
    connections : int
        Connections open at the same time; half of them from one address that is no proxy of ours.
    seconds_to_stop : int
        How long requests under way may take when the service is told to stop.
    """

    requests_per_minute: int = 3_000
    requests_per_minute_address: int = 30_000
    uploads_per_minute: int = 600
    uploads_per_minute_address: int = 2_000
    sign_ins_per_minute: int = 10
    wrong_links_per_minute: int = 30
    wrong_plans_per_minute: int = 120
    plans_per_person: int = 500
    mb_per_person: int = 2_000
    mb_decided_per_person: int = 50
    mb_in_all: int = 0
    mb_kept_free: int = 200
    computing_at_once: int = 0
    wait_seconds: int = 20
    header_kb: int = 32
    seconds_to_send: int = 60
    connections: int = 1_000
    seconds_to_stop: int = 20

    @property
    def turns(self) -> int:
        """How many requests compute at the same time."""
        return self.computing_at_once or (os.cpu_count() or 1) + 1

    @classmethod
    def from_environment(cls, given: Mapping[str, str]) -> Bounds:
        """Take the bounds from variables; InputError where one is not a whole number."""
        found = {}
        for bound in fields(cls):
            least = 0 if bound.default == 0 else 1
            name = f"{PREFIX}{bound.name.upper()}"
            found[bound.name] = whole_number(given, name, int(str(bound.default)), least)
        return cls(**found)


def whole_number(given: Mapping[str, str], name: str, default: int, least: int = 1) -> int:
    """Give a whole number of the environment, the default where it is blank; InputError where it is none."""
    text = given.get(name, "").strip()
    if not text:
        return default
    if not (text.isascii() and text.isdigit()) or len(text) > 12 or int(text) < least:
        message = f"{name} is '{text}'; a whole number {'above' if least else 'of at least'} 0 is needed"
        raise InputError(message)
    return int(text)
