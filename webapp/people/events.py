"""What happened to accounts, for who watches over the service: one line each, in the log ``webapp.security``.

No password, code, secret or key ever stands in it, nor a name that is no account's: somebody may have typed a
password there. A text from outside is written as JSON in ASCII, so that it cannot start a line of its own.
"""

from __future__ import annotations

import json
import logging

from flask import has_request_context, request

LOG = logging.getLogger("webapp.security")


def tell(event: str, account: str | None = None, **facts: str | int) -> None:
    """Note an event.

    Parameters
    ----------
    event : str
        What happened, in words of ours.
    account : str, optional
        Whose account it happened to.
    **facts
        What else there is to know.
    """
    said: dict[str, str | int] = {} if account is None else {"account": account}
    if has_request_context():
        said |= {"from": request.remote_addr or "", "request": f"{request.method} {request.endpoint or '-'}"}
    said |= facts
    LOG.info("%s %s", event, " ".join(f"{key}={json.dumps(value)}" for key, value in said.items()))
