"""The sheets on paper: same job, same bytes; every word in its place and nothing over the margin."""

from __future__ import annotations

import re
import subprocess
from collections.abc import Iterator
from dataclasses import replace
from pathlib import Path

import pytest

from headledger.diagnosis.result import CheckResult, Verdict
from headledger.sheets.columns import flow_words
from headledger.sheets.content import HEADING, NOT_A_CERTIFICATE, NUMBERS_ELSEWHERE, fingerprint
from headledger.sheets.marks import by_trouble
from headledger.sheets.pdf import sheets_to_pdf
from headledger.sheets.pdf_paper import MARGIN, Paper
from tests.made_results import SHIFT_EVIDENCE, ZERO_SHIFT, found_gauge
from tests.outside_programs import needs
from tests.sample_results import sample_result

# ISO 216 A4 is 210 by 297 mm; Letter is 8.5 by 11 in (ANSI Y14.1). In points of 1/72 inch.
SIZES = {Paper.A4: (210 / 25.4 * 72, 297 / 25.4 * 72), Paper.LETTER: (8.5 * 72, 11 * 72)}


def pages_of(data: bytes, folder: Path, order: str = "-layout") -> list[str]:
    """Text of each page: as it lies on the paper, or ``-raw`` in the order in which it was written."""
    path = folder / "sheet.pdf"
    path.write_bytes(data)
    done = subprocess.run(["pdftotext", order, str(path), "-"], capture_output=True, text=True, check=True)
    return done.stdout.split("\f")[:-1]


def test_same_job_same_bytes(any_sample: CheckResult):
    assert sheets_to_pdf(any_sample) == sheets_to_pdf(any_sample)


@needs("pdftotext")
@pytest.mark.parametrize("paper", Paper)
def test_every_gauge_of_every_sample_has_one_page_after_the_summary(
    any_sample: CheckResult, tmp_path: Path, paper: Paper
):
    pages = pages_of(sheets_to_pdf(any_sample, paper=paper), tmp_path)
    summary = len(pages) - len(any_sample.gauges)
    assert summary == 1
    for number, page in enumerate(pages, start=1):
        assert HEADING in page
        assert NOT_A_CERTIFICATE[:40] in page
        assert f"page {number} of {len(pages)}" in page
        assert fingerprint(any_sample)[:16] in page
    for gauge, page in zip(by_trouble(any_sample.gauges), pages[summary:], strict=True):
        assert f"{gauge.tag} at {gauge.station}" in page
    for page in pages[summary - 1 :]:
        for item in any_sample.inputs:
            assert f"sha256 of {item.file}: {item.sha256}" in page
        for word in ("Checked by:", "Accepted by:", "Signature", "Date", "Caution"):
            assert word in page


@needs("pdftotext")
def test_page_of_a_gauge_holds_what_is_signed_for(tmp_path: Path):
    """Fire main, PIT-903 logged in bar as psi: identity, numbers by spell, error, rule, cause."""
    result = sample_result("fire-main-units")
    flow = next(flow for flow in result.spells[1].flows if flow.run == "FM-2")
    pages = pages_of(sheets_to_pdf(result, gauges=["PIT-903"]), tmp_path, "-raw")
    assert len(pages) == 2
    page = re.sub(r"\s+", " ", pages[1])
    for words in (
        "PIT-903 at NODE-B",
        "▲ fail",
        "Elevation 14.5 ft",
        "Range 0 to 200 psig",
        "Accuracy 0.25 % span",
        "water, 13 °C ± 1 K",
        "100.60 ± 0.20 kPa",
        "guarded: fails where its error is at least 95 % likely outside",
        "U / tolerance",
        "Likely outside",
        "Span seen",
        f"2 flowing 2026-05-18 07:38 – 07:43 {flow_words(flow, result.job.display.flow)}",
        "PIT-903 looks logged in bar where psig is stated",
        "As left, by hand",
        "PIT-903: reading and expected over 21 minutes",
    ):
        assert words in page, words


@needs("pdfinfo")
@pytest.mark.parametrize("paper", Paper)
def test_paper_has_its_size_and_fonts_are_embedded(sound_result: CheckResult, tmp_path: Path, paper: Paper):
    path = tmp_path / "sheet.pdf"
    path.write_bytes(sheets_to_pdf(sound_result, paper=paper))
    info = subprocess.run(["pdfinfo", str(path)], capture_output=True, text=True, check=True).stdout
    found = re.search(r"Page size:\s+([\d.]+) x ([\d.]+) pts", info)
    assert found
    assert tuple(map(float, found.groups())) == pytest.approx(SIZES[paper], abs=0.5)
    fonts = subprocess.run(["pdffonts", str(path)], capture_output=True, text=True, check=True).stdout.splitlines()[2:]
    used = [line.split() for line in fonts if "Helvetica" not in line]
    assert used
    # name, type (two words), encoding, embedded
    assert all("yes" in words for words in used)


def long_result(result: CheckResult) -> CheckResult:
    """A result whose every name is long, and holds markup, signs and other alphabets."""
    tag = "PT-<b>&-ΔρЖ-" + "X" * 60 + "-1"
    job = replace(
        result.job,
        title="Riser & <i>return</i> " + "of a very long name " * 12,
        site_name="Площадка 4 " * 12,
        gauges=(replace(result.job.gauges[0], tag=tag, serial="S" * 90), *result.job.gauges[1:]),
    )
    gauge = found_gauge(tag, "S1", Verdict.FAIL, why=f"{tag}: <para> ± ² ° ≤ " + "much to say " * 60)
    return replace(result, job=job, gauges=(gauge, *result.gauges[1:]))


@needs("pdftoppm")
@pytest.mark.parametrize("paper", Paper)
def test_nothing_is_drawn_outside_the_margins(troubled_result: CheckResult, tmp_path: Path, paper: Paper):
    """Every page in grey at 50 dots an inch: a millimetre outside the margin there is nothing but white."""
    for name, result in (
        ("long", long_result(troubled_result)),
        ("riser", sample_result("riser-drift")),
        ("branched", sample_result("branched-sound")),
    ):
        path = tmp_path / f"{name}.pdf"
        path.write_bytes(sheets_to_pdf(result, paper=paper))
        subprocess.run(["pdftoppm", "-r", "50", "-gray", str(path), str(tmp_path / name)], check=True)
        pictures = sorted(tmp_path.glob(f"{name}-*.pgm"))
        assert len(pictures) >= 6
        for picture in pictures:
            rows = list(grey_rows(picture))
            edge = int((MARGIN / 72.0 - 1.0 / 25.4) * 50)
            for outside in (rows[:edge], rows[-edge:], [row[:edge] for row in rows], [row[-edge:] for row in rows]):
                assert min(min(row) for row in outside) == 255, picture.name
            assert min(min(row) for row in rows) < 100


def grey_rows(path: Path) -> Iterator[bytes]:
    """Rows of a binary grey picture (PGM, P5)."""
    data = path.read_bytes()
    found = re.match(rb"P5\s+(\d+)\s+(\d+)\s+255\s", data)
    assert found
    width = int(found.group(1))
    for start in range(found.end(), len(data), width):
        yield data[start : start + width]


@needs("pdftotext")
def test_long_names_and_markup_are_printed_as_they_are(troubled_result: CheckResult, tmp_path: Path):
    result = long_result(troubled_result)
    text = re.sub(r"\s+", "", "".join(pages_of(sheets_to_pdf(result), tmp_path)))
    assert re.sub(r"\s+", "", result.gauges[0].tag) in text
    assert "Riser&<i>return</i>ofaverylongname" in text
    assert "Площадка4" in text
    assert "<para>±²°≤muchtosay" in text


@needs("pdftotext")
def test_table_of_many_spells_goes_on_with_its_head(sound_result: CheckResult, tmp_path: Path):
    from headledger.plant.job import SpellKind
    from tests.made_results import made_spell

    spells = tuple(made_spell(i, SpellKind.FLOWING, 36.0) for i in range(1, 91))
    said = sound_result.gauges[0].spells[1]
    gauge = replace(sound_result.gauges[0], spells=tuple(replace(said, id=i) for i in range(1, 91)))
    result = replace(sound_result, spells=spells, gauges=(gauge,))
    pages = pages_of(sheets_to_pdf(result, gauges=["PT-1"]), tmp_path)
    heads = [page.count("Off by") for page in pages]
    assert sum(heads) >= 2
    assert max(heads) == 1
    assert "90 flowing" in "".join(pages)


def test_fingerprint_is_what_sha256sum_makes(sound_result: CheckResult, tmp_path: Path):
    """``sha256sum log.csv | sha256sum`` by hand, with the input's own sum."""
    (item,) = sound_result.inputs
    done = subprocess.run(
        ["sha256sum"], input=f"{item.sha256}  {item.file}\n", capture_output=True, text=True, check=True
    )
    assert done.stdout.split()[0] == fingerprint(sound_result)


@needs("pdftotext")
@pytest.mark.parametrize("paper", Paper)
def test_gauge_with_more_evidence_than_fits_keeps_to_one_page_and_says_where_the_rest_is(
    troubled_result: CheckResult, tmp_path: Path, paper: Paper
):
    evidence = replace(SHIFT_EVIDENCE, against=SHIFT_EVIDENCE.against * 5)
    many = tuple(replace(ZERO_SHIFT, evidence=evidence, says=f"Finding {number} of PT-3.") for number in range(5))
    gauge = replace(troubled_result.gauges[2], causes=tuple(range(5)))
    result = replace(troubled_result, causes=many, gauges=(gauge,))
    pages = pages_of(sheets_to_pdf(result, paper=paper), tmp_path, "-raw")
    page = re.sub(r"\s+", " ", pages[-1])
    assert "PT-3 at S3" in page
    assert "Accepted by:" in page
    assert NUMBERS_ELSEWHERE in page
    assert page.count("The readings favour it 32 to 1") in (5, 10, 15, 20)
    assert all(f"Finding {number} of PT-3." in page for number in range(5))
