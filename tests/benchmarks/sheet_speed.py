"""How long 200 pages of gauges take, beside an empty document of 200 pages made with the same library in the same run.

Run with ``python -m tests.benchmarks.sheet_speed [PAGES]``.
"""

from __future__ import annotations

import resource
import sys
import time
from dataclasses import replace
from io import BytesIO
from pathlib import Path

from reportlab.lib.pagesizes import A4
from reportlab.pdfgen.canvas import Canvas

from headledger.diagnosis.check import check_folder
from headledger.diagnosis.result import CheckResult, Trend
from headledger.sheets.pdf import sheets_to_pdf

SAMPLE = Path(__file__).parents[2] / "sample_logs" / "hill-main-air"


def many_gauges(result: CheckResult, count: int) -> CheckResult:
    """The result with its gauges repeated under other tags."""
    import numpy as np

    times = -(-count // len(result.gauges))
    nouns = [replace(g, tag=f"{g.tag}-{k}") for k in range(times) for g in result.job.gauges][:count]
    found = [replace(g, tag=f"{g.tag}-{k}") for k in range(times) for g in result.gauges][:count]
    assert result.trend is not None
    reading = np.tile(result.trend.reading_pa, (1, times))[:, :count]
    trend = Trend(start_s=result.trend.start_s, width_s=result.trend.width_s, reading_pa=reading)
    return replace(result, job=replace(result.job, gauges=tuple(nouns)), gauges=tuple(found), trend=trend)


def empty_document(pages: int) -> float:
    """Seconds for pages that hold nothing."""
    start = time.perf_counter()
    canvas = Canvas(BytesIO(), pagesize=A4, invariant=1)
    for _ in range(pages):
        canvas.showPage()
    canvas.save()
    return time.perf_counter() - start


def main() -> None:
    """Print the figures."""
    pages = int(sys.argv[1]) if len(sys.argv) > 1 else 200
    result = many_gauges(check_folder(SAMPLE), pages)
    empty = min(empty_document(pages) for _ in range(3))
    start = time.perf_counter()
    data = sheets_to_pdf(result)
    took = time.perf_counter() - start
    peak = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024
    print(
        f"{pages} gauge pages: {took:.2f} s, {1e3 * took / pages:.1f} ms a page, {len(data) / 1e6:.2f} MB, peak {peak:.0f} MB"
    )
    print(f"an empty document of {pages} pages: {empty:.3f} s")


if __name__ == "__main__":
    main()
