"""What a reverse proxy says of a request is believed, and nobody else: address, protocol and host name."""

from __future__ import annotations

import ipaddress
from collections.abc import Iterable, Sequence
from typing import TYPE_CHECKING

from werkzeug.middleware.proxy_fix import ProxyFix

if TYPE_CHECKING:
    from _typeshed.wsgi import StartResponse, WSGIApplication, WSGIEnvironment

FROM_PROXY = "cant.from_proxy"
"""Key of the WSGI environment: whether the request came by a proxy that is believed."""
SAID_BY_PROXIES = (
    "HTTP_X_FORWARDED_FOR",
    "HTTP_X_FORWARDED_PROTO",
    "HTTP_X_FORWARDED_HOST",
    "HTTP_X_FORWARDED_PORT",
    "HTTP_X_FORWARDED_PREFIX",
    "HTTP_FORWARDED",
)


class Proxies:
    """Believes the headers of a reverse proxy where it is one of ours, and drops them where not.

    Parameters
    ----------
    application : WSGI application
    trusted : sequence of str
        Addresses and networks.
    """

    def __init__(self, application: WSGIApplication, trusted: Sequence[str]) -> None:
        self._direct = application
        self._behind = ProxyFix(application, x_for=1, x_proto=1, x_host=1)
        self._trusted = tuple(trusted)

    def __call__(self, environ: WSGIEnvironment, start_response: StartResponse) -> Iterable[bytes]:
        """Answer a request."""
        environ[FROM_PROXY] = is_among(environ.get("REMOTE_ADDR", ""), self._trusted)
        if environ[FROM_PROXY]:
            return self._behind(environ, start_response)
        for name in SAID_BY_PROXIES:
            environ.pop(name, None)
        return self._direct(environ, start_response)


def is_among(address: str, networks: Iterable[str]) -> bool:
    """Tell whether an address is one of some addresses or networks."""
    try:
        found = ipaddress.ip_address(address)
    except ValueError:
        return False
    plain = getattr(found, "ipv4_mapped", None) or found
    return any(plain in ipaddress.ip_network(one) for one in networks)
