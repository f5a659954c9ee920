"""Every published value that is carried is also checked, and none is from memory."""

from __future__ import annotations

import csv
import re
from pathlib import Path

from published import FILE

HERE = Path(__file__).resolve().parent
MENTION = re.compile(r"\"((?:[A-Z]{2,}[A-Za-z0-9]*-[\w./-]*)|BLOSS-500-200|CHORD62-)\"")


def test_every_row_is_named_by_a_test() -> None:
    text = "".join(path.read_text(encoding="utf-8") for path in HERE.glob("test_*.py"))
    named = set(MENTION.findall(text)) | {f"CFR213-9-C{number}" for number in range(1, 6)}
    with FILE.open(encoding="utf-8", newline="") as stream:
        identities = [line["id"] for line in csv.DictReader(stream)]
    unused = [identity for identity in identities if not any(identity.startswith(name) for name in named)]
    assert unused == []
    assert len(identities) == len(set(identities))


def test_no_row_is_from_memory() -> None:
    with FILE.open(encoding="utf-8", newline="") as stream:
        for line in csv.DictReader(stream):
            assert line["seen"].strip(), line["id"]
            assert "memory" not in line["seen"], line["id"]
