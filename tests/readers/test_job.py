"""A sound job folder becomes the job that it describes: units, defaults, halved uncertainties, remarks."""

from __future__ import annotations

import math
import tomllib
from datetime import UTC, datetime, timedelta
from pathlib import Path

import pytest

from headledger.plant.gauges import LegFill, Signal
from headledger.plant.job import DecisionRule, LiquidKind, SpellKind
from headledger.plant.runs import LossKind, RunState
from headledger.plant.stations import Exchange, StationKind
from headledger.quantities import PressureKind
from headledger.readers.job import read_job, unused_yet

PSI_PA = 6894.757293168361  # NIST SP 811 (2008), appendix B.8
UNITS = tomllib.loads((Path(__file__).parents[1] / "reference" / "units.toml").read_text(encoding="utf-8"))
KV_OF_CV_1 = UNITS["valve"]["kv_of_cv_1"]


def gauge(folder, extra_header: str, extra_cells: str, *, unit: str = "barg"):
    folder.write(
        "gauges.csv",
        f"tag,station,unit,range low,range high,accuracy,{extra_header}\nPT-1,S1,{unit},0,10,1 % span,{extra_cells}\n",
    )
    return folder.read().gauges[0]


def run(folder, header: str, cells: str):
    """The first run of a table whose second is its twin."""
    folder.write("runs.csv", f"run,from,to,{header}\nR1,S1,S2,{cells}\nR2,S2,S3,{cells}\n")
    return folder.read().runs[0]


def test_sound_folder_is_read_into_its_nouns(job_folder):
    job = job_folder.read()
    assert (job.title, job.site_name, job.prepared_by, job.timezone) == ("Riser", "Quay 4", "A. Fitter", "UTC")
    assert [s.name for s in job.stations] == ["S1", "S2", "S3"]
    assert [(r.name, r.start, r.end) for r in job.runs] == [("R1", "S1", "S2"), ("R2", "S2", "S3")]
    assert [g.tag for g in job.gauges] == ["PT-1", "PT-2", "DP-1"]
    assert [path.name for path in job.log_files] == ["log.csv"]
    assert [path.name for path in job.files] == ["job.toml", "stations.csv", "runs.csv", "gauges.csv"]
    assert job.liquid.kind is LiquidKind.WATER
    assert job.liquid.temperature_k == pytest.approx(291.15)
    assert (job.site.datum_altitude_m, job.site.latitude_deg, job.site.barometer_pa) == (210.0, 47.0, 98_900.0)


def test_stations_have_elevation_kind_and_halved_doubt(job_folder):
    first, second, surface = job_folder.read().stations
    assert (first.elevation_m, first.elevation_sd_m) == (2.0, 0.025)  # ±50 mm, k = 2
    assert second.elevation_sd_m == pytest.approx(0.005)  # ±10 mm, k = 2
    assert surface.kind is StationKind.SURFACE


def test_stations_left_open_are_open_at_ends_and_surfaces_and_this_is_said(job_folder):
    job = job_folder.read()
    assert [s.exchange for s in job.stations] == [Exchange.OPEN, Exchange.CLOSED, Exchange.OPEN]
    assert "taken as open to flow in or out: S1, S3." in job.remarks


def test_exchange_that_is_stated_stands(job_folder):
    job_folder.write("stations.csv", "station,elevation [m],exchange\nS1,2,closed\nS2,12,open\nS3,30,\n")
    job = job_folder.read()
    assert [s.exchange for s in job.stations] == [Exchange.CLOSED, Exchange.OPEN, Exchange.OPEN]
    assert job.remarks[0] == "taken as open to flow in or out: S3."


def test_elevation_of_invert_or_crown_moves_by_half_the_bore(job_folder):
    """S1 touches R1 of 100 mm: 2.0 m + 0.050 m; S2 touches 100 and 80 mm: the wider, 12.0 m - 0.050 m."""
    job_folder.write("stations.csv", "station,elevation [m],level of\nS1,2,invert\nS2,12,crown\nS3,30,centreline\n")
    assert [s.elevation_m for s in job_folder.read().stations] == pytest.approx([2.05, 11.95, 30.0])


def test_surface_with_a_level_column_keeps_its_column_and_unit(job_folder):
    job_folder.write(
        "stations.csv",
        "station,elevation [m],kind,level column,level unit\nS1,2,,,\nS2,12,,,\nS3,30,surface,LT-1,ft\n",
    )
    surface = job_folder.read().stations[2]
    assert surface.level_column == "LT-1"
    assert surface.level_unit is not None
    assert surface.level_unit.factor == 0.3048


def test_runs_have_their_pipe_in_si_and_their_meter(job_folder):
    first, second = job_folder.read().runs
    assert (first.length_m, first.bore_m, first.roughness_m, first.fittings_k) == pytest.approx((40.0, 0.1, 45e-6, 3.5))
    assert first.flow_column == "FT-1"
    assert first.flow_unit is not None
    assert first.flow_unit.to_si(36.0) == pytest.approx(0.01)
    assert first.flow_doubt.relative_fraction == pytest.approx(0.01)  # ±2 %, k = 2
    assert second.roughness_m == pytest.approx(45e-6)  # blank: clean commercial steel
    assert second.flow_column is None


def test_loss_doubt_is_wide_only_where_neither_roughness_nor_c_nor_its_own_is_stated(job_folder):
    """±15 %, or ±40 % for a length of unknown pipe; halved for k = 2."""
    rows = ["R1,S1,S2,40,100,0.05,,", "R2,S2,S3,40,100,,,", "R3,S2,S3,40,100,,120,", "R4,S2,S3,40,100,,,±10 %"]
    job_folder.write(
        "runs.csv",
        "run,from,to,length [m],bore [mm],roughness [mm],hazen-williams C,loss uncertainty\n"
        + "\n".join([*rows, "R5,S2,S3,0,100,,,"]),
    )
    assert [r.loss_sd_fraction for r in job_folder.read().runs] == pytest.approx([0.075, 0.2, 0.075, 0.05, 0.075])
    job_folder.change("job.toml", 'tolerance = "1 % span"', 'loss_uncertainty = "±20 %"')
    assert [r.loss_sd_fraction for r in job_folder.read().runs] == pytest.approx([0.1, 0.1, 0.1, 0.05, 0.1])


def test_run_with_hazen_williams_has_no_roughness(job_folder):
    found = run(job_folder, "bore [mm],hazen-williams C", "100,130")
    assert (found.hazen_williams_c, found.roughness_m) == (130.0, None)


def test_hazen_williams_beside_another_liquid_than_water_is_warned_of(job_folder):
    run(job_folder, "bore [mm],hazen-williams C", "100,130")
    said = "R1, R2: Hazen–Williams holds for water only, and the liquid is seawater."
    assert said not in job_folder.read().remarks
    assert said in job_folder.change("job.toml", '"water"', '"seawater"').read().remarks


@pytest.mark.parametrize(
    ("header", "cell", "kv_m3_s"),
    [
        ("Kv [m3/h]", "36", 0.01),
        ("Kv [L/min]", "600", 0.01),
        ("Cv", "100", 100 * KV_OF_CV_1["value"] / 3600.0),
        # The same from its definition, 1 US gallon a minute at 1 psi: flow goes with the root of the drop.
        ("Cv", "100", 100 * 0.003785411784 / 60 * math.sqrt(1e5 / PSI_PA)),
    ],
)
def test_valve_is_kept_as_the_flow_that_loses_one_bar(job_folder, header, cell, kv_m3_s):
    found = run(job_folder, f"bore [mm],{header}", f"100,{cell}").valve_kv_m3_s
    assert found == pytest.approx(kv_m3_s, rel=KV_OF_CV_1["relative"])


def test_rated_drop_and_flow_are_read_as_differences(job_folder):
    found = run(job_folder, "bore [mm],rated drop [psi],rated flow [L/s],item", "100,10,5,strainer")
    assert found.rated_drop_pa == pytest.approx(10.0 * PSI_PA)
    assert found.rated_flow_m3_s == pytest.approx(0.005)
    assert found.item == "strainer"


def test_pipe_in_words_gives_its_bore_and_says_so(job_folder):
    """DN 100 schedule 40: 114.3 mm less two walls of 6.02 mm (ASME B36.10M)."""
    found = run(job_folder, "pipe", "DN 100 sch 40")
    assert found.bore_m == pytest.approx(0.10226)
    assert "R1: DN 100 sch 40 is taken as bore 102.3 mm, wall 6.02 mm." in job_folder.read().remarks


def test_stated_bore_stands_beside_a_pipe_in_words_and_this_is_said(job_folder):
    assert run(job_folder, "bore [mm],pipe", "101,DN 100 sch 40").bore_m == pytest.approx(0.101)
    said = "R1: its stated bore of 101.0 mm stands; DN 100 sch 40 would be bore 102.3 mm, wall 6.02 mm."
    assert said in job_folder.read().remarks


def test_fittings_in_words_are_added_to_stated_k_and_said(job_folder):
    """Crane TP-410 at f_T 0.017: two elbows of 30 and a gate valve of 8 are 1.156; 1 is stated."""
    found = run(job_folder, "bore [mm],fittings K,fittings", '100,1,"2 elbow, 1 gate valve"')
    assert found.fittings_k == pytest.approx(2.156)
    assert "R1: 2 elbow, 1 gate valve is taken as K = 1.16." in job_folder.read().remarks


def test_pump_has_its_curve_in_si(job_folder):
    found = run(
        job_folder,
        "bore [mm],pump curve,pump flow unit,pump head unit,speed column,item",
        "100,0:100; 36:80,m3/h,ft,N-1,pump",
    )
    assert found.pump is not None
    assert found.pump.flow_m3_s == pytest.approx((0.0, 0.01))
    assert found.pump.head_m == pytest.approx((30.48, 24.384))
    assert found.speed_column == "N-1"


def test_metering_valve_takes_its_column_as_a_pressure_difference(job_folder):
    found = run(job_folder, "bore [mm],flow column,flow unit,flow Kvs [m3/h]", "100,DP-9,kPa,36")
    assert found.flow_kvs_m3_s == pytest.approx(0.01)
    assert found.flow_unit is not None
    assert (found.flow_unit.factor, found.flow_unit.kind) == (1000.0, PressureKind.DIFFERENCE)


@pytest.mark.parametrize(("cell", "relative", "absolute"), [("±4 %", 0.02, 0.0), ("±7.2 m3/h", 0.0, 0.001)])
def test_flow_uncertainty_is_a_share_or_a_flow(job_folder, cell, relative, absolute):
    found = run(job_folder, "bore [mm],flow column,flow unit,flow uncertainty", f"100,FT-1,m3/h,{cell}")
    assert (found.flow_doubt.relative_fraction, found.flow_doubt.absolute) == pytest.approx((relative, absolute))


@pytest.mark.parametrize(
    ("cell", "state", "column"),
    [("", RunState.OPEN, None), ("Closed", RunState.CLOSED, None), ("ZS-7", RunState.COLUMN, "ZS-7")],
)
def test_state_of_a_run_is_open_closed_or_a_column(job_folder, cell, state, column):
    found = run(job_folder, "bore [mm],state", f"100,{cell}")
    assert (found.state, found.state_column) == (state, column)


def test_run_with_its_own_temperature_rating_and_free_loss_is_read(job_folder):
    found = run(job_folder, "bore [mm],temperature [degC],temperature column,rating [bar],loss", "100,60,TT-2,16,free")
    assert found.temperature_k == pytest.approx(333.15)
    assert found.temperature_column == "TT-2"
    assert found.temperature_unit is not None
    assert found.temperature_unit.to_si(0.0) == 273.15
    assert found.rating_pa == 16e5
    assert found.loss is LossKind.FREE


def test_gauges_have_range_accuracy_and_kind(job_folder):
    first, second, third = job_folder.read().gauges
    assert (first.range_low_pa, first.range_high_pa) == (0.0, 1e6)
    assert first.accuracy.limit_pa == pytest.approx(16_000.0)  # class 1.6 of 10 bar
    assert first.tolerance.limit_pa == pytest.approx(10_000.0)  # the job's 1 % of span
    assert first.temperature_effect_per_k == 0.0004
    assert (second.unit.kind, second.temperature_effect_per_k) == (PressureKind.ABSOLUTE, None)
    assert second.accuracy.limit_pa == pytest.approx(0.0025 * 150 * PSI_PA)
    assert (third.unit.kind, third.low_station, third.is_differential) == (PressureKind.DIFFERENCE, "S2", True)
    assert third.accuracy.limit_pa == pytest.approx(1000.0)  # grade 2A, 0.5 % of 200 kPa


def test_gauge_elevation_left_blank_is_the_stations(job_folder):
    first, second, _ = job_folder.read().gauges
    assert (first.elevation_m, second.elevation_m) == (1.2, None)


def test_gauge_without_a_run_sits_on_the_widest_that_ends_at_its_station_else_on_one_that_starts_there(job_folder):
    job_folder.write(
        "runs.csv",
        "run,from,to,length [m],bore [mm],roughness [mm]\n"
        "R1,S1,S2,10,80,0.05\nR2,S3,S2,10,150,0.05\nR3,S1,S2,10,100,0.05\n",
    )
    job = job_folder.read()
    assert [g.run for g in job.gauges] == ["R1", "R2", "R1"]
    assert "PT-2: taken to sit on R2, which ends at S2 wider than R1, R3." in job.remarks
    assert not any(remark.startswith(("PT-1: taken", "DP-1: taken")) for remark in job.remarks)


def test_tolerance_is_its_own_else_the_jobs_else_the_accuracy(job_folder):
    text = "tag,station,unit,range low,range high,accuracy,tolerance\nPT-1,S1,barg,0,10,class 1.6,2 % span\n"
    job_folder.write("gauges.csv", text + "PT-2,S1,barg,0,10,class 1.6,\n")
    assert [g.tolerance.limit_pa for g in job_folder.read().gauges] == pytest.approx([20_000.0, 10_000.0])
    job_folder.change("job.toml", 'tolerance = "1 % span"', "")
    assert [g.tolerance.limit_pa for g in job_folder.read().gauges] == pytest.approx([20_000.0, 16_000.0])


def test_tolerance_tighter_than_the_accuracy_is_warned_of(job_folder):
    assert "PT-1: its tolerance (1 % span) is tighter than its accuracy (class 1.6)." in job_folder.read().remarks


def test_tolerance_equal_to_the_accuracy_is_not_warned_of(job_folder):
    gauge(job_folder, "tolerance", "1 % span")
    assert not any("tighter" in remark for remark in job_folder.read().remarks)


@pytest.mark.parametrize(
    ("cell", "fill", "density"),
    [
        ("", LegFill.PROCESS, None),
        ("Process", LegFill.PROCESS, None),
        ("dry", LegFill.DRY, None),
        ("1.07 SG", LegFill.OWN, 1070.0),
        ("870 kg/m3", LegFill.OWN, 870.0),
    ],
)
def test_leg_is_process_dry_or_a_filling(job_folder, cell, fill, density):
    leg = gauge(job_folder, "leg", cell).leg
    assert (leg.fill, leg.density_kg_m3) == (fill, density if density is None else pytest.approx(density))


@pytest.mark.parametrize(
    ("cell", "to_tap", "level"), [("", False, None), ("no", False, None), ("yes", True, None), ("0 m", False, 0.0)]
)
def test_corrected_is_to_the_tap_or_to_a_level(job_folder, cell, to_tap, level):
    found = gauge(job_folder, "corrected", cell)
    assert (found.corrected_to_tap, found.corrected_to_m) == (to_tap, level)


@pytest.mark.parametrize(
    ("cell", "sealed"), [("", None), ("vented", None), ("sealed", 101_325.0), ("Sealed at 95.0 kPa", 95_000.0)]
)
def test_reference_is_vented_or_sealed(job_folder, cell, sealed):
    assert gauge(job_folder, "reference", cell).sealed_pa == sealed


@pytest.mark.parametrize("signal", list(Signal))
def test_signal_is_known_by_its_words(job_folder, signal):
    assert gauge(job_folder, "signal", signal.value.upper()).signal is signal


def test_certificate_and_history_of_a_gauge_are_read(job_folder):
    job_folder.change("job.toml", 'logs = ["log.csv"]', 'logs = ["log.csv"]\ntimezone = "Europe/Lisbon"')
    header = "correction,calibration uncertainty,division,damping [min],serial,from,until,certificate,calibrated,due,"
    cells = "-0.02,±0.01,0.05,2,SN 7,2026-07-01T08:00,2026-07-02T08:00:00Z,C-1,2026-01-05,2027-01-05,0.02 % span/K"
    found = gauge(job_folder, f"{header}temperature effect", cells)
    assert (found.correction_pa, found.calibration_sd_pa, found.division_pa) == pytest.approx((-2000.0, 500.0, 5000.0))
    assert (found.damping_s, found.serial, found.temperature_effect_per_k) == (120.0, "SN 7", 0.0002)
    assert found.hung_from is not None
    assert found.hung_from.astimezone(UTC) == datetime(2026, 7, 1, 7, tzinfo=UTC)  # summer time in Lisbon
    assert found.hung_until == datetime(2026, 7, 2, 8, tzinfo=UTC)
    assert (found.certificate, found.calibrated, found.due) == ("C-1", "2026-01-05", "2027-01-05")


def test_liquid_that_says_nothing_of_its_temperature_is_doubted_widely(job_folder):
    assert job_folder.read().liquid.temperature_sd_k == 0.5
    job_folder.change("job.toml", 'temperature = "18 degC"', "")
    liquid = job_folder.read().liquid
    assert (liquid.temperature_k, liquid.temperature_sd_k, liquid.density_sd_fraction) == (293.15, 5.0, 0.0005)


def test_liquid_temperature_may_be_a_log_column(job_folder):
    job_folder.change("job.toml", '"18 degC"', '{ column = "TT-1", unit = "degF" }')
    liquid = job_folder.read().liquid
    assert liquid.temperature_column == "TT-1"
    assert liquid.temperature_unit is not None
    assert liquid.temperature_unit.to_si(32.0) == pytest.approx(273.15)


@pytest.mark.parametrize(
    ("lines", "fraction", "by_volume"),
    [
        ('kind = "ethylene-glycol"\nconcentration = "30 %"', 0.3, False),
        ('kind = "propylene-glycol"\nconcentration = "38 % vol"', 0.38, True),
    ],
)
def test_glycol_has_its_concentration_by_mass_or_by_volume(job_folder, lines, fraction, by_volume):
    liquid = job_folder.change("job.toml", 'kind = "water"', lines).read().liquid
    assert (liquid.concentration_fraction, liquid.concentration_by_volume) == (pytest.approx(fraction), by_volume)


def test_other_liquid_brings_its_own_values(job_folder):
    lines = 'kind = "other"\ndensity = "0.87 g/cm3"\nviscosity = "12 cP"\nvapour_pressure = "5 mbar"'
    liquid = job_folder.change("job.toml", 'kind = "water"', lines).read().liquid
    assert (liquid.density_kg_m3, liquid.viscosity_pa_s, liquid.vapour_pressure_pa) == pytest.approx((870, 0.012, 500))


def test_seawater_without_salinity_is_read_and_what_is_taken_is_said(job_folder):
    job = job_folder.change("job.toml", '"water"', '"seawater"').read()
    assert job.liquid.salinity_g_kg is None
    assert "salinity: not stated; 35 g/kg is taken." in job.remarks


def test_barometer_is_doubted_by_whether_it_was_read(job_folder):
    assert job_folder.read().site.barometer_sd_pa == 100.0  # ±0.2 kPa
    job_folder.change("job.toml", 'barometer = "98.9 kPa"', "")
    site = job_folder.read().site
    assert (site.barometer_pa, site.barometer_sd_pa) == (None, 1000.0)  # ±2 kPa


@pytest.mark.parametrize(
    ("doubt", "sd_pa"), [("", 100.0), ('\nbarometer_uncertainty = "±0.5 kPa"', 250.0)], ids=["default", "stated"]
)
def test_barometer_in_a_column_is_doubted_as_one_that_was_read(job_folder, doubt, sd_pa):
    job_folder.change("job.toml", '"98.9 kPa"', '{ column = "BARO", unit = "hPa" }' + doubt)
    job = job_folder.read()
    assert (job.site.barometer_column, job.site.barometer_pa, job.site.barometer_sd_pa) == (
        "BARO",
        None,
        sd_pa,
    )
    assert job.site.barometer_unit is not None
    assert job.site.barometer_unit.to_si(989.0) == pytest.approx(98_900.0)


def test_ambient_is_none_unless_stated(job_folder):
    assert job_folder.read().site.ambient_k is None
    job_folder.change("job.toml", 'latitude = "47 deg"', 'ambient = "31 degC"')
    site = job_folder.read().site
    assert (site.ambient_k, site.ambient_sd_k, site.latitude_deg) == (pytest.approx(304.15), 5.0, 45.0)


def test_check_settings_have_their_defaults(job_folder):
    check = job_folder.read().check
    assert (check.decision, check.confidence_fraction, check.tolerance_text) == (DecisionRule.GUARDED, 0.95, "1 % span")


def test_stated_spells_keep_their_flows_in_the_jobs_time(job_folder):
    job_folder.change("job.toml", 'logs = ["log.csv"]', 'logs = ["log.csv"]\nspells = "spells.csv"')
    job_folder.write(
        "spells.csv",
        "start,end,kind,flow R1 [m3/h],flow R1 uncertainty,note\n"
        "2026-03-02T08:00:00Z,2026-03-02T09:00:00+00:00,still,,,night\n"
        "2026-03-02T09:00,2026-03-02T10:00,flowing,36,±4 %,\n",
    )
    still, flowing = job_folder.read().spells
    assert (still.kind, still.flows, still.note) == (SpellKind.STILL, (), "night")
    assert still.end_s - still.start_s == timedelta(hours=1).total_seconds()
    assert flowing.start_s == datetime(2026, 3, 2, 9, tzinfo=UTC).timestamp()
    assert (flowing.flows[0].run, flowing.flows[0].flow_m3_s) == ("R1", pytest.approx(0.01))
    assert flowing.flows[0].doubt.relative_fraction == pytest.approx(0.02)


def test_levels_are_moved_to_the_centreline(job_folder):
    job_folder.change("job.toml", 'logs = ["log.csv"]', 'logs = ["log.csv"]\nlevels = "levels.csv"')
    job_folder.write(
        "levels.csv",
        "run,distance [m],elevation [m],ground [m],uncertainty [mm],level of\nR1,0,2,3,20,invert\nR1,20,8,,,\n",
    )
    job = job_folder.read()
    first, second = job.levels
    assert (first.elevation_m, first.ground_m, first.elevation_sd_m) == pytest.approx((2.05, 3.0, 0.01))
    assert (second.elevation_m, second.ground_m, second.elevation_sd_m) == (8.0, None, 0.025)
    assert unused_yet(job) == ()


def test_what_only_a_hold_needs_is_said_to_be_unused(job_folder):
    run(job_folder, "bore [mm],rating [bar]", "100,16")
    job_folder.change("job.toml", "[check]", '[hold]\nat = "S1"\n\n[check]')
    said = unused_yet(job_folder.read())
    assert [remark.partition(":")[0] for remark in said] == ["runs", "[hold]"]
    assert all("not used yet" in remark for remark in said)


def test_run_that_ends_at_a_surface_without_k_is_said(job_folder):
    job_folder.change("runs.csv", "R2,S2,S3,25,80,,1,,", "R2,S2,S3,25,80,,,,")
    assert "R2: ends at the surface S3 with no K; an exit is K = 1." in job_folder.read().remarks


def test_display_units_are_those_of_the_jobs_own_files(job_folder):
    display = job_folder.read().display
    assert (display.length.text, display.flow.text) == ("m", "m3/h")
    job_folder.write(
        "gauges.csv",
        "tag,station,unit,range low,range high,accuracy\n"
        "A,S1,psig,0,100,1 % span\nB,S2,barg,0,10,1 % span\nC,S2,psig,0,100,1 % span\n",
    )
    pressure = job_folder.read().display.pressure
    assert (pressure.text, pressure.kind) == ("psi", PressureKind.DIFFERENCE)


def test_logs_are_found_by_glob_in_order_and_the_walk_comes_last(job_folder):
    job_folder.change("job.toml", '["log.csv"]', '["day-*.csv", "log.csv"]')
    for name in ("day-2.csv", "day-1.csv", "walk.csv"):
        job_folder.write(name, "time,tag,value,unit\n")
    assert [path.name for path in job_folder.read().log_files] == ["day-1.csv", "day-2.csv", "log.csv", "walk.csv"]


def test_walk_listed_among_the_logs_is_read_once(job_folder):
    job_folder.change("job.toml", '["log.csv"]', '["log.csv", "walk.csv"]').write("walk.csv", "time,tag,value\n")
    assert [path.name for path in job_folder.read().log_files] == ["log.csv", "walk.csv"]


def test_log_that_is_not_there_is_only_said_beside_a_walk(job_folder):
    (job_folder.path / "log.csv").unlink()
    job = job_folder.write("walk.csv", "time,tag,value\n").read()
    assert [path.name for path in job.log_files] == ["walk.csv"]
    assert "log.csv: there is no such log yet." in job.remarks


def test_job_without_logs_is_read_where_none_is_needed(job_folder):
    (job_folder.path / "log.csv").unlink()
    assert read_job(job_folder.path, logs_needed=False).log_files == ()


def test_log_settings_and_hold_are_kept(job_folder):
    text = (job_folder.path / "job.toml").read_text(encoding="utf-8")
    job_folder.write(
        "job.toml",
        text + '[log]\ndelimiter = ";"\nheader_line = 3\nstamp = ["Date", "Time"]\nday_first = true\ngood = ["192"]\n'
        '[hold]\nruns = ["R1"]\nmaterial = "steel"\n',
    )
    job = job_folder.read()
    assert (job.log.delimiter, job.log.header_line, job.log.day_first) == (";", 3, True)
    assert (job.log.stamp, job.log.good, job.log.shape) == (("Date", "Time"), ("192",), None)
    assert dict(job.hold) == {"runs": "['R1']", "material": "steel"}


def test_folder_may_be_given_as_text(job_folder):
    assert read_job(str(job_folder.path)) == read_job(Path(job_folder.path))
