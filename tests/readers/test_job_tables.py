"""Tables in the dialects of spreadsheets, pipes and fittings in words, and stated accuracies."""

from __future__ import annotations

import zipfile
from pathlib import Path
from xml.sax.saxutils import escape

import pytest

from headledger.errors import QuantityError
from headledger.readers.accuracy import parse_limit
from headledger.readers.job import read_job
from headledger.readers.pipes import find_pipe, fittings_k

GAUGES = (
    ("tag", "station", "elevation [m]", "unit", "range low", "range high", "accuracy"),
    ("PT-1 µ°", "S1", "1.25", "barg", "0", "10", "0.25 % span"),
    ("PT-2", "S2", "", "kPaa", "0", "1600", "±1.5 kPa"),
)
PLAIN = "\n".join(",".join(row) for row in GAUGES) + "\n"


def gauges_of(folder):
    return [(g.tag, g.elevation_m, g.range_high_pa, g.accuracy.limit_pa) for g in folder.read().gauges]


EXPECTED = [("PT-1 µ°", 1.25, 1e6, 2500.0), ("PT-2", None, 1.6e6, 1500.0)]


def write_workbook(path: Path, sheet: str, rows: list[list[str | float]]) -> None:
    """The smallest workbook that the format allows (ECMA-376, part 1): one sheet of inline texts and numbers."""

    def cell(value: str | float) -> str:
        if isinstance(value, str):
            return f'<c t="inlineStr"><is><t>{escape(value)}</t></is></c>'
        return f"<c><v>{value}</v></c>"

    office = "http://schemas.openxmlformats.org/officeDocument/2006/relationships"
    main = "http://schemas.openxmlformats.org/spreadsheetml/2006/main"
    package = "http://schemas.openxmlformats.org/package/2006"
    kind = "application/vnd.openxmlformats-officedocument.spreadsheetml"
    body = "".join("<row>" + "".join(cell(value) for value in row) + "</row>" for row in rows)
    with zipfile.ZipFile(path, "w") as book:
        book.writestr(
            "[Content_Types].xml",
            f'<Types xmlns="{package}/content-types"><Default Extension="rels" ContentType='
            f'"application/vnd.openxmlformats-package.relationships+xml"/><Override PartName="/xl/workbook.xml" '
            f'ContentType="{kind}.sheet.main+xml"/><Override PartName="/xl/worksheets/sheet1.xml" '
            f'ContentType="{kind}.worksheet+xml"/></Types>',
        )
        book.writestr(
            "_rels/.rels",
            f'<Relationships xmlns="{package}/relationships"><Relationship Id="r1" Type="{office}/officeDocument" '
            'Target="xl/workbook.xml"/></Relationships>',
        )
        book.writestr(
            "xl/workbook.xml",
            f'<workbook xmlns="{main}" xmlns:r="{office}"><sheets><sheet name="{sheet}" sheetId="1" r:id="r1"/>'
            "</sheets></workbook>",
        )
        book.writestr(
            "xl/_rels/workbook.xml.rels",
            f'<Relationships xmlns="{package}/relationships"><Relationship Id="r1" Type="{office}/worksheet" '
            'Target="worksheets/sheet1.xml"/></Relationships>',
        )
        book.writestr(
            "xl/worksheets/sheet1.xml", f'<worksheet xmlns="{main}"><sheetData>{body}</sheetData></worksheet>'
        )


@pytest.mark.parametrize(
    "content",
    [
        PLAIN.encode("utf-8"),
        PLAIN.encode("utf-8-sig"),
        PLAIN.encode("utf-16"),
        PLAIN.encode("latin-1"),
        PLAIN.replace("\n", "\r\n").encode("utf-8"),
        PLAIN.replace(",", "\t").encode("utf-8"),
        PLAIN.replace(",", ";").encode("utf-8"),
        PLAIN.replace(",", ";").replace(".", ",").encode("cp1252"),
        PLAIN.replace(",", " , ").encode("utf-8"),
        PLAIN.upper().split("\n")[0].replace("[M]", "[m]").encode() + b"\n" + PLAIN.split("\n", 1)[1].encode(),
        ("\n" + PLAIN.replace("\n", "\n\n")).encode("utf-8"),
        PLAIN.replace("0.25 % span", '"0.25 % span"').encode("utf-8"),
        PLAIN.replace("\n", ",,\n").encode("utf-8"),
    ],
    ids=[
        "utf-8", "bom", "utf-16", "latin-1", "crlf", "tab", "semicolon", "decimal comma", "spaces", "capitals", "blank lines",
        "quoted", "empty columns",
    ],
)  # fmt: skip
def test_table_is_read_alike_in_every_dialect(job_folder, content):
    assert gauges_of(job_folder.write("gauges.csv", content)) == EXPECTED


def test_table_in_a_workbook_is_read_by_its_sheet(job_folder):
    rows: list[list[str | float]] = [[*row] for row in GAUGES]
    rows[1][2], rows[1][5], rows[2][5] = 1.25, 10, 1600
    write_workbook(job_folder.path / "plant.xlsx", "gauge list", rows)
    job_folder.change("job.toml", '"gauges.csv"', '"plant.xlsx#gauge list"')
    assert gauges_of(job_folder) == EXPECTED
    assert job_folder.path / "plant.xlsx" in job_folder.read().files


def test_workbook_without_the_sheet_is_said_with_the_nearest(job_folder):
    write_workbook(job_folder.path / "plant.xlsx", "gauges", [["tag"]])
    job_folder.change("job.toml", '"gauges.csv"', '"plant.xlsx#gauge"')
    assert job_folder.faults() == ["plant.xlsx#gauge: there is no such sheet, got gauge, expected gauges."]


def test_workbook_that_is_none_is_said(job_folder):
    job_folder.write("plant.xlsx", "tag,station\n").change("job.toml", '"gauges.csv"', '"plant.xlsx#gauges"')
    (fault,) = job_folder.faults()
    assert fault.startswith("plant.xlsx#gauges: is no workbook that can be read, got ")


def test_fault_in_a_workbook_is_placed_by_sheet_and_row(job_folder):
    rows: list[list[str | float]] = [[*row] for row in GAUGES]
    rows[2][3] = "brag"
    write_workbook(job_folder.path / "plant.xlsx", "gauges", rows)
    job_folder.change("job.toml", '"gauges.csv"', '"plant.xlsx#gauges"')
    assert job_folder.faults() == ["plant.xlsx#gauges, row 3, unit: unknown unit, got 'brag', expected barg."]


def test_row_of_a_fault_is_counted_as_a_spreadsheet_does(job_folder):
    job_folder.write("gauges.csv", PLAIN.replace("\n", "\n\n").replace("kPaa", "kPPa"))
    (fault,) = job_folder.faults()
    assert fault.startswith("gauges.csv, row 5, unit: unknown unit, got 'kPPa'")


def test_point_that_may_mark_thousands_beside_decimal_commas_is_refused(job_folder):
    text = PLAIN.replace(",", ";").replace("1.25", "1,25").replace("1600", "1.600")
    assert job_folder.write("gauges.csv", text).faults() == [
        "gauges.csv, row 3, range high: the point may mark thousands or decimals, got 1.600, expected 1600 or 1,600."
    ]


def test_job_file_with_a_byte_order_mark_is_read(job_folder):
    text = (job_folder.path / "job.toml").read_text(encoding="utf-8")
    assert job_folder.write("job.toml", text.encode("utf-8-sig")).read().title == "Riser"


@pytest.mark.parametrize(
    ("text", "middle_pa", "outer_pa", "reading"),
    [
        # EN 837-1: the class is the limit in % of span, here 10 bar
        ("class 1.6", 16_000.0, 16_000.0, 0.0),
        ("Class 0,6", 6_000.0, 6_000.0, 0.0),
        # ASME B40.100, table 1 (A as read, the others from memory): % of span in the middle half and outside it
        ("grade 4A", 1_000.0, 1_000.0, 0.0),
        ("grade 3A", 2_500.0, 2_500.0, 0.0),
        ("grade 2A", 5_000.0, 5_000.0, 0.0),
        ("Grade 1A", 10_000.0, 10_000.0, 0.0),
        ("grade A", 10_000.0, 20_000.0, 0.0),
        ("grade B", 20_000.0, 30_000.0, 0.0),
        ("grade C", 30_000.0, 40_000.0, 0.0),
        ("grade D", 50_000.0, 50_000.0, 0.0),
        ("0.25 % span", 2_500.0, 2_500.0, 0.0),
        ("0,25% of span", 2_500.0, 2_500.0, 0.0),
        ("0.5 % reading", 0.0, 0.0, 0.005),
        ("±0.02 bar", 2_000.0, 2_000.0, 0.0),
        ("+/-2 kPa", 2_000.0, 2_000.0, 0.0),
        ("0.2 % reading + 0.1 % span", 1_000.0, 1_000.0, 0.002),
        ("0.2 % reading+0.1 % span+±1 kPa", 2_000.0, 2_000.0, 0.002),
        ("grade A + 0.01 bar", 11_000.0, 21_000.0, 0.0),
    ],
)
def test_accuracy_is_a_limit_by_quarter_and_reading(text, middle_pa, outer_pa, reading):
    limit = parse_limit(text, 1e6)
    assert (limit.limit_pa, limit.outer_limit_pa) == pytest.approx((middle_pa, outer_pa))
    assert limit.reading_fraction == pytest.approx(reading)
    assert limit.text == text


def test_graded_limit_changes_at_the_quarters_which_belong_to_the_middle():
    limit = parse_limit("grade B", 1e6)
    readings = (0.0, 249_000.0, 250_000.0, 500_000.0, 750_000.0, 751_000.0, 1e6)
    assert [limit.at(pa, 0.0, 1e6) for pa in readings] == pytest.approx([3e4, 3e4, 2e4, 2e4, 2e4, 3e4, 3e4])


@pytest.mark.parametrize("text", ["", "good", "class", "1.6", "0.25 %", "0.25 % of", "-1 % span", "1 % span +", "3 m"])
def test_accuracy_that_is_none_is_refused(text):
    with pytest.raises(QuantityError):
        parse_limit(text, 1e6)


@pytest.mark.parametrize(
    ("text", "bore_mm", "wall_mm"),
    [
        # ASME B36.10M, outside diameter less two walls (from memory)
        ("DN 100 sch 40", 102.26, 6.02),
        ("dn100 Sch. 40", 102.26, 6.02),
        ("4 in sch 40", 102.26, 6.02),
        ('4" sch 40', 102.26, 6.02),
        ("4 inch schedule std", 102.26, 6.02),
        ("DN 50 sch 80", 49.22, 5.54),
        ("1 1/2 in sch 40", 40.94, 3.68),
        ("1-1/2 in sch 40", 40.94, 3.68),
        ("3/4 in sch 80", 18.88, 3.91),
        ("DN 200 sch 10", 211.58, 3.76),
        ("24 in sch 40", 575.04, 17.48),
        # SDR is outside diameter over wall (ISO 4065): 160/11 = 14.545 mm
        ("160 SDR 11", 160.0 - 2 * 160 / 11, 160 / 11),
        ("DE 110 mm SDR17", 110.0 - 2 * 110 / 17, 110 / 17),
    ],
)
def test_pipe_in_words_has_bore_and_wall_of_its_table(text, bore_mm, wall_mm):
    pipe = find_pipe(text)
    assert (1000.0 * pipe.bore_m, 1000.0 * pipe.wall_m) == pytest.approx((bore_mm, wall_mm), abs=0.005)


@pytest.mark.parametrize(
    "text", ["DN 100", "DN 101 sch 40", "4 in sch 41", "160 SDR 2", "SDR 11", "big", "1/0 in sch 40"]
)
def test_pipe_that_is_not_in_the_tables_is_refused(text):
    with pytest.raises(QuantityError):
        find_pipe(text)


@pytest.mark.parametrize(
    ("text", "equivalent_lengths", "plain_k"),
    [
        # L/D of Crane, Technical Paper 410, pages, from memory: elbow 30, 45 elbow 16, gate 8, tee 20 and 60, globe 340
        ("elbow", 30, 0.0),
        ("6 elbow, 2 gate valve, 1 tee branch", 6 * 30 + 2 * 8 + 60, 0.0),
        ("6 Elbows; 2 x gate valves; 1 branch tee", 6 * 30 + 2 * 8 + 60, 0.0),
        ("45 elbow", 16, 0.0),
        ("2 45° elbow", 32, 0.0),
        ("90 elbow", 30, 0.0),
        ("3x long radius elbow", 42, 0.0),
        ("tee run, globe valve", 360, 0.0),
        ("entrance, exit", 0, 1.5),
    ],
)
def test_fittings_in_words_sum_the_coefficients_of_their_table(text, equivalent_lengths, plain_k):
    assert fittings_k(text) == pytest.approx(0.017 * equivalent_lengths + plain_k)


@pytest.mark.parametrize(
    ("text", "nearest"), [("2 elbw", "elbow"), ("gat valve", "gate valve"), ("1 zzz", "one of elbow")]
)
def test_fitting_that_is_not_in_the_table_is_refused_with_the_nearest(text, nearest):
    with pytest.raises(QuantityError) as caught:
        fittings_k(text)
    assert caught.value.expected.startswith(nearest)


def test_job_folder_may_be_named_by_a_relative_path(job_folder, monkeypatch):
    monkeypatch.chdir(job_folder.path)
    assert read_job(".").title == "Riser"
    job_folder.change("job.toml", 'title = "Riser"\n', "")
    assert read_job(".").title == "riser"
