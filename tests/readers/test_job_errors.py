"""A job folder that cannot be used: each fault with its place, what was found and what would be right; all at once."""

from __future__ import annotations

import pytest

from headledger.errors import JobError
from headledger.readers.job import read_job

WANTED = "a job folder that holds job.toml with its tables of stations, runs and gauges"
STATIONS, RUNS, GAUGES, TOML = "stations.csv", "runs.csv", "gauges.csv", "job.toml"
ACCURACIES = "class 1.6, grade 2A, 0.25 % span, 0.5 % reading, ±0.02 bar, or a sum of these joined by +"


@pytest.mark.parametrize(
    ("name", "old", "new", "message"),
    [
        # headers
        (GAUGES, "accuracy", "accurcy", "gauges.csv, row 1: unknown column, got accurcy, expected accuracy."),
        (
            STATIONS, "kind", "kind,zzz",
            "stations.csv, row 1: unknown column, got zzz, expected one of station, elevation, kind, exchange, level of, "
            "level column, level unit, elevation uncertainty.",
        ),
        (STATIONS, "elevation [m],kind", "kind,kind",
         "stations.csv, row 1, kind: this column stands twice, got kind, expected one column of this name."),
        (STATIONS, "elevation [m]", "elevation",
         "stations.csv, row 1, elevation: the unit is missing, got elevation, expected elevation [m]."),
        (STATIONS, "elevation [m]", "elevation (m)",
         "stations.csv, row 1: a unit stands in square brackets, got elevation (m), expected elevation [m]."),
        (GAUGES, "tag,station,", "tag,station (old),",
         "gauges.csv, row 1: unknown column, got station (old), expected station."),
        (STATIONS, "elevation [m]", "elevation [bar]",
         "stations.csv, row 1, elevation: this unit is no unit of length, got 'bar', "
         "expected a unit of length such as m."),
        (RUNS, "roughness [mm]", "roughness [mmm]",
         "runs.csv, row 1, roughness: unknown unit, got 'mmm', expected mm."),
        (RUNS, "roughness [mm]", "rated drop [kPag]",
         "runs.csv, row 1, rated drop: of the wrong kind, gauge and not difference, got rated drop [kPag], "
         "expected rated drop [kPa]."),
        (GAUGES, "tag", "tag [m]", "gauges.csv, row 1, tag: this column takes no unit, got tag [m], expected tag."),
        # stations
        (STATIONS, "S2,12.0,,10", "S2,,,10",
         "stations.csv, row 3, elevation: is blank, expected a value in every row."),
        (STATIONS, "S2,12.0,,10", "S2,12.0,,-10",
         "stations.csv, row 3, elevation uncertainty: must not be negative, got -10 mm."),
        (STATIONS, "S2,12.0,,10", "S2,12.O,,10",
         "stations.csv, row 3, elevation: not a number, got '12.O', expected a number such as 12.5."),
        (STATIONS, "S2,12.0,,10", "S2,nan,,10",
         "stations.csv, row 3, elevation: not a finite number, got 'nan', expected a number such as 12.5."),
        (STATIONS, "S2,12.0,,10", "S2,-inf,,10",
         "stations.csv, row 3, elevation: not a finite number, got '-inf', expected a number such as 12.5."),
        (STATIONS, "surface", "surfce", "stations.csv, row 4, kind: unknown word, got surfce, expected surface."),
        (STATIONS, "S3,30.0,surface,", "S3,30.0,surface,\nS4,31,,",
         "stations.csv, row 5, station: no run reaches this station, got S4, expected a run from or to it."),
        (STATIONS, "S3,30.0,surface,", "S3,30.0,surface,\nS1,31,,",
         "stations.csv, row 5, station: stands in row 2 already, got S1, expected a name of its own."),
        (STATIONS, "S2,12.0,,10", "S2,12.0,,10,7",
         "stations.csv, row 3: has more cells than the header, got 5, expected 4."),
        # runs
        (RUNS, "R1,S1,S2,40,100", "R1,S1,S2,40,-100", "runs.csv, row 2, bore: must be positive, got -100 mm."),
        (RUNS, "R1,S1,S2,40,100", "R1,S1,S2,40,",
         "runs.csv, row 2, bore: is blank, expected the inside diameter, or a pipe such as DN 100 sch 40."),
        (RUNS, "R1,S1,S2,40,100", "R1,S1,S2,-40,100", "runs.csv, row 2, length: must not be negative, got -40 m."),
        (RUNS, "0.045", "145",
         "runs.csv, row 2, roughness: is not smaller than the bore, got 145 mm, expected 0.045 mm for steel."),
        (RUNS, "R2,S2,S3", "R2,S2,S2",
         "runs.csv, row 3, to: a run must lead to another station, got S2, expected two different stations."),
        (RUNS, "R2,S2,S3", "R1,S2,S3",
         "runs.csv, row 3, run: stands in row 2 already, got R1, expected a name of its own."),
        (RUNS, "R2,S2,S3,25,80,,1", "R2,S2,S3,25,80,,-1",
         "runs.csv, row 3, fittings K: must not be negative, got -1."),
        (RUNS, "FT-1,m3/h", "FT-1,",
         "runs.csv, row 2, flow unit: is blank beside flow column FT-1, "
         "expected the unit of the flow column, such as m3/h."),
        (RUNS, "FT-1,m3/h", "FT-1,m",
         "runs.csv, row 2, flow unit: this unit is no unit of flow, got 'm', expected a unit of flow such as m3/h."),
        # gauges
        (GAUGES, "PT-2,S2", "PT-1,S2",
         "gauges.csv, row 3, tag: stands in row 2 already, got PT-1, expected a name of its own."),
        (GAUGES, "PT-2,S2", "PT-2,S22", "gauges.csv, row 3, station: no such station, got S22, expected S2."),
        (GAUGES, "PT-2,S2", "PT-2,pump",
         "gauges.csv, row 3, station: no such station, got pump, expected one of S1, S2, S3."),
        (GAUGES, "PT-2,S2", "PT-2,", "gauges.csv, row 3, station: is blank, expected a value in every row."),
        (GAUGES, "DP-1,S1,S2", "DP-1,S1,T2", "gauges.csv, row 4, low station: no such station, got T2, expected one of S1, S2, S3."),
        (GAUGES, "DP-1,S1,S2", "DP-1,S1,S1",
         "gauges.csv, row 4, low station: is the station itself, got S1, expected the tap of the low side."),
        (GAUGES, "barg,0,10", "brag,0,10", "gauges.csv, row 2, unit: unknown unit, got 'brag', expected barg."),
        (GAUGES, "barg,0,10", "m,0,10",
         "gauges.csv, row 2, unit: this unit is no unit of pressure, got 'm', "
         "expected a unit of pressure such as barg."),
        (GAUGES, "barg,0,10", "psid,0,10",
         "gauges.csv, row 2, unit: only a differential gauge reads a difference, got psid, "
         "expected psig, psia or a low station."),
        (GAUGES, "kPa,-50", "kPag,-50",
         "gauges.csv, row 4, unit: a differential gauge's unit carries no suffix, got kPag, expected kPa."),
        (GAUGES, "barg,0,10", "barg,10,0",
         "gauges.csv, row 2, range high: the range is turned round or empty, got 10 to 0 barg, "
         "expected a high end above the low end."),
        (GAUGES, "barg,0,10", "barg,0,inf",
         "gauges.csv, row 2, range high: not a finite number, got 'inf', expected a number such as 12.5."),
        (GAUGES, "barg,0,10", "barg,,10",
         "gauges.csv, row 2, range low: is blank, expected a value in every row."),
        (GAUGES, "class 1.6", "clas 1.6",
         f"gauges.csv, row 2, accuracy: not a statement of accuracy, got 'clas 1.6', expected {ACCURACIES}."),
        (GAUGES, "class 1.6", "±0.02 barg",
         "gauges.csv, row 2, accuracy: of the wrong kind, gauge and not difference, got '±0.02 barg', "
         "expected 0.02 bar."),
        (GAUGES, "class 1.6", "grade 7A",
         "gauges.csv, row 2, accuracy: unknown grade, got 'grade 7A', "
         "expected grade 5A, 4A, 3A, 2A, 1A, A, B, C, D."),
        (GAUGES, "class 1.6", "class 0",
         f"gauges.csv, row 2, accuracy: must be positive, got 'class 0', expected {ACCURACIES}."),
        # job.toml
        (TOML, "stations =", "station =", "job.toml, [job]: unknown key, got station, expected stations."),
        (TOML, "[liquid]", "[liqid]", "job.toml: unknown table or key, got liqid, expected liquid."),
        (TOML, "format = 1", "format = 2", "job.toml, format: unknown format, got 2, expected format = 1."),
        (TOML, '"water"', '"watr"', "job.toml, [liquid] kind: unknown liquid, got watr, expected water."),
        (TOML, '"18 degC"', '"18"',
         "job.toml, [liquid] temperature: the unit is missing, got '18', "
         "expected a number with a unit of temperature such as degC."),
        (TOML, '"18 degC"', "18",
         'job.toml, [liquid] temperature: must be a text with its unit, got 18, expected temperature = "18 degC".'),
        (TOML, '"18 degC"', '"-300 degC"',
         "job.toml, [liquid] temperature: must be positive, got '-300 degC', expected temperature = \"18 degC\"."),
        (TOML, '"18 degC"', '"18 kPa"',
         "job.toml, [liquid] temperature: this unit is no unit of temperature, got 'kPa', "
         "expected a unit of temperature such as degC."),
        (TOML, '"18 degC"', '{ colum = "TT-1" }',
         "job.toml, [liquid] temperature: must name a column and its unit, got {'colum': 'TT-1'}, "
         'expected temperature = { column = "…", unit = "…" }.'),
        (TOML, '"18 degC"', '"18 degC"\nsalinity = "35 g/kg"',
         "job.toml, [liquid] salinity: does not belong to water, got '35 g/kg', expected kind = seawater."),
        (TOML, '"water"', '"propylene-glycol"',
         'job.toml, [liquid] concentration: is missing for propylene-glycol, expected concentration = "30 %".'),
        (TOML, '"water"', '"propylene-glycol"\nconcentration = "30"',
         "job.toml, [liquid] concentration: not a concentration, got '30', "
         'expected "30 %" by mass or "30 % vol" by volume.'),
        (TOML, '"water"', '"propylene-glycol"\nconcentration = "95 %"',
         "job.toml, [liquid] concentration: is outside the table of this liquid, got 95 %, expected 0 to 60 %."),
        (TOML, '"18 degC"', '"218 degC"',
         "job.toml, [liquid] temperature: is outside the table of this liquid, got 218 °C, expected 0.01 to 180 °C."),
        (TOML, '"water"', '"other"',
         'job.toml, [liquid] density: is missing for other, expected density = "870 kg/m3".'),
        (TOML, '"98.9 kPa"', '"98.9 kPag"',
         "job.toml, [site] barometer: of the wrong kind, gauge and not absolute, got '98.9 kPag', "
         "expected 98.9 kPaa."),
        (TOML, '"98.9 kPa"', '{ column = "BARO", unit = "kPag" }',
         "job.toml, [site] barometer: must be an absolute pressure, got kPag, expected kPaa."),
        (TOML, '"47 deg"', '"147 deg"',
         "job.toml, [site] latitude: is no latitude, got 147 deg, expected -90 to 90 deg."),
        (TOML, '"1 % span"', '"1 % spam"',
         f"job.toml, [check] tolerance: not a statement of accuracy, got '1 % spam', expected {ACCURACIES}."),
        (TOML, 'tolerance = "1 % span"', "confidence = 95",
         "job.toml, [check] confidence: must be a share, got 95, "
         "expected a number from 0.5 to below 1, such as 0.95."),
        (TOML, 'tolerance = "1 % span"', 'decision = "gaurded"',
         "job.toml, [check] decision: unknown rule, got gaurded, expected guarded or simple."),
        (TOML, 'tolerance = "1 % span"', 'loss_uncertainty = "15"',
         "job.toml, [check] loss_uncertainty: must be a share in per cent, got '15', "
         'expected loss_uncertainty = "±15 %".'),
        (TOML, 'title = "Riser"', "title = 5", 'job.toml, [job] title: must be a text, got 5, expected title = "…".'),
        (TOML, 'title = "Riser"', 'timezone = "Lisbon"',
         "job.toml, [job] timezone: unknown timezone, got Lisbon, expected a name such as UTC or Europe/Lisbon."),
        (TOML, 'title = "Riser"', 'title = "Riser',
         "job.toml, line 4: is not valid TOML (Illegal character '\\n'), expected lines such as title = \"…\"."),
        # files
        (TOML, '"gauges.csv"', '"guages.csv"',
         "job.toml, [job] gauges: there is no such file, got guages.csv, expected gauges.csv."),
        (TOML, 'gauges = "gauges.csv"\n', "", 'job.toml, [job] gauges: is missing, expected gauges = "gauges.csv".'),
        (TOML, '"gauges.csv"', '"../gauges.csv"',
         "job.toml, [job] gauges: leads out of the job folder, got ../gauges.csv, "
         "expected a file inside it; copy it there."),
        (TOML, '["log.csv"]', '["lo.csv"]',
         "job.toml, [job] logs: there is no such file, got lo.csv, expected log.csv."),
        (TOML, '["log.csv"]', '["../*.csv"]',
         "job.toml, [job] logs: leads out of the job folder, got ../*.csv, expected a file inside it; copy it there."),
        (TOML, '["log.csv"]', "[]", 'job.toml, [job] logs: names no log, expected logs = ["log.csv"].'),
        (TOML, 'logs = ["log.csv"]', "", 'job.toml, [job] logs: is missing, expected logs = ["log.csv"].'),
        (TOML, '["log.csv"]', "[3]", 'job.toml, [job] logs: must be a list of paths, got [3], '
         'expected logs = ["log.csv"].'),
    ],
)  # fmt: skip
def test_one_fault_is_said_once_with_place_finding_and_cure(job_folder, name, old, new, message):
    assert message in job_folder.change(name, old, new).faults()


@pytest.mark.parametrize(
    ("name", "old", "new"),
    [
        (GAUGES, "barg,0,10", "brag,0,10"),
        (GAUGES, "accuracy\n", "accuracy,zzz\n"),
        (STATIONS, "S2,12.0,,10", "S2,,,10"),
        (RUNS, "R1,S1,S2,40,100", "R1,S1,S2,40,-100"),
        (TOML, '"1 % span"', '"1 % spam"'),
        (TOML, '"98.9 kPa"', '"98.9 kPag"'),
        (TOML, '"98.9 kPa"', '{ column = "BARO", unit = "kPag" }'),
        (TOML, '"18 degC"', '{ colum = "TT-1" }'),
        (STATIONS, "elevation [m]", "elevation (m)"),
    ],
)
def test_one_fault_brings_no_others_with_it(job_folder, name, old, new):
    assert len(job_folder.change(name, old, new).faults()) == 1


def test_missing_column_is_said_once_and_not_again_for_every_row(job_folder):
    text = "tag,station,unit,range low,range high\nPT-1,S1,barg,0,10\nPT-2,S1,barg,0,10\n"
    assert job_folder.write(GAUGES, text).faults() == [
        "gauges.csv, row 1: a required column is missing, expected a column accuracy."
    ]


def test_run_to_nowhere_and_the_station_it_misses_are_both_said(job_folder):
    assert job_folder.change(RUNS, "R2,S2,S3", "R2,S2,S33").faults() == [
        "runs.csv, row 3, to: no such station, got S33, expected S3.",
        "stations.csv, row 4, station: no run reaches this station, got S3, expected a run from or to it.",
    ]


def test_all_problems_of_all_files_are_said_at_once(job_folder):
    job_folder.change(TOML, '"47 deg"', '"147 deg"').change(STATIONS, "S2,12.0", "S2,twelve")
    job_folder.change(RUNS, "R1,S1,S2,40,100", "R1,S1,S2,40,0").change(GAUGES, "PT-1,S1", "PT-1,S9")
    job_folder.change(GAUGES, "psia,0,150", "psia,150,0").change(TOML, '["log.csv"]', '["none.csv"]')
    places = [fault.split(":")[0] for fault in job_folder.faults()]
    assert sorted(places) == [
        "gauges.csv, row 2, station",
        "gauges.csv, row 3, range high",
        "job.toml, [job] logs",
        "job.toml, [site] latitude",
        "runs.csv, row 2, bore",
        "stations.csv, row 3, elevation",
    ]


@pytest.mark.parametrize(
    ("header", "cell", "message"),
    [
        ("run", "R2", "gauges.csv, row 2, run: does not touch the gauge's station, got R2, expected R1."),
        ("run", "R9", "gauges.csv, row 2, run: no such run, got R9, expected one of R1, R2."),
        ("leg", "dri", "gauges.csv, row 2, leg: not a filling, got dri, expected dry."),
        ("leg", "-1 SG",
         "gauges.csv, row 2, leg: not a filling, got -1 SG, "
         "expected process, dry, or a specific gravity such as 1.07 SG."),
        ("corrected", "maybe",
         "gauges.csv, row 2, corrected: neither yes nor a level, got maybe, expected yes, no, or a level such as 0 m."),
        ("reference", "open",
         "gauges.csv, row 2, reference: unknown reference, got open, expected vented, sealed, or sealed at 95.0 kPa."),
        ("reference", "sealed at 95 kPag",
         "gauges.csv, row 2, reference: of the wrong kind, gauge and not absolute, got '95 kPag', expected 95 kPaa."),
        ("signal", "4-20 ma rot",
         "gauges.csv, row 2, signal: unknown signal, got 4-20 ma rot, expected 4-20 mA root."),
        ("division", "-0.1", "gauges.csv, row 2, division: must not be negative, got -0.1."),
        ("calibration uncertainty", "0", "gauges.csv, row 2, calibration uncertainty: must be positive, got 0."),
        ("correction", "small",
         "gauges.csv, row 2, correction: not a number with a unit, got 'small', expected a value such as 12.5 kPa."),
        ("damping [s]", "-3", "gauges.csv, row 2, damping: must not be negative, got -3 s."),
        ("temperature effect", "0.04 %",
         "gauges.csv, row 2, temperature effect: not a share of span per kelvin, got 0.04 %, expected 0.04 % span/K."),
        ("until", "tomorrow", "gauges.csv, row 2, until: not a time, got tomorrow, expected 2026-03-02T08:00:00Z."),
    ],
)  # fmt: skip
def test_optional_cell_of_a_gauge_that_cannot_be_used_is_said(job_folder, header, cell, message):
    text = f"tag,station,unit,range low,range high,accuracy,{header}\nPT-1,S1,barg,0,10,1 % span,{cell}\n"
    assert job_folder.write(GAUGES, text).faults() == [message]


@pytest.mark.parametrize(
    ("header", "cells", "message"),
    [
        ("pipe", "DN 100 sch 41",
         "runs.csv, row 2, pipe: not a pipe of the tables, got 'DN 100 sch 41', "
         "expected schedule 10, 40, 80 in this size; or give the bore."),
        ("bore [mm],fittings", "100,2 elbw",
         "runs.csv, row 2, fittings: not a fitting of the table, got '2 elbw', expected elbow."),
        ("bore [mm],rated drop [kPa],rated flow [m3/h]", "100,20,",
         "runs.csv, row 2, rated flow: is blank beside rated drop 20, expected the flow at which the drop is rated."),
        ("bore [mm],Kv [m3/h],Cv", "100,20,20",
         "runs.csv, row 2, Cv: Kv and Cv are both given, got 20, expected one of them."),
        ("bore [mm],pump curve,pump flow unit,pump head unit", "100,0:30; x,m3/h,m",
         "runs.csv, row 2, pump curve: not a list of flow:head pairs at two flows or more, got 0:30; x, "
         "expected 0:32; 20:30; 40:24."),
        ("bore [mm],pump curve,pump head unit", "100,0:30; 20:20,m",
         "runs.csv, row 2, pump flow unit: is blank beside pump curve 0:30; 20:20, "
         "expected the unit of its flows, such as m3/h."),
        ("bore [mm],speed column", "100,N-1",
         "runs.csv, row 2, speed column: needs a pump curve, got N-1, expected a pump curve such as 0:32; 20:30; 40:24."),
        ("bore [mm],loss", "100,fre", "runs.csv, row 2, loss: unknown word, got fre, expected free."),
        ("bore [mm],loss uncertainty", "100,0.15",
         "runs.csv, row 2, loss uncertainty: not a share in per cent, got 0.15, expected ±15 %."),
        ("bore [mm],flow column,flow unit,flow uncertainty", "100,FT-1,m3/h,±2 m",
         "runs.csv, row 2, flow uncertainty: this unit is no unit of flow, got 'm', expected ±2 % or ±0.5 m3/h."),
    ],
)  # fmt: skip
def test_optional_cell_of_a_run_that_cannot_be_used_is_said(job_folder, header, cells, message):
    twin = "100" + "," * header.count(",") if header.startswith("bore") else "DN 100 sch 40"
    job_folder.write(RUNS, f"run,from,to,{header}\nR1,S1,S2,{cells}\nR2,S2,S3,{twin}\n")
    assert job_folder.faults() == [message]


@pytest.mark.parametrize(
    ("cells", "message"),
    [
        ("S1,2,,,LT-1,m",
         "stations.csv, row 2, level column: only a surface has one, got LT-1, expected kind surface, or a blank cell."),
        ("S1,2,surface,,LT-1,",
         "stations.csv, row 2, level unit: is blank beside level column LT-1, "
         "expected the unit of the level column, such as m."),
        ("S1,2,surface,crown,,",
         "stations.csv, row 2, level of: a surface has no bore, got crown, expected a blank cell."),
        ("S1,2,,crwn,,", "stations.csv, row 2, level of: unknown word, got crwn, expected crown."),
    ],
)  # fmt: skip
def test_level_of_a_station_that_cannot_be_used_is_said(job_folder, cells, message):
    text = f"station,elevation [m],kind,level of,level column,level unit\n{cells}\nS2,12,,,,\nS3,30,,,,\n"
    assert job_folder.write(STATIONS, text).faults() == [message]


@pytest.mark.parametrize(
    ("rows", "message"),
    [
        ("2026-03-02T09:00,2026-03-02T08:00,still,",
         "spells.csv, row 2, end: is not after the start, got 2026-03-02T08:00, expected a time after 2026-03-02T09:00."),
        ("yesterday,2026-03-02T08:00,still,",
         "spells.csv, row 2, start: not a time, got yesterday, expected 2026-03-02T08:00:00Z."),
        ("2026-03-02T08:00,2026-03-02T09:00,stil,",
         "spells.csv, row 2, kind: unknown word, got stil, expected still."),
        ("2026-03-02T08:00,2026-03-02T09:00,still,\n2026-03-02T08:30,2026-03-02T09:30,still,",
         "spells.csv, row 3, start: overlaps the spell of row 2, expected spells one after another."),
    ],
)  # fmt: skip
def test_stated_spell_that_cannot_be_used_is_said(job_folder, rows, message):
    job_folder.change(TOML, 'logs = ["log.csv"]', 'logs = ["log.csv"]\nspells = "spells.csv"')
    assert job_folder.write("spells.csv", f"start,end,kind,note\n{rows}\n").faults() == [message]


@pytest.mark.parametrize(
    ("row", "message"),
    [
        ("R3,0,2", "levels.csv, row 2, run: no such run, got R3, expected one of R1, R2."),
        ("R1,41,2", "levels.csv, row 2, distance: is beyond the end of the run, got 41 m, expected at most 40 m."),
        ("R1,0,", "levels.csv, row 2, elevation: is blank, expected a value in every row."),
    ],
)
def test_level_point_that_cannot_be_used_is_said(job_folder, row, message):
    job_folder.change(TOML, 'logs = ["log.csv"]', 'logs = ["log.csv"]\nlevels = "levels.csv"')
    assert job_folder.write("levels.csv", f"run,distance [m],elevation [m]\n{row}\n").faults() == [message]


@pytest.mark.parametrize(
    ("content", "message"),
    [
        (b"", "gauges.csv: the file is empty, got 0 bytes, expected text."),
        (b"\n \n", "gauges.csv: the table is empty, expected a header row and one row or more."),
        (b"tag,station,unit,range low,range high,accuracy\n",
         "gauges.csv: holds no rows, got only a header, expected one row or more."),
        (b"PK\x03\x04\x00\x00",
         "gauges.csv: the file is binary, got zero bytes, "
         "expected a text file; a table in a workbook is named as plant.xlsx#sheet."),
        (b"\xff\xfet\x00a\x00g",
         "gauges.csv: is marked as UTF-16 and cannot be read as such from byte 6 on, "
         "expected a file saved again as UTF-8."),
        (b'tag,station\n"PT-1,S1\n',
         "gauges.csv, line 2: cannot be read as a table (unexpected end of data), expected quotation marks in pairs."),
    ],
)  # fmt: skip
def test_table_that_is_no_table_is_said(job_folder, content, message):
    assert job_folder.write(GAUGES, content).faults() == [message]


def test_folder_that_is_not_there_is_said(tmp_path):
    with pytest.raises(JobError) as caught:
        read_job(tmp_path / "nowhere")
    assert str(caught.value) == f"{tmp_path / 'nowhere'}: there is no such folder, expected {WANTED}."


def test_folder_without_a_job_file_is_said(tmp_path):
    with pytest.raises(JobError) as caught:
        read_job(tmp_path)
    assert str(caught.value) == f"{tmp_path}: holds no job.toml, expected {WANTED}."


def test_file_in_place_of_a_folder_is_said(job_folder):
    with pytest.raises(JobError) as caught:
        read_job(job_folder.path / TOML)
    assert str(caught.value) == f"{job_folder.path / TOML}: is a file and no job folder, expected {WANTED}."


def test_link_that_leads_out_of_the_folder_is_refused(job_folder):
    outside = job_folder.path.parent / "gauges.csv"
    (job_folder.path / GAUGES).rename(outside)
    (job_folder.path / GAUGES).symlink_to(outside)
    assert job_folder.faults() == [
        "job.toml, [job] gauges: leads out of the job folder, got gauges.csv, expected a file inside it; copy it there."
    ]
