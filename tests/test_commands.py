"""The commands as a user types them: what they print, what they leave, and their exit codes."""

from __future__ import annotations

import json
from pathlib import Path

import numpy as np
import pytest
from stepped import STEP

import swmodel
from swmodel.cli import main
from swmodel.errors import CAUTION

CONFIGS = Path(__file__).parent.parent / "configs"

FREQUENCY = """\
measure = { kind = "frequency", of = "eta", at = ["3 km", "0 km"] }
value = "inertial_frequency"
within = "0.01 %"
"""


def test_run_leaves_a_judged_and_drawn_folder(step, tmp_path, capsys):
    assert main(["run", str(step), "--into", str(tmp_path / "run")]) == 0
    printed = capsys.readouterr()
    assert "overall: holds" in printed.out
    assert CAUTION in " ".join(printed.err.split())
    names = {path.name for path in (tmp_path / "run").iterdir()}
    files = {"config.toml", "settings.json", "snapshots.h5", "diagnostics.h5", "verdict.json", "run.log"}
    assert names >= files | {"checkpoints", "figures"}
    assert (tmp_path / "run" / "config.toml").read_text() == STEP
    assert list((tmp_path / "run" / "figures").glob("*.png"))
    verdict = json.loads((tmp_path / "run" / "verdict.json").read_text())
    assert verdict["overall"] == "holds"
    assert verdict["caution"] == CAUTION
    assert verdict["expectations"][0]["remarks"][0] == "one grid: grid error not included"


def test_a_second_run_gets_a_folder_of_its_own(step, tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    for _ in range(2):
        assert main(["run", str(step), "--set", "time.until=4 h"]) == 0
    assert sorted(path.name for path in (tmp_path / "runs").iterdir()) == ["step", "step-2"]


def test_run_refuses_a_folder_that_holds_anything(step, tmp_path, capsys):
    (tmp_path / "held").mkdir()
    (tmp_path / "held" / "note.txt").write_text("mine")
    assert main(["run", str(step), "--into", str(tmp_path / "held")]) == 2
    assert "holds note.txt" in capsys.readouterr().err
    assert [path.name for path in (tmp_path / "held").iterdir()] == ["note.txt"]


def test_a_failed_expectation_gives_exit_1(step, tmp_path, capsys):
    step.write_text(STEP.replace("value = 0", "value = 0.5"))
    assert main(["run", str(step), "--into", str(tmp_path / "run")]) == 1
    assert "overall: fails" in capsys.readouterr().out


def test_undecided_counts_as_failed_only_when_strict(step, tmp_path, capsys):
    # the basin slosh and the inertial swing are both there: no single sinusoid is found to a hundredth of a per cent
    assert main(["run", str(step), "--into", str(tmp_path / "run")]) == 0
    other = tmp_path / "other.toml"
    other.write_text(
        STEP.replace(
            'measure = { kind = "change", of = "mass" }\nvalue = 0\nwithin = 1e-12',
            FREQUENCY,
        )
    )
    assert main(["judge", str(tmp_path / "run"), str(other)]) == 0
    assert "undecided" in capsys.readouterr().out
    assert main(["judge", str(tmp_path / "run"), str(other), "--strict"]) == 1


def test_faults_come_all_at_once_with_their_lines_and_nothing_is_written(step, tmp_path, capsys):
    step.write_text(STEP.replace('depth = "100 m"', 'dept = "100 m"').replace('until = "4 day"', 'until = "4 km"'))
    assert main(["run", str(step), "--into", str(tmp_path / "run")]) == 2
    err = capsys.readouterr().err
    assert f"{step}:8: layer.dept" in err
    assert f"{step}:31: time.until" in err
    assert "2 faults; nothing was written" in err
    assert not (tmp_path / "run").exists()


def test_a_layer_that_dries_gives_exit_3_and_keeps_the_last_good_state(step, tmp_path, capsys):
    # a trough 1 m deep in a layer of 1.2 m, whose refilling overshoots (invented): the full equations outcrop
    step.write_text(
        STEP.replace('depth = "100 m"', 'depth = "1.2 m"')
        .replace('amplitude = "0.5 m"', 'amplitude = "1.1 m"')
        .replace("linear = true", "linear = false")
    )
    folder = tmp_path / "run"
    assert main(["run", str(step), "--into", str(folder)]) == 3
    err = capsys.readouterr().err
    assert "likely cause" in err
    assert "x = " in err
    kept = sorted((folder / "checkpoints").glob("*.h5"))
    assert kept
    from swmodel.store.checkpoints import read_checkpoint

    state = read_checkpoint(folder)
    assert all(np.isfinite(field).all() for level in state.levels for field in level)


def test_a_fault_of_our_own_is_not_taken_for_a_failed_expectation(step, monkeypatch, capsys):
    from swmodel.cli import commands

    def broken(options):
        raise ZeroDivisionError

    monkeypatch.setattr(commands, "check_command", broken)
    assert main(["check", str(step)]) == 4
    assert "a fault of swmodel" in capsys.readouterr().err


def test_check_prints_a_table_of_80_columns_and_ends_with_a_count(step, capsys):
    assert main(["check", str(step)]) == 0
    out = capsys.readouterr().out
    assert max(map(len, out.splitlines())) <= 80
    assert out.splitlines()[-1].startswith("0 refusals, ")


def test_check_refuses_a_set_up_that_cannot_answer(step, capsys):
    late = 'measure = { kind = "amplitude", of = "eta", during = "9 day" }\nvalue = "1 m"\nwithin = "1 m"\n'
    step.write_text(f'{STEP}\n[[expect]]\nclaim = "late"\n{late}because = "none"\n')
    assert main(["check", str(step)]) == 2
    assert capsys.readouterr().out.splitlines()[-1].startswith("1 refusal")


def test_check_knows_that_rotation_drives_a_front_against_walls_along_it(step, capsys):
    # Gill 1982, chapter 7: the adjusted flow runs along the front; between walls across it must turn round
    assert main(["check", str(step)]) == 0
    assert "nothing varies along it" in " ".join(capsys.readouterr().out.split())
    step.write_text(STEP.replace('"periodic"', '"wall"'))
    assert main(["check", str(step)]) == 0
    assert "nothing varies along it" not in " ".join(capsys.readouterr().out.split())


def test_machines_get_json(step, tmp_path, capsys):
    assert main(["check", str(step), "--json"]) == 0
    assert json.loads(capsys.readouterr().out)["refusals"] == []
    assert main(["list", "--json"]) == 0
    assert set(json.loads(capsys.readouterr().out)) >= {"bodies", "starts", "theory"}
    assert main(["run", str(step), "--into", str(tmp_path / "run"), "--set", "time.until=4 h"]) == 0
    capsys.readouterr()
    assert main(["judge", str(tmp_path / "run"), "--json"]) == 0
    assert json.loads(capsys.readouterr().out)["overall"] == "holds"


def test_new_writes_a_starting_point_and_never_overwrites(tmp_path, monkeypatch, capsys):
    monkeypatch.chdir(tmp_path)
    assert main(["new", "front"]) == 0
    assert (tmp_path / "front.toml").read_text() == (CONFIGS / "front.toml").read_text()
    (tmp_path / "front.toml").write_text("mine")
    assert main(["new", "front"]) == 2
    assert (tmp_path / "front.toml").read_text() == "mine"
    assert main(["new", "frnt"]) == 2
    assert 'did you mean "front"?' in capsys.readouterr().err


def test_list_fits_80_columns_and_names_every_row(capsys):
    assert main(["list"]) == 0
    out = capsys.readouterr().out
    assert max(map(len, out.splitlines())) <= 80
    for name in (*swmodel.measures.MEASURES, *swmodel.theory.THEORY, *swmodel.state.STARTS, *swmodel.frame.PLANES):
        assert f"  {name} " in out or f"  {name}\n" in out


def test_a_mistyped_command_is_answered_with_the_nearest(capsys):
    with pytest.raises(SystemExit) as stop:
        main(["chekc", "x.toml"])
    assert stop.value.code == 2
    assert 'did you mean "check"?' in capsys.readouterr().err


def test_schema_is_json(capsys):
    assert main(["schema"]) == 0
    assert json.loads(capsys.readouterr().out)["type"] == "object"


def test_python_can_do_what_the_command_line_does(step, tmp_path):
    experiment = swmodel.read(step).with_values({"frame.latitude": "-30 deg", "time.until": "6 h"})
    assert swmodel.check(experiment).refusals == []
    run = swmodel.run(experiment, into=tmp_path / "run")
    assert run.verdict()["overall"] == "holds"
    with run.snapshots() as snapshots:
        assert snapshots["eta"].dims == ("time", "y", "x")
        assert float(snapshots["time"].size) == 4
    model = swmodel.Model(experiment)
    model.advance("6 h")
    # the model by itself and the run on disk are one thing, to the last bit
    assert np.array_equal(model.eta, run.fields.field("eta", -1))


def test_the_experiment_and_the_code_of_the_readme_work(tmp_path, monkeypatch, capsys):
    readme = (CONFIGS.parent / "README.md").read_text()
    monkeypatch.chdir(tmp_path)
    Path("pool.toml").write_text(readme.split("```toml\n")[1].split("```")[0])
    exec(compile(readme.split("```python\n")[1].split("```")[0], "README.md", "exec"), {})
    printed = capsys.readouterr().out
    assert "0 refusals" in printed
    assert printed.rstrip().endswith("holds")
