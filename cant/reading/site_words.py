"""The situations of curves: from the column Situation to the letter, from remarks where limits have rules.

A word that the limits have a rule for only ever makes limits stricter, so taking it out of a remark is on the
safe side; any other remark stays what it is.
"""

from __future__ import annotations

from cant.reading.draft import Draft
from cant.reading.sheet_column import Column
from cant.reading.situations import known_situations, read_situations, situations_in
from cant.reading.text import fold, is_blank, shown, squeeze
from cant.reading.words import lexicon, meaning_of


def fill_situations(draft: Draft) -> None:
    """Set the situations of every row; an unknown word under Situation makes its row one that is refused."""
    item = draft.column("Situation")
    if item is not None:
        strict = item.is_canonical or fold(item.heading.text).startswith(("situa", "situas", "sytuac"))
        unknown = _from_column(draft, item, strict)
        if unknown and not strict:
            item.note = f"words that are no situation are left as they are, such as '{unknown[0]}'"
    _from_remarks(draft)


def _from_column(draft: Draft, item: Column, strict: bool) -> list[str]:
    known = draft.context.situations
    left: list[str] = []
    listed = ", ".join(sorted(known_situations(draft.context.limits)))
    for index, cell in enumerate(item.cells):
        if is_blank(cell):
            continue
        words, unknown = read_situations(squeeze(shown(cell)), known)
        draft.situations[index] = words
        if unknown and strict:
            draft.fail(index, item, f"the situation '{unknown[0]}' is not known; known are {listed}")
        left += unknown
    return left


def _from_remarks(draft: Draft) -> None:
    limits = draft.context.limits
    ruled = (
        {row.situation.casefold() for row in limits.rows if row.situation} - {"plain"} if limits else set()
    )
    if not ruled:
        return
    for item in draft.columns:
        if item.meaning == "Remarks":
            _add(
                draft,
                item,
                {i: situations_in(shown(c), ruled) for i, c in enumerate(item.cells) if c is not None},
            )
        elif item.meaning in ("", "Other"):
            word = lexicon("trade_situations").get(item.heading.words, item.heading.words)
            if word in ruled:
                _add(
                    draft, item, {i: frozenset({word}) for i, c in enumerate(item.cells) if _is_yes(shown(c))}
                )


def _is_yes(text: str) -> bool:
    return meaning_of("yes_no", text) == "yes" or text == "TRUE"


def _add(draft: Draft, item: Column, words_by_row: dict[int, frozenset[str]]) -> None:
    found: dict[str, int] = {}
    for index, words in words_by_row.items():
        if words:
            draft.situations[index] = (draft.situations[index] - {"plain"}) | words
        for word in words:
            found[word] = found.get(word, 0) + 1
    if found:
        listed = ", ".join(f"{word} ({count} rows)" for word, count in sorted(found.items()))
        item.note = f"situations taken from here, for which the limits have rules: {listed}"
