"""Signing off a plan: over what, which signatures hold, and who may take the next step.

A plan is prepared, checked and approved by three people. Each signs over the digest of the file, of every
decision on it and of the version of the program; one decision more, and what was signed before is void. What
was signed stays in the history, whatever became of it.
"""

from __future__ import annotations

import hashlib
import json
from dataclasses import dataclass
from datetime import UTC, datetime

from cant.errors import InputError
from cant.model.signatures import Signature, Signatures
from cant.version import __version__
from webapp.keeping.access import NotAllowedError
from webapp.keeping.accounts import Account
from webapp.keeping.database import Database
from webapp.keeping.signatures import (
    APPROVED,
    CHECKED,
    HANDED_ON,
    PREPARED,
    SENT_BACK,
    SIGNED,
    Entry,
    Signable,
    SignOff,
    entries_at,
)
from webapp.keeping.store import StoredPlan

ROLE = {PREPARED: "prepare", CHECKED: "check", APPROVED: "approve"}
ROLE_AFTER = {PREPARED: "check", CHECKED: "approve"}
STATEMENTS = {
    PREPARED: "I have prepared this plan. I have looked at how the list was read, at the trains, the limits, "
    "the cants and the findings, and I answer for the decisions on it.",
    CHECKED: "I have checked this plan, which I have not prepared: how the list was read, the trains, the "
    "limits, the decisions and the cants.",
    APPROVED: "I approve this plan, which I have neither prepared nor checked, for the use that the "
    "railway's own standard and rules allow.",
}
HOLDS = "holds"
LONGEST_NOTE = 300


@dataclass(frozen=True)
class Standing:
    """How far a plan is signed off.

    Attributes
    ----------
    digest : str
        Of what would be signed now.
    holding : dict of str to Entry
        The signatures that hold, by step, in order.
    next : str or None
        The step that is to be taken next; None where all are.
    in_hand_of : int or None
        The account that has the plan in hand for that step.
    """

    digest: str
    holding: dict[str, Entry]
    next: str | None
    in_hand_of: int | None

    @property
    def last(self) -> Entry | None:
        """The last signature that holds."""
        return list(self.holding.values())[-1] if self.holding else None


def digest_of(plan: StoredPlan, program: str = __version__) -> str:
    """Give the digest of a plan's file, of every decision on it in order, and of a version of the program."""
    decided = [[d.kind, d.content, d.reason, d.who, d.made.astimezone(UTC).isoformat()] for d in plan.history]
    over = ["cant: signed off", program, plan.file_digest, plan.file_name, decided]
    return hashlib.sha256(json.dumps(over, ensure_ascii=True).encode()).hexdigest()


def standing_of(signable: Signable) -> Standing:
    """Tell how far a plan is signed off."""
    return _standing(signable.plan, signable.entries)


def _standing(plan: StoredPlan, entries: tuple[Entry, ...]) -> Standing:
    digest = digest_of(plan)
    valid = [one for one in entries if one.withdrawn is None and one.digest == digest]
    holding: dict[str, Entry] = {}
    in_hand_of: int | None = None
    for one in valid:
        step = next((step for step in SIGNED if step not in holding), None)
        if one.step == step:
            holding[step] = one
            in_hand_of = one.handed_to
        elif one.step == HANDED_ON:
            in_hand_of = one.handed_to
    wanted = next((step for step in SIGNED if step not in holding), None)
    return Standing(digest, holding, wanted, in_hand_of if wanted in (CHECKED, APPROVED) else None)


def fate_of(entry: Entry, plan: StoredPlan) -> str:
    """Say what became of a signature; "" for a step that is none."""
    if entry.step not in SIGNED:
        return ""
    if entry.digest != digest_of(plan):
        if entry.digest == digest_of(plan, entry.program):
            return f"void: signed with version {entry.program} of the program, and this is {__version__}"
        return "void: the plan changed after it"
    return HOLDS if entry.withdrawn is None else "holds no longer: the plan was sent back"


def signatures_of(database: Database, plan: StoredPlan) -> Signatures | None:
    """Give the signatures under a plan that hold, None where none does: for the workbook and the print."""
    standing = _standing(plan, entries_at(database, plan.address))
    if not standing.holding:
        return None
    signed = tuple(Signature(step, one.name, one.made.date()) for step, one in standing.holding.items())
    return Signatures(standing.digest, signed)


@dataclass(frozen=True)
class Due:
    """A plan that waits for somebody.

    Attributes
    ----------
    plan : StoredPlan
    step : str
        The step that he is to take, or :data:`SENT_BACK` where it came back to him.
    by : str
        From whom he has it.
    note : str
    """

    plan: StoredPlan
    step: str
    by: str
    note: str


def due(sign_off: SignOff, who: Account) -> list[Due]:
    """Give the plans that wait for somebody: in his hand, or sent back to him by another."""
    found = []
    for signable in sign_off.touching(who.id):
        last, step = signable.entries[-1], standing_of(signable).next
        if step in (CHECKED, APPROVED) and not why_not_sign(signable, who):
            found.append(Due(signable.plan, step, last.name, last.note))
        elif last.step == SENT_BACK and last.account_id != who.id and _prepared(signable, who):
            found.append(Due(signable.plan, SENT_BACK, last.name, last.note))
    return found


def _prepared(signable: Signable, who: Account) -> bool:
    """Tell whether somebody was the last to sign that he has prepared a plan."""
    signed_it = [one.account_id for one in signable.entries if one.step == PREPARED]
    return bool(signed_it) and signed_it[-1] == who.id and signable.plan.may_edit


def why_not_sign(signable: Signable, who: Account) -> str:
    """Say why somebody may not take the next step, "" where he may."""
    standing, step = standing_of(signable), standing_of(signable).next
    if step is None:
        return "the plan is prepared, checked and approved"
    if not signable.plan.decided.confirmed:
        return "the cants of this plan have not been confirmed; nobody can sign it before"
    if ROLE[step] not in who.roles:
        return f"your account does not have the role to {ROLE[step]}"
    if step == PREPARED:
        return "" if signable.plan.may_edit else "only who may change a plan signs that he has prepared it"
    if any(one.account_id == who.id for one in standing.holding.values()):
        return f"who has signed a plan already does not sign it as {step} as well"
    if who.who in signable.editors | {decision.account for decision in signable.plan.history}:
        return f"who may change a plan, or has decided on it, does not sign it as {step}"
    return "" if standing.in_hand_of == who.id else "the plan is in somebody else's hand"


def why_not_send_back(signable: Signable, who: Account) -> str:
    """Say why somebody may not send a plan back, "" where he may: who has it in hand, and who signed last."""
    standing = standing_of(signable)
    if standing.last is None:
        return "nobody has signed the plan as it is now"
    return "" if who.id in (standing.in_hand_of, standing.last.account_id) else "the plan is not in your hand"


def why_not_hand_on(signable: Signable, who: Account) -> str:
    """Say why somebody may not hand a plan to another colleague, "" where he may: who signed last."""
    standing = standing_of(signable)
    if standing.last is None or standing.next is None:
        return "there is nothing to hand on"
    return "" if standing.last.account_id == who.id else "only who signed last hands the plan on"


def colleagues(signable: Signable, who: Account, accounts: list[Account], after: str) -> list[Account]:
    """Give to whom a plan may be handed after a step: who has the role, and is none of those before."""
    role = ROLE_AFTER.get(after)
    signed = {one.account_id for one in standing_of(signable).holding.values()} | {who.id}
    hands = signable.editors | {decision.account for decision in signable.plan.history}
    return [
        one
        for one in accounts
        if role in one.roles and not one.disabled and one.id not in signed and one.who not in hands
    ]


def signed(signable: Signable, who: Account, seen: str, to: Account | None, note: str) -> Entry:
    """Give the next signature under a plan.

    Parameters
    ----------
    signable : Signable
    who : Account
        Who signs.
    seen : str
        Digest of what he has before him.
    to : Account or None
        Whom he hands it to.
    note : str

    Raises
    ------
    NotAllowedError
        He may not.
    InputError
        The plan is no longer what he has before him, or cannot be handed to that colleague.
    """
    standing = standing_of(signable)
    if (why := why_not_sign(signable, who)) or standing.next is None:
        raise NotAllowedError(why)
    if seen != standing.digest:
        message = "the plan changed since you opened this page; look at it again before you sign"
        raise InputError(message)
    _check_colleague(signable, who, to, standing.next)
    return _entry(standing.next, who, standing.digest, note, to, STATEMENTS[standing.next])


def sent_back(signable: Signable, who: Account, note: str) -> Entry:
    """Give the step that sends a plan back; NotAllowedError, or InputError without a note."""
    if why := why_not_send_back(signable, who):
        raise NotAllowedError(why)
    if not note:
        message = "a note is missing: say what is to be changed"
        raise InputError(message)
    return _entry(SENT_BACK, who, standing_of(signable).digest, note, None)


def handed_on(signable: Signable, who: Account, to: Account | None, note: str) -> Entry:
    """Give the step that hands a plan to another colleague; NotAllowedError, or InputError without one."""
    if why := why_not_hand_on(signable, who):
        raise NotAllowedError(why)
    last = standing_of(signable).last
    if to is None or last is None:
        message = "choose a colleague"
        raise InputError(message)
    _check_colleague(signable, who, to, last.step)
    return _entry(HANDED_ON, who, standing_of(signable).digest, note, to)


def _check_colleague(signable: Signable, who: Account, to: Account | None, after: str) -> None:
    if to is not None and to not in colleagues(signable, who, [to], after):
        message = f"the plan cannot be handed to {to.shown}: choose one of the colleagues that are offered"
        raise InputError(message)


def _entry(step: str, who: Account, digest: str, note: str, to: Account | None, statement: str = "") -> Entry:
    return Entry(
        step=step,
        account_id=who.id,
        name=who.shown,
        note=note,
        statement=statement,
        digest=digest,
        program=__version__,
        handed_to=None if to is None else to.id,
        made=datetime.now(UTC),
    )
