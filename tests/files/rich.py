"""A workbook with much of what a spreadsheet program can put into one, to see that none of it is lost.

XlsxWriter makes what it can; parts of kinds that it does not know are put in by hand. The line is invented.
"""

from __future__ import annotations

import base64
import io
import zipfile
from typing import Any

import xlsxwriter

PICTURE = base64.b64decode(
    "iVBORw0KGgoAAAANSUhEUgAAAAEAAAABCAYAAAAfFcSJAAAADUlEQVR42mNk+M9QDwADhgGAWjR9awAAAABJRU5ErkJggg=="
)
ROWS = 40
HEADINGS = ["Curve", "Start (km)", "Radius (m)", "Cant (mm)", "Surveyed", "Steepness", "Remark"]
OFFICE = "http://schemas.openxmlformats.org/officeDocument/2006/relationships"
_MAIN = "application/vnd.openxmlformats-officedocument.spreadsheetml"


def rich_workbook() -> bytes:
    """Give an .xlsx with charts, pictures, notes, threads, tables, filters, protections and more."""
    out = io.BytesIO()
    book = xlsxwriter.Workbook(out)
    curves = _curves_sheet(book)
    _charts_and_pictures(book, curves)
    _table_sheet(book)
    _protected_sheet(book)
    hidden = book.add_worksheet("Lists")
    hidden.write_column("A1", ["L", "R"])
    hidden.hide()
    chart_sheet = book.add_chartsheet("Diagram")
    chart = book.add_chart({"type": "bar"})
    chart.add_series({"values": f"=Curves!$D$4:$D${ROWS + 3}"})
    chart_sheet.set_chart(chart)
    book.define_name("Steepest", "=MAX(Curves!$F$4:$F$43)")
    book.define_name("Curves!Local", "=Curves!$A$4")
    book.set_properties({"title": "Vale line", "company": "Nobody in particular"})
    book.set_custom_property("Checked", True)
    book.close()
    return _with_unknown_parts(out.getvalue())


def _curves_sheet(book: Any) -> Any:
    page = book.add_worksheet("Curves")
    bold = book.add_format({"bold": True, "bg_color": "#DDEEFF", "border": 1, "text_wrap": True})
    number = book.add_format({"num_format": "0.000", "border": 1})
    date = book.add_format({"num_format": "dd.mm.yyyy"})
    plain = book.add_format({"border": 1, "font_color": "#224466", "valign": "top"})
    page.merge_range("A1:G1", "Vale line, up track", bold)
    page.write_rich_string("A2", "State of ", bold, "spring", plain)
    page.write_row("A3", HEADINGS, bold)
    for row in range(3, 3 + ROWS):
        page.write(row, 0, f"C{row - 2}", plain)
        page.write(row, 1, 1.25 + 0.4 * row, number)
        page.write(row, 2, 300 + 17 * row % 900, plain)
        page.write(row, 3, 5 * (row % 30), plain)
        page.write_number(row, 4, 45000 + row, date)
        page.write_formula(row, 5, f"=D{row + 1}/C{row + 1}", number, 5 * (row % 30) / (300 + 17 * row % 900))
        if row % 3:
            page.write_string(row, 6, ["=not a formula", "level crossing & points", "  "][row % 3], plain)
    page.write_dynamic_array_formula("J4:J6", "=UNIQUE(C4:C6)")
    page.write_comment("A5", "Rail worn", {"author": "Surveyor"})
    page.data_validation(
        "D4:D43", {"validate": "integer", "criteria": "between", "minimum": 0, "maximum": 160}
    )
    page.data_validation("G4:G43", {"validate": "list", "source": "=Lists!$A$1:$A$2"})
    page.conditional_format("C4:C43", {"type": "data_bar", "bar_solid": True, "data_bar_2010": True})
    page.conditional_format("D4:D43", {"type": "3_color_scale"})
    page.add_sparkline("I4", {"range": "Curves!B4:D4"})
    page.autofilter("A3:G43")
    page.freeze_panes(3, 1)
    page.set_row(9, None, None, {"hidden": True})
    page.set_row(11, 30, None, {"level": 1})
    page.set_column("B:B", 12, None, {"level": 1})
    page.set_column("L:XFD", None, None, {"hidden": True})
    page.write_url("A46", "https://line.example/", string="register")
    page.print_area("A1:G43")
    page.repeat_rows(2)
    page.set_header("&L&G", {"image_left": "h.png", "image_data_left": io.BytesIO(PICTURE)})
    page.set_h_pagebreaks([20])
    page.ignore_errors({"number_stored_as_text": "A1:A43"})
    return page


def _charts_and_pictures(book: Any, page: Any) -> None:
    chart = book.add_chart({"type": "scatter", "subtype": "straight"})
    chart.add_series(
        {"categories": "=Curves!$B$4:$B$43", "values": "=Curves!$D$4:$D$43", "trendline": {"type": "linear"}}
    )
    chart.set_title({"name": "Cant along the line"})
    page.insert_chart("A50", chart)
    page.insert_image("H50", "p.png", {"image_data": io.BytesIO(PICTURE)})
    page.insert_textbox("A70", "Values before tamping")
    page.insert_button("E70", {"caption": "Nothing"})
    page.embed_image("H4", "e.png", {"image_data": io.BytesIO(PICTURE)})
    page.insert_checkbox("I6", True)


def _table_sheet(book: Any) -> None:
    page = book.add_worksheet("Branch")
    data = [["B1", 400, 60], ["B2", 500, 40], ["B3", 600, 20]]
    columns = [{"header": "Curve"}, {"header": "Radius"}, {"header": "Cant"}]
    page.add_table("A1:C4", {"data": data, "columns": columns, "name": "BranchCurves"})


def _protected_sheet(book: Any) -> None:
    page = book.add_worksheet("It's done")
    page.write_row("A1", ["Curve", "Radius"])
    page.write_row("A2", ["D1", 700])
    page.protect("secret")
    page.set_tab_color("red")


def _with_unknown_parts(data: bytes) -> bytes:
    """Put in what XlsxWriter does not make: calculation chain, thread, printer settings, custom XML."""
    parts = {
        name: zipfile.ZipFile(io.BytesIO(data)).read(name)
        for name in zipfile.ZipFile(io.BytesIO(data)).namelist()
    }
    cells = "".join(f'<c r="F{row}" i="1"/>' for row in range(4, 4 + ROWS))
    main = "http://schemas.openxmlformats.org/spreadsheetml/2006/main"
    head = '<?xml version="1.0" encoding="UTF-8" standalone="yes"?>'
    parts["xl/calcChain.xml"] = f'{head}<calcChain xmlns="{main}">{cells}</calcChain>'.encode()
    threads = "http://schemas.microsoft.com/office/spreadsheetml/2018/threadedcomments"
    parts["xl/threadedComments/threadedComment1.xml"] = (
        f'{head}<ThreadedComments xmlns="{threads}"><threadedComment ref="B6" dT="2026-01-05T10:00:00.00" '
        'personId="{11111111-2222-3333-4444-555555555555}" id="{11111111-2222-3333-4444-666666666666}">'
        "<text>Measured twice?</text></threadedComment></ThreadedComments>"
    ).encode()
    parts["xl/persons/person.xml"] = f'{head}<personList xmlns="{threads}"/>'.encode()
    parts["xl/printerSettings/printerSettings1.bin"] = bytes(range(256))
    parts["customXml/item1.xml"] = b'<?xml version="1.0"?><note>kept</note>'
    parts["docProps/thumbnail.emf"] = b"\1\0\0\0" + bytes(200)
    _relate(parts, "xl/_rels/workbook.xml.rels", f"{OFFICE}/calcChain", "calcChain.xml")
    _relate(
        parts,
        "xl/_rels/workbook.xml.rels",
        "http://schemas.microsoft.com/office/2017/10/relationships/person",
        "persons/person.xml",
    )
    rels = "xl/worksheets/_rels/sheet1.xml.rels"
    _relate(
        parts,
        rels,
        "http://schemas.microsoft.com/office/2017/10/relationships/threadedComment",
        "../threadedComments/threadedComment1.xml",
    )
    _relate(parts, rels, f"{OFFICE}/printerSettings", "../printerSettings/printerSettings1.bin")
    types = parts["[Content_Types].xml"].decode()
    threaded = "/xl/threadedComments/threadedComment1.xml"
    new = "".join(
        f'<{tag} {key}="{value}" ContentType="{kind}"/>'
        for tag, key, value, kind in [
            ("Default", "Extension", "bin", f"{_MAIN}.printerSettings"),
            ("Default", "Extension", "emf", "image/x-emf"),
            ("Override", "PartName", "/xl/calcChain.xml", f"{_MAIN}.calcChain+xml"),
            ("Override", "PartName", threaded, "application/vnd.ms-excel.threadedcomments+xml"),
            ("Override", "PartName", "/xl/persons/person.xml", "application/vnd.ms-excel.person+xml"),
        ]
    )
    parts["[Content_Types].xml"] = types.replace("</Types>", new + "</Types>").encode()
    return _zipped(parts)


def with_macros(data: bytes) -> bytes:
    """Give the workbook as .xlsm with a (meaningless) macro project."""
    archive = zipfile.ZipFile(io.BytesIO(data))
    parts = {name: archive.read(name) for name in archive.namelist()}
    parts["xl/vbaProject.bin"] = b"\xd0\xcf\x11\xe0" + bytes(range(256)) * 8
    _relate(
        parts,
        "xl/_rels/workbook.xml.rels",
        "http://schemas.microsoft.com/office/2006/relationships/vbaProject",
        "vbaProject.bin",
    )
    types = (
        parts["[Content_Types].xml"]
        .decode()
        .replace(f"{_MAIN}.sheet.main+xml", "application/vnd.ms-excel.sheet.macroEnabled.main+xml")
    )
    override = (
        '<Override PartName="/xl/vbaProject.bin" ContentType="application/vnd.ms-office.vbaProject"/></Types>'
    )
    parts["[Content_Types].xml"] = types.replace("</Types>", override).encode()
    return _zipped(parts)


def _relate(parts: dict[str, bytes], name: str, kind: str, target: str) -> None:
    text = parts[name].decode()
    number = 100 + text.count("<Relationship ")
    new = f'<Relationship Id="rId{number}" Type="{kind}" Target="{target}"/></Relationships>'
    parts[name] = text.replace("</Relationships>", new).encode()


def _zipped(parts: dict[str, bytes]) -> bytes:
    out = io.BytesIO()
    with zipfile.ZipFile(out, "w", zipfile.ZIP_DEFLATED) as archive:
        for name, content in parts.items():
            archive.writestr(name, content)
    return out.getvalue()
