"""Operations on sharing: links of a plan made, listed and withdrawn; one opened; a shared plan given up."""

from __future__ import annotations

from datetime import date, datetime
from typing import Annotated, Any, Literal

from flask import url_for
from pydantic import Field

from webapp.api.models import Given, Name, PlanSummary, Taken
from webapp.api.operations import operation
from webapp.context import running, stored
from webapp.keeping.shares import Share, Shares
from webapp.security import new_key, owner


class ShareBody(Taken):
    """A link to be made: for whom, what it lets do, and its last day."""

    label: Name
    access: Literal["read", "edit"] = "read"
    until: Annotated[date | None, Field(strict=False)] = None


class ShareEntry(Given):
    """A link of a plan, without its secret."""

    number: int
    label: str
    access: Literal["read", "edit"]
    made: datetime
    until: date | None
    holders: int

    @classmethod
    def of(cls, share: Share, **more: Any) -> ShareEntry:
        """Make the entry of a link."""
        return cls(
            number=share.number,
            label=share.label,
            access="edit" if share.may_edit else "read",
            made=share.made,
            until=share.until,
            holders=share.holders,
            **more,
        )


class ShareMade(ShareEntry):
    """A link that was just made, with its secret, which is told this once."""

    secret: str
    link: str


class ShareList(Given):
    """The links of a plan."""

    shares: list[ShareEntry]


class SecretBody(Taken):
    """The secret of a link: what stands behind ``/shared/``."""

    secret: Annotated[str, Field(min_length=1, max_length=100)]


@operation("POST", "/plans/{address}/shares", code=201, answer=ShareMade, body=ShareBody)
def make_share(address: str, body: ShareBody) -> ShareEntry:
    """Make a link of a plan; its secret is told this once."""
    share, secret = _shares().make(
        owner(), address, body.label, may_edit=body.access == "edit", until=body.until
    )
    link = url_for("sharing.open_link", secret=secret, _external=True)
    return ShareMade.of(share, secret=secret, link=link)


@operation("GET", "/plans/{address}/shares", answer=ShareList)
def list_shares(address: str) -> ShareList:
    """List the links of a plan, and how many hold what each gave them."""
    return ShareList(shares=[ShareEntry.of(share) for share in _shares().of_plan(owner(), address)])


@operation("DELETE", "/plans/{address}/shares/{share}", code=204)
def withdraw_share(address: str, share: int) -> None:
    """Withdraw a link: who opened it can open the plan no more."""
    _shares().withdraw(owner(), address, share)


@operation("POST", "/shared", answer=PlanSummary, body=SecretBody, open=True)
def open_shared_plan(body: SecretBody) -> PlanSummary:
    """Take what a link offers; the plan is then among the caller's, who gets a key where he had none."""
    shares = _shares()
    shares.offer(owner(), body.secret)
    key = new_key()
    return PlanSummary.of(stored(shares.accept(owner(), body.secret).address), key)


@operation("DELETE", "/shared/{address}", code=204)
def leave_shared_plan(address: str) -> None:
    """Give up a plan that somebody else shared."""
    _shares().leave(owner(), address)


def _shares() -> Shares:
    return Shares(running().database)
