"""``expect``: the ledger's words, signs and units, and its complaints. Values stand in the tests of the balance."""

from __future__ import annotations

import pytest

from headledger.cli.main import main


def ledger(capsys: pytest.CaptureFixture[str], *options: str) -> str:
    assert main(["expect", *options]) == 0
    return capsys.readouterr().out


def complaints(capsys: pytest.CaptureFixture[str], *options: str) -> list[str]:
    assert main(["expect", *options]) == 2
    captured = capsys.readouterr()
    assert captured.out == ""
    return captured.err.splitlines()


def row(text: str, start: str) -> list[str]:
    line = next(line for line in text.splitlines() if line.startswith(start))
    return line.split()[-2:]


def test_ten_metres_down_at_rest_adds_the_weight_of_the_column(capsys: pytest.CaptureFixture[str]):
    """998.207 kg/m3 (IAPWS-95, 20 degC) x 9.80620 m/s2 (WGS 84, 45 deg) x 10 m = 97.886 kPa on top of 100 kPa."""
    text = ledger(capsys, "--from", "100 kPa", "--from-elevation", "10 m", "--to-elevation", "0 m")
    assert row(text, "Elevation 10 to 0 m") == ["+10.000", "+97.89"]
    assert "The second point should read 197.89 kPa gauge." in text


def test_every_loss_has_a_line_of_its_own(capsys: pytest.CaptureFixture[str]):
    """A Kv of 20 m3/h passes 10 m3/h with 0.25 bar lost, at 1000 kg/m3 (IEC 60534, from memory)."""
    text = ledger(
        capsys, "--from", "3 bar", "--flow", "10 m3/h", "--bore", "50 mm", "--length", "20 m", "--fittings-k", "2",
        "--kv", "20 m3/h", "--drop", "0.1 bar", "--liquid", "other", "--density", "1000 kg/m3",
    )  # fmt: skip
    assert row(text, "Valve, Kv 20 m3/h")[1] == "-0.2500"
    assert row(text, "Stated drop")[1] == "-0.1000"
    assert float(row(text, "Pipe, 20 m (Darcy-Weisbach)")[1]) < 0.0
    assert float(row(text, "Fittings, K 2")[1]) < 0.0
    assert "Reynolds number" in text


def test_terms_of_the_ledger_add_up(capsys: pytest.CaptureFixture[str]):
    text = ledger(
        capsys, "--from", "50 psig", "--from-elevation", "40 ft", "--flow", "200 gpm", "--bore", "4 in", "--to-bore",
        "3 in", "--length", "300 ft", "--fittings-k", "4",
    )  # fmt: skip
    rows = [line.split()[-2:] for line in text.split("\n\n")[0].splitlines()[1:] if "---" not in line]
    heads, pressures = ([float(cells[column]) for cells in rows] for column in (0, 1))
    assert sum(heads[:-1]) == pytest.approx(heads[-1], abs=0.003)
    assert sum(pressures[:-1]) == pytest.approx(pressures[-1], abs=0.003)
    assert "head, ft" in text
    assert "psig." in text


def test_flow_the_other_way_gains_what_it_would_lose(capsys: pytest.CaptureFixture[str]):
    text = ledger(capsys, "--from", "3 bar", "--flow", "-36 m3/h", "--bore", "100 mm", "--length", "30 m")
    assert row(text, "Pipe, 30 m")[0].startswith("+")


def test_free_surface_has_no_velocity_head(capsys: pytest.CaptureFixture[str]):
    """1.2732 m/s in 100 mm at 36 m3/h: v2/2g = 0.0827 m is spent where the liquid starts from rest."""
    text = ledger(capsys, "--from", "0 bar", "--from-bore", "surface", "--flow", "36 m3/h", "--bore", "100 mm")
    assert float(row(text, "Velocity head gained")[0]) == pytest.approx(-0.0827, abs=5e-4)


def test_absolute_pressure_stays_absolute(capsys: pytest.CaptureFixture[str]):
    assert "The second point should read 3.0000 bara." in ledger(capsys, "--from", "3 bara")


def test_unit_of_the_answer_can_be_chosen(capsys: pytest.CaptureFixture[str]):
    assert "The second point should read 300.00 kPa gauge." in ledger(capsys, "--from", "3 bar", "--unit", "kPa")


def test_pressure_below_vapour_pressure_is_said(capsys: pytest.CaptureFixture[str]):
    """13 m of suction lift is more than one atmosphere carries."""
    assert "vapour pressure" in ledger(capsys, "--from", "0.2 bar", "--to-elevation", "13 m")
    assert "vapour pressure" not in ledger(capsys, "--from", "0.2 bar", "--to-elevation", "9 m")


def test_glycol_by_volume_is_heavier_than_by_mass(capsys: pytest.CaptureFixture[str]):
    """50 % ethylene glycol at 20 degC: 1064.9 kg/m3 by mass, 1073.4 by volume (CoolProp MEG, AEG)."""
    common = ("--from", "1 bar", "--liquid", "ethylene-glycol", "--concentration")
    densities = [
        float(ledger(capsys, *common, share).split("Ethylene-glycol: ")[1].split()[0]) for share in ("50 %", "50 % vol")
    ]
    assert densities == pytest.approx([1064.9, 1073.4], abs=0.5)


def test_all_wrong_options_are_told_at_once(capsys: pytest.CaptureFixture[str]):
    said = complaints(capsys, "--from", "3 brr", "--flow", "5 m3", "--bore", "0 mm", "--temperature", "20")
    assert len(said) == 4
    for option in ("--from", "--flow", "--bore", "--temperature"):
        assert sum(line.startswith(f"{option}:") for line in said) == 1


def test_flow_without_a_bore_asks_for_it(capsys: pytest.CaptureFixture[str]):
    (said,) = complaints(capsys, "--from", "3 bar", "--flow", "5 m3/h", "--length", "3 m")
    assert said.startswith("--bore: is missing")


def test_unit_of_another_kind_is_refused(capsys: pytest.CaptureFixture[str]):
    (said,) = complaints(capsys, "--from", "3 barg", "--unit", "psia")
    assert said.startswith("--unit: is not of the kind of --from")
