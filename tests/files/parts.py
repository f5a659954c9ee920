"""Helpers to look into packages: parts, differences, and other readers' opinions."""

from __future__ import annotations

import io
import subprocess
import zipfile
from collections import Counter
from collections.abc import Sequence
from pathlib import Path

import xlsxwriter
from lxml import etree

from cant.files.additions import AddedColumn, OutCell, SheetAddition
from cant.files.package import resolve
from cant.files.sheet_edit import _ORDER


def parts_of(data: bytes) -> dict[str, bytes]:
    archive = zipfile.ZipFile(io.BytesIO(data))
    assert archive.testzip() is None
    return {name: archive.read(name) for name in archive.namelist()}


def zipped(parts: dict[str, bytes]) -> bytes:
    out = io.BytesIO()
    with zipfile.ZipFile(out, "w", zipfile.ZIP_DEFLATED) as archive:
        for name, content in parts.items():
            archive.writestr(name, content)
    return out.getvalue()


def changed_parts(old: bytes, new: bytes) -> set[str]:
    """Give the parts of ``old`` that are not byte-identical in ``new``."""
    before, after = parts_of(old), parts_of(new)
    return {name for name in before if after.get(name) != before[name]}


def lost_elements(old: bytes, new: bytes) -> list[str]:
    """Give the elements of an XML part that the new one lacks, with their attributes, text and ancestors.

    An extent and a row's ``spans`` may grow, and a count may rise; that is no loss.
    """
    return sorted((_elements(old) - _elements(new)).elements())


def _elements(data: bytes) -> Counter[str]:
    found: Counter[str] = Counter()
    for one in etree.fromstring(data).iter():
        if not isinstance(one.tag, str):
            continue
        name = etree.QName(one).localname
        loose = {"spans", "count", "uniqueCount"} | ({"ref"} if name == "dimension" else set())
        attributes = sorted((key, value) for key, value in one.attrib.items() if key not in loose)
        path = "/".join(etree.QName(above).localname for above in one.iterancestors())
        found[f"{path}|{name}|{attributes}|{(one.text or '').strip()}"] += 1
    return found


def check_package(data: bytes) -> None:
    """Check what a strict reader asks of a package: types, targets, unique names, order in a sheet."""
    parts = parts_of(data)
    types = etree.fromstring(parts["[Content_Types].xml"])
    named = [one.get("PartName") for one in types if one.get("PartName")]
    assert len(named) == len(set(named))
    assert {name.lstrip("/").lower() for name in named} <= {name.lower() for name in parts}
    extensions = {one.get("Extension").lower() for one in types if one.get("Extension")}
    for name, content in parts.items():
        assert "/" + name in named or name.rpartition(".")[2].lower() in extensions or name.startswith("[")
        if name.endswith(".rels"):
            _check_relations(name, content, parts)
        if name.startswith("xl/worksheets/sheet"):
            children = [etree.QName(one).localname for one in etree.fromstring(content)]
            known = [_ORDER.index(one) for one in children if one in _ORDER]
            assert known == sorted(known), children
    book = etree.fromstring(parts["xl/workbook.xml"])
    for path, key in (("sheets", "name"), ("sheets", "sheetId")):
        found = [one.get(key) for one in book.find(f"{{*}}{path}")]
        assert len(found) == len(set(found))


def _check_relations(name: str, content: bytes, parts: dict[str, bytes]) -> None:
    relations = list(etree.fromstring(content))
    assert len({one.get("Id") for one in relations}) == len(relations)
    lower = {part.lower() for part in parts}
    for one in relations:
        if one.get("TargetMode") != "External":
            source = name.replace("_rels/", "").removesuffix(".rels")
            assert resolve(source, one.get("Target")).lower() in lower
            assert not one.get("Target").startswith("//")


def simple_workbook(rows: Sequence[Sequence[object]], name: str = "Curves") -> bytes:
    out = io.BytesIO()
    with xlsxwriter.Workbook(out, {"strings_to_formulas": False}) as book:
        page = book.add_worksheet(name)
        for number, row in enumerate(rows):
            page.write_row(number, 0, row)
    return out.getvalue()


def one_column(sheet: str, header_row: int, value: float = 60.0, heading: str = "New cant") -> SheetAddition:
    return SheetAddition(sheet, header_row, [AddedColumn(heading, {header_row + 1: OutCell(value)})])


def office_pdf(data: bytes, folder: Path) -> bytes:
    """Let LibreOffice open a workbook and print it."""
    source = folder / "book.xlsx"
    source.write_bytes(data)
    profile = f"-env:UserInstallation=file://{folder}/profile"
    command = ["soffice", "--headless", profile, "--convert-to", "pdf", "--outdir", str(folder), str(source)]
    done = subprocess.run(command, capture_output=True, text=True, timeout=180, check=True)
    assert "Error" not in done.stdout + done.stderr
    return (folder / "book.pdf").read_bytes()


def office_converted(data: bytes, folder: Path, suffix: str, source_suffix: str = "xlsx") -> bytes:
    """Let LibreOffice open a workbook, recalculate it, and save it in another format."""
    source = folder / f"book.{source_suffix}"
    source.write_bytes(data)
    out = folder / "out"
    profile = f"-env:UserInstallation=file://{folder}/profile"
    command = ["soffice", "--headless", profile, "--convert-to", suffix, "--outdir", str(out), str(source)]
    subprocess.run(command, capture_output=True, text=True, timeout=180, check=True)
    return (out / f"book.{suffix}").read_bytes()
