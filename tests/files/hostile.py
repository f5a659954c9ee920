"""Makers of files that are built, or broken, to do harm; each with what ought to happen to it.

All are made here from nothing; none is large until it is unpacked.
"""

from __future__ import annotations

import io
import random
import struct
import zipfile
import zlib
from collections.abc import Callable
from dataclasses import dataclass

MAIN = "http://schemas.openxmlformats.org/spreadsheetml/2006/main"
OFFICE = "http://schemas.openxmlformats.org/officeDocument/2006/relationships"
PACKAGE = "http://schemas.openxmlformats.org/package/2006"
HEAD = '<?xml version="1.0" encoding="UTF-8" standalone="yes"?>'
READ = "read"
"""The file is to be read, within bounds."""


@dataclass(frozen=True)
class Hostile:
    """A hostile file.

    Attributes
    ----------
    make : callable
        Gives its bytes.
    expected : str
        ``READ``, or words of the refusal's message.
    suffix : str
        Suffix under which it poses.
    """

    make: Callable[[], bytes]
    expected: str
    suffix: str


FILES: dict[str, Hostile] = {}


def hostile(expected: str, suffix: str = ".xlsx") -> Callable[[Callable[[], bytes]], Callable[[], bytes]]:
    def note(make: Callable[[], bytes]) -> Callable[[], bytes]:
        FILES[make.__name__] = Hostile(make, expected, suffix)
        return make

    return note


def sheet(rows: str, before: str = "", after: str = "") -> str:
    return f'{HEAD}<worksheet xmlns="{MAIN}">{before}<sheetData>{rows}</sheetData>{after}</worksheet>'


def book_parts(
    sheets: dict[str, str | bytes], shared: str | None = None, styles: str | None = None
) -> dict[str, str | bytes]:
    """Give the parts of a minimal workbook."""
    relations, entries, overrides = [], [], []
    parts: dict[str, str | bytes] = {}
    for number, (name, content) in enumerate(sheets.items(), start=1):
        part = f"xl/worksheets/sheet{number}.xml"
        parts[part] = content
        target = f"worksheets/sheet{number}.xml"
        relations.append(f'<Relationship Id="rId{number}" Type="{OFFICE}/worksheet" Target="{target}"/>')
        entries.append(f'<sheet name="{name}" sheetId="{number}" r:id="rId{number}"/>')
        overrides.append(_override(part, "worksheet"))
    for kind, text in (("sharedStrings", shared), ("styles", styles)):
        if text is not None:
            parts[f"xl/{kind}.xml"] = text
            relations.append(f'<Relationship Id="rId{kind}" Type="{OFFICE}/{kind}" Target="{kind}.xml"/>')
            overrides.append(_override(f"xl/{kind}.xml", kind))
    first = {
        "[Content_Types].xml": f'{HEAD}<Types xmlns="{PACKAGE}/content-types"><Default Extension="rels" '
        'ContentType="application/vnd.openxmlformats-package.relationships+xml"/><Default Extension="xml" '
        f'ContentType="application/xml"/>{_override("xl/workbook.xml", "sheet.main")}{"".join(overrides)}'
        "</Types>",
        "_rels/.rels": f'{HEAD}<Relationships xmlns="{PACKAGE}/relationships"><Relationship Id="rId1" '
        f'Type="{OFFICE}/officeDocument" Target="xl/workbook.xml"/></Relationships>',
        "xl/workbook.xml": f'{HEAD}<workbook xmlns="{MAIN}" xmlns:r="{OFFICE}"><sheets>{"".join(entries)}'
        "</sheets></workbook>",
        "xl/_rels/workbook.xml.rels": f'{HEAD}<Relationships xmlns="{PACKAGE}/relationships">'
        f"{''.join(relations)}</Relationships>",
    }
    return first | parts


def _override(part: str, kind: str) -> str:
    main = "application/vnd.openxmlformats-officedocument.spreadsheetml"
    return f'<Override PartName="/{part}" ContentType="{main}.{kind}+xml"/>'


def zipped(parts: dict[str, str | bytes]) -> bytes:
    out = io.BytesIO()
    with zipfile.ZipFile(out, "w", zipfile.ZIP_DEFLATED) as archive:
        for name, content in parts.items():
            archive.writestr(name, content)
    return out.getvalue()


def book(rows: str, before: str = "", after: str = "", **more: str) -> bytes:
    return zipped(book_parts({"Curves": sheet(rows, before, after)}, **more))


def with_bomb(part: str, unit: bytes, repeats: int, head: bytes = b"", tail: bytes = b"") -> bytes:
    """Give a workbook in which one part unpacks to ``head``, ``unit`` many times, ``tail``."""
    parts = book_parts({"Curves": sheet(GOOD_ROWS)}, shared=f'{HEAD}<sst xmlns="{MAIN}"/>')
    parts[part] = b"PLACEHOLDER"
    engine = zlib.compressobj(9, zlib.DEFLATED, -15)
    packed = engine.compress(head) + engine.flush(zlib.Z_FULL_FLUSH)
    block = engine.compress(unit) + engine.flush(zlib.Z_FULL_FLUSH)
    packed += block * repeats + engine.compress(tail) + engine.flush()
    return with_packed(parts, part, packed, len(head) + len(unit) * repeats + len(tail))


def with_packed(parts: dict[str, str | bytes], part: str, packed: bytes, size: int, crc: int = 0) -> bytes:
    """Give a zip in which ``part`` holds bytes packed by hand."""
    body, directory = b"", b""
    for name, content in parts.items():
        raw = content.encode() if isinstance(content, str) else content
        engine = zlib.compressobj(9, zlib.DEFLATED, -15)
        data = engine.compress(raw) + engine.flush()
        fields = (zlib.crc32(raw), len(data), len(raw))
        if name == part:
            data, fields = packed, (crc, len(packed), size)
        local = struct.pack("<4s5H3I2H", b"PK\3\4", 20, 0, 8, 0, 0x21, *fields, len(name), 0) + name.encode()
        directory += struct.pack(
            "<4s6H3I5H2I", b"PK\1\2", 20, 20, 0, 8, 0, 0x21, *fields, len(name), 0, 0, 0, 0, 0, len(body)
        ) + name.encode()  # fmt: skip
        body += local + data
    end = struct.pack("<4s4H2IH", b"PK\5\6", 0, 0, len(parts), len(parts), len(directory), len(body), 0)
    return body + directory + end


GOOD_ROWS = (
    '<row r="1"><c r="A1" t="inlineStr"><is><t>Curve</t></is></c><c r="B1" t="inlineStr"><is><t>Radius'
    '</t></is></c></row><row r="2"><c r="A2" t="inlineStr"><is><t>C1</t></is></c><c r="B2"><v>400</v></c>'
    "</row>"
)


def good_parts() -> dict[str, str | bytes]:
    return book_parts({"Curves": sheet(GOOD_ROWS)})


# --- archives ------------------------------------------------------------------------------------------


@hostile("refused")
def sheet_of_two_gigabytes_of_blanks() -> bytes:
    return with_bomb("xl/worksheets/sheet1.xml", b" " * (1 << 20), 2000, sheet("").encode())


@hostile("refused")
def sheet_of_two_gigabytes_of_rows() -> bytes:
    unit = b'<row r="1"><c r="A1"><v>1</v></c></row>' * 20_000
    return with_bomb("xl/worksheets/sheet1.xml", unit, 2600)


@hostile("refused")
def ten_million_shared_strings() -> bytes:
    head = f'{HEAD}<sst xmlns="{MAIN}">'.encode()
    return with_bomb("xl/sharedStrings.xml", b"<si/>" * 200_000, 50, head, b"</sst>")


@hostile("refused")
def one_string_of_a_gigabyte() -> bytes:
    head = f'{HEAD}<sst xmlns="{MAIN}"><si><t>'.encode()
    return with_bomb("xl/sharedStrings.xml", b"x" * (1 << 20), 1000, head, b"</t></si></sst>")


@hostile("refused")
def content_types_of_a_gigabyte() -> bytes:
    return with_bomb("[Content_Types].xml", b" " * (1 << 20), 1000)


@hostile("size and checksum")
def size_forged_small() -> bytes:
    parts = good_parts()
    engine = zlib.compressobj(9, zlib.DEFLATED, -15)
    packed = engine.compress(b" " * 50_000_000) + engine.flush()
    return with_packed(parts, "xl/worksheets/sheet1.xml", packed, 1000)


@hostile("size and checksum")
def checksum_forged() -> bytes:
    raw = sheet(GOOD_ROWS).encode()
    engine = zlib.compressobj(9, zlib.DEFLATED, -15)
    packed = engine.compress(raw) + engine.flush()
    return with_packed(good_parts(), "xl/worksheets/sheet1.xml", packed, len(raw), crc=1)


@hostile("cannot be unpacked")
def compressed_bytes_are_garbage() -> bytes:
    return with_packed(good_parts(), "xl/worksheets/sheet1.xml", b"\xff" * 200, 1000)


@hostile("damaged")
def archive_cut_in_the_middle() -> bytes:
    data = zipped(good_parts())
    return data[: len(data) // 2]


@hostile("damaged")
def directory_cut() -> bytes:
    return zipped(good_parts())[:-30]


@hostile("damaged")
def directory_points_out_of_the_file() -> bytes:
    data = bytearray(zipped(good_parts()))
    at = data.rfind(b"PK\1\2")
    data[at + 42 : at + 46] = struct.pack("<I", 0xFFFFFF0)
    return bytes(data)


@hostile("refused")
def members_overlap() -> bytes:
    data = bytearray(zipped(good_parts()))
    first = data.find(b"PK\1\2")
    second = data.find(b"PK\1\2", first + 4)
    data[second + 42 : second + 46] = data[first + 42 : first + 46]
    return bytes(data)


@hostile("password-protected")
def member_flagged_as_encrypted() -> bytes:
    data = bytearray(zipped(good_parts()))
    at = data.find(b"PK\1\2")
    data[at + 8] |= 1
    return bytes(data)


@hostile("compressed in a way")
def unusual_compression() -> bytes:
    out = io.BytesIO()
    with zipfile.ZipFile(out, "w", zipfile.ZIP_BZIP2) as archive:
        for name, content in good_parts().items():
            archive.writestr(name, content)
    return out.getvalue()


@hostile("points out of the file")
def names_that_climb_out() -> bytes:
    return zipped(good_parts() | {"../../evil.txt": "x"})


@hostile("same name")
def the_same_name_twice() -> bytes:
    data = zipped(good_parts() | {"xl/worksheets/sheet2.xml": sheet("")})
    return data.replace(b"xl/worksheets/sheet2.xml", b"xl/worksheets/sheet1.xml")


@hostile("parts")
def ten_thousand_members() -> bytes:
    return zipped(good_parts() | {f"xl/media/{number}.bin": "" for number in range(10_000)})


@hostile("zip archive")
def archive_of_an_archive() -> bytes:
    return zipped({"inner.xlsx": zipped(good_parts())})


@hostile("zip archive")
def archive_with_nothing_in_it() -> bytes:
    return zipped({})


@hostile("no workbook part")
def package_without_a_workbook() -> bytes:
    parts = good_parts()
    del parts["_rels/.rels"]
    return zipped(parts)


@hostile("missing")
def sheet_part_missing() -> bytes:
    parts = good_parts()
    del parts["xl/worksheets/sheet1.xml"]
    return zipped(parts)


# --- sheets --------------------------------------------------------------------------------------------


@hostile(READ)
def one_cell_at_the_far_corner() -> bytes:
    return book(GOOD_ROWS + '<row r="1048576"><c r="XFD1048576"><v>1</v></c></row>')


@hostile("too large")
def far_cells_in_ten_thousand_rows() -> bytes:
    return book("".join(f'<row r="{n}"><c r="XFD{n}"><v>1</v></c></row>' for n in range(1, 10_001)))


@hostile("row numbered 2000000000")
def row_two_billion() -> bytes:
    return book('<row r="2000000000"><c r="A2000000000"><v>1</v></c></row>')


@hostile("beyond the last column")
def column_beyond_the_last() -> bytes:
    return book('<row r="1"><c r="ZZZ1"><v>1</v></c></row>')


@hostile(READ)
def extent_declared_huge() -> bytes:
    return book(GOOD_ROWS, before='<dimension ref="A1:XFD1048576"/>')


@hostile(READ)
def extent_declared_too_small() -> bytes:
    return book(GOOD_ROWS, before='<dimension ref="A1"/>')


@hostile(READ)
def merged_over_everything() -> bytes:
    ranges = '<mergeCell ref="A1:XFD1048576"/>' * 3
    return book(GOOD_ROWS, after=f"<mergeCells>{ranges}</mergeCells>")


@hostile("merged ranges")
def three_hundred_thousand_merged_ranges() -> bytes:
    ranges = "".join(f'<mergeCell ref="D{n}:E{n}"/>' for n in range(1, 300_001))
    return book(GOOD_ROWS, after=f"<mergeCells>{ranges}</mergeCells>")


@hostile(READ)
def every_row_formatted_to_the_bottom() -> bytes:
    rows = "".join(f'<row r="{n}" s="1" customFormat="1"/>' for n in range(3, 1_048_577, 8))
    return book(GOOD_ROWS + rows)


@hostile(READ)
def columns_hidden_to_the_end_many_times() -> bytes:
    columns = '<col min="3" max="16384" hidden="1"/>' * 2000
    return book(GOOD_ROWS, before=f"<cols>{columns}</cols>")


@hostile(READ)
def twenty_thousand_validations() -> bytes:
    rules = "".join(
        f'<dataValidation type="list" sqref="Z{n}"><formula1>"a,b"</formula1></dataValidation>'
        for n in range(1, 20_001)
    )
    return book(GOOD_ROWS, after=f'<dataValidations count="20000">{rules}</dataValidations>')


@hostile("300 sheets")
def three_hundred_sheets() -> bytes:
    return zipped(book_parts({f"S{n}": sheet("") for n in range(300)}))


@hostile("5000 sheets")
def five_thousand_sheets_on_one_part() -> bytes:
    parts = good_parts()
    entries = "".join(f'<sheet name="S{n}" sheetId="{n}" r:id="rId1"/>' for n in range(1, 5001))
    parts["xl/workbook.xml"] = (
        f'{HEAD}<workbook xmlns="{MAIN}" xmlns:r="{OFFICE}"><sheets>{entries}</sheets></workbook>'
    )
    return zipped(parts)


@hostile("one and the same part")
def two_hundred_sheets_on_one_large_part() -> bytes:
    rows = "".join(f'<row r="{n}"><c r="A{n}"><v>{n}</v></c></row>' for n in range(1, 60_001))
    parts = book_parts({"S1": sheet(rows)})
    entries = "".join(f'<sheet name="S{n}" sheetId="{n}" r:id="rId1"/>' for n in range(1, 201))
    parts["xl/workbook.xml"] = (
        f'{HEAD}<workbook xmlns="{MAIN}" xmlns:r="{OFFICE}"><sheets>{entries}</sheets></workbook>'
    )
    return zipped(parts)


@hostile("which the file does not have")
def text_number_out_of_range() -> bytes:
    return book('<row r="1"><c r="A1" t="s"><v>7</v></c></row>', shared=f'{HEAD}<sst xmlns="{MAIN}"/>')


@hostile("which the file does not have")
def text_number_negative() -> bytes:
    shared = f'{HEAD}<sst xmlns="{MAIN}"><si><t>a</t></si></sst>'
    return book('<row r="1"><c r="A1" t="s"><v>-1</v></c></row>', shared=shared)


@hostile(READ)
def style_number_out_of_range() -> bytes:
    return book('<row r="1"><c r="A1" s="9999999"><v>7</v></c></row>')


@hostile(READ)
def numbers_that_are_none() -> bytes:
    values = ["nan", "inf", "1e999", "1_000", "--1", "0x10", "1,5", "٣"]
    cells = "".join(f'<c r="{chr(65 + n)}1"><v>{value}</v></c>' for n, value in enumerate(values))
    return book(f'<row r="1">{cells}</row>')


@hostile("order")
def cells_out_of_order() -> bytes:
    return book('<row r="1"><c r="B1"><v>1</v></c><c r="A1"><v>1</v></c></row>')


@hostile("is named")
def cell_named_nonsense() -> bytes:
    return book('<row r="1"><c r="1A;drop"><v>1</v></c></row>')


@hostile("not a row")
def rows_with_something_between() -> bytes:
    return book('<row r="1"><c r="A1"><v>1</v></c></row><evil/>')


@hostile("refused")
def text_of_two_million_characters() -> bytes:
    return book(f'<row r="1"><c r="A1" t="inlineStr"><is><t>{"x" * 2_000_000}</t></is></c></row>')


@hostile(READ)
def text_like_formulas() -> bytes:
    texts = ["=1+1", "+cmd|' /C calc'!A0", "-2+3", "@SUM(A1)", '=HYPERLINK("http://x")']
    cells = "".join(
        f'<c r="{chr(65 + n)}1" t="inlineStr"><is><t>{text}</t></is></c>' for n, text in enumerate(texts)
    )
    return book(f'<row r="1">{cells}</row>')


# --- XML -----------------------------------------------------------------------------------------------


def _sheet_with_doctype(doctype: str, text: str) -> bytes:
    xml = (
        f'<?xml version="1.0"?>{doctype}<worksheet xmlns="{MAIN}"><sheetData><row r="1"><c r="A1" '
        f't="inlineStr"><is><t>{text}</t></is></c></row></sheetData></worksheet>'
    )
    return zipped(book_parts({"Curves": xml}))


@hostile("document type")
def entities_that_multiply() -> bytes:
    lines = "".join(f'<!ENTITY e{n} "{f"&e{n - 1};" * 10}">' for n in range(1, 12))
    return _sheet_with_doctype(f'<!DOCTYPE w [<!ENTITY e0 "ha">{lines}]>', "&e11;")


@hostile("document type")
def one_long_entity_many_times() -> bytes:
    return _sheet_with_doctype(f'<!DOCTYPE w [<!ENTITY e "{"x" * 100_000}">]>', "&e;" * 20_000)


@hostile("document type")
def entity_from_a_file() -> bytes:
    return _sheet_with_doctype('<!DOCTYPE w [<!ENTITY e SYSTEM "file:///etc/passwd">]>', "&e;")


@hostile("document type")
def doctype_in_the_workbook_part() -> bytes:
    parts = good_parts()
    parts["xl/workbook.xml"] = str(parts["xl/workbook.xml"]).replace(HEAD, HEAD + "<!DOCTYPE x>")
    return zipped(parts)


@hostile("undefined entity")
def undefined_entity() -> bytes:
    return book('<row r="1"><c r="A1" t="str"><v>&nope;</v></c></row>')


@hostile("deep")
def tags_nested_two_hundred_thousand_deep() -> bytes:
    deep = "<a>" * 200_000 + "</a>" * 200_000
    return book(GOOD_ROWS, after=f"<extLst>{deep}</extLst>")


@hostile(READ)
def two_hundred_thousand_attributes() -> bytes:
    many = " ".join(f'a{n}="1"' for n in range(200_000))
    return book(GOOD_ROWS, before=f"<sheetPr {many}/>")


@hostile("damaged")
def xml_cut_in_a_row() -> bytes:
    return zipped(book_parts({"Curves": sheet(GOOD_ROWS)[:-60]}))


@hostile("damaged")
def xml_that_is_not_xml() -> bytes:
    return zipped(book_parts({"Curves": "Curve;Radius\n1;2\n"}))


@hostile("encoding")
def encoding_that_does_not_exist() -> bytes:
    text = sheet(GOOD_ROWS).replace('encoding="UTF-8"', 'encoding="no-such-thing"')
    return zipped(book_parts({"Curves": text}))


@hostile(READ)
def cells_hidden_in_comments_and_cdata() -> bytes:
    rows = GOOD_ROWS.replace("<t>C1</t>", '<t><![CDATA[<c r="A9"><v>666</v></c>]]></t>')
    return book('<!-- <row r="7"><c r="A7"><v>666</v></c></row> -->' + rows)


# --- other kinds ---------------------------------------------------------------------------------------


def ole(*streams: str) -> bytes:
    """Give a compound file whose directory names streams; there is nothing in them."""
    head = bytearray(512)
    head[:8] = b"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1"
    head[24:34] = struct.pack("<5H", 0x3E, 3, 0xFFFE, 9, 6)
    head[44:76] = struct.pack("<8I", 1, 1, 0, 4096, 0xFFFFFFFE, 0, 0xFFFFFFFE, 0)
    head[76:512] = struct.pack("<I", 0) + b"\xff" * 432
    fat = struct.pack("<3I", 0xFFFFFFFD, 0xFFFFFFFE, 0xFFFFFFFE) + b"\xff" * 500
    directory = b""
    for name, kind in [("Root Entry", 5), *((stream, 2) for stream in streams)]:
        raw = name.encode("utf-16-le")
        entry = raw.ljust(64, b"\0") + struct.pack("<HBB3I", len(raw) + 2, kind, 1, *([0xFFFFFFFF] * 3))
        directory += entry.ljust(128, b"\0")
    return bytes(head) + fat + directory.ljust(512, b"\0")


@hostile("password-protected")
def encrypted_workbook() -> bytes:
    return ole("EncryptionInfo", "EncryptedPackage")


@hostile("text document", ".xls")
def text_document_as_xls() -> bytes:
    return ole("WordDocument")


@hostile("damaged", ".xls")
def xls_with_an_empty_workbook() -> bytes:
    return ole("Workbook")


@hostile("damaged", ".xls")
def xls_of_random_bytes() -> bytes:
    return ole("Workbook") + random.Random(7).randbytes(100_000)


@hostile("picture")
def picture_as_workbook() -> bytes:
    return b"\x89PNG\r\n\x1a\n" + b"\0" * 100


@hostile("PDF")
def pdf_as_workbook() -> bytes:
    return b"%PDF-1.7\n" + b"x" * 100


@hostile("web page", ".xls")
def web_page_as_workbook() -> bytes:
    return b"<html><table><tr><td>Curve</td></tr></table></html>"


@hostile("XML document", ".xls")
def xml_spreadsheet_of_2003() -> bytes:
    return b'<?xml version="1.0"?><Workbook xmlns="urn:schemas-microsoft-com:office:spreadsheet"/>'


@hostile("empty")
def nothing_at_all() -> bytes:
    return b""


@hostile("neither a workbook nor text")
def random_bytes() -> bytes:
    return random.Random(5).randbytes(50_000)


@hostile("text document")
def docx_as_workbook() -> bytes:
    return zipped({"[Content_Types].xml": "<Types/>", "word/document.xml": "<x/>"})


def _ods(content: str) -> bytes:
    kind = "application/vnd.oasis.opendocument.spreadsheet"
    return zipped({"mimetype": kind, "content.xml": content})


def ods_table(rows: str) -> bytes:
    names = "urn:oasis:names:tc:opendocument:xmlns"
    return _ods(
        f'{HEAD}<o:document-content xmlns:o="{names}:office:1.0" xmlns:table="{names}:table:1.0" '
        f'xmlns:text="{names}:text:1.0"><o:body><o:spreadsheet><table:table table:name="S">{rows}'
        "</table:table></o:spreadsheet></o:body></o:document-content>"
    )


@hostile("too large", ".ods")
def ods_that_repeats_a_value_everywhere() -> bytes:
    return ods_table(
        '<table:table-row table:number-rows-repeated="1048576"><table:table-cell o:value-type="float" '
        'o:value="1" table:number-columns-repeated="16384"/></table:table-row>'
    )


@hostile(READ, ".ods")
def ods_with_blanks_to_the_corner() -> bytes:
    return ods_table(
        '<table:table-row><table:table-cell o:value-type="float" o:value="1"/></table:table-row>'
        '<table:table-row table:number-rows-repeated="1048575"><table:table-cell '
        'table:number-columns-repeated="16384"/></table:table-row>'
    )


@hostile("document type", ".ods")
def ods_with_a_doctype() -> bytes:
    return _ods('<?xml version="1.0"?><!DOCTYPE x [<!ENTITY e "x">]><x>&e;</x>')


@hostile("damaged", ".ods")
def ods_without_content() -> bytes:
    return zipped({"mimetype": "application/vnd.oasis.opendocument.spreadsheet"})


# --- separated text ------------------------------------------------------------------------------------


@hostile("columns", ".csv")
def line_of_two_million_commas() -> bytes:
    return b"," * 2_000_000


@hostile("quotation mark", ".csv")
def quotation_mark_never_closed() -> bytes:
    return b'Curve,Radius\nC1,"400\n' + b"C2,500\n" * 300_000


@hostile(READ, ".csv")
def quotation_mark_never_closed_in_a_short_file() -> bytes:
    return b'Curve,Radius\nC1,"400\nC2,500\n'


@hostile("neither a workbook nor text", ".csv")
def zeros_in_text() -> bytes:
    return b"Curve,Radius\nC1\0,400\n"


@hostile("does not go on", ".csv")
def utf16_mark_on_an_odd_number_of_bytes() -> bytes:
    return b"\xff\xfeC\0u\0r"


@hostile("columns", ".csv")
def wide_line_far_down() -> bytes:
    return b"Curve,Radius\nC1,400\n" + b"1," * 600 + b"1\n"


@hostile("too large", ".csv")
def ten_million_short_lines() -> bytes:
    return b"1\n" * 10_000_000


@hostile(READ, ".csv")
def control_characters() -> bytes:
    return b"Curve,Radius\nC\x01\x02\x1b1,400\n"


@hostile(READ, ".csv")
def formulas_in_text() -> bytes:
    return b"Curve,Radius\n=cmd|' /C calc'!A0,400\n"


@hostile("columns", ".csv")
def semicolons_without_end() -> bytes:
    return b";" * 3_000_000 + b"\n"
