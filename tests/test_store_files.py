"""The files as other programs see them, and as we read them back."""

import datetime
import importlib.util
import json
import math
import shutil
import subprocess
import sys

import h5py
import numpy as np
import pytest
import store_trial as trial

from swmodel.errors import CAUTION, RequestError
from swmodel.store import layout
from swmodel.store.durable import write_json
from swmodel.store.layout import attach, packed
from swmodel.store.names import FIELDS, STILL_FIELDS
from swmodel.store.provenance import digest, gather_provenance, git_revision, without_host
from swmodel.store.reading import Run

BASIN = trial.make_basin()
GRID = BASIN.grid
NAMES = tuple(trial.LOCATIONS)
COUNT = 5


def write(folder, *, basin=BASIN, count=COUNT, finish=True, **settings):
    """A run of a few snapshots, rows and a budget; unfinished it is still an index over parts."""
    fields = settings.pop("fields", NAMES)
    with trial.open_writer(folder, basin=basin, fields=fields, **settings) as writer:
        for k in range(count):
            writer.write_snapshot(k * trial.STEP, trial.snapshot(basin.grid, k, fields))
            series = {"mass": k / 3, "pv_max": -0.0}
            writer.write_diagnostics(k * trial.STEP, series, {"energy_budget": {"pressure_work": k / 7}})
        if finish:
            writer.finish()
    return folder


@pytest.fixture(scope="module", params=["index", "plain"])
def run_folder(request, tmp_path_factory):
    """A run that still goes on (parts under an index), and one that ended (one plain file); moved elsewhere since."""
    home = tmp_path_factory.mktemp(request.param)
    folder = write(home / "before", finish=request.param == "plain")
    return folder.rename(home / "moved since")


@pytest.fixture(params=["snapshots", "diagnostics"])
def file(request, run_folder):
    return run_folder / f"{request.param}.h5"


def test_the_first_reader_is_ours(run_folder):
    run = Run(run_folder)
    fields, series = run.fields, run.series
    assert fields.names == NAMES
    np.testing.assert_array_equal(fields.times, trial.STEP * np.arange(COUNT))
    for axis in ("x", "y", "x_face", "y_face"):
        np.testing.assert_array_equal(getattr(fields, axis), getattr(GRID, axis))
    np.testing.assert_array_equal(fields.depth, BASIN.depth)
    np.testing.assert_array_equal(fields.f, BASIN.f)
    for name in NAMES:
        for k in range(-COUNT, COUNT):
            got = fields.field(name, k)
            assert got.dtype == np.float64
            np.testing.assert_array_equal(got, trial.field(GRID, name, k % COUNT))
    assert fields.epoch == trial.EPOCH
    assert fields.attributes["comment"] == CAUTION
    with pytest.raises(KeyError, match="speed was not stored; there are eta, u, v, pv"):
        fields.field("speed", 0)
    with pytest.raises(IndexError, match="there are 5 snapshots, and none of number 5"):
        fields.field("eta", COUNT)
    assert series.names == ("mass", "pv_max")
    assert series.groups == ("energy_budget",)
    np.testing.assert_array_equal(series["mass"], np.arange(COUNT) / 3)
    np.testing.assert_array_equal(series.group("energy_budget")["pressure_work"], np.arange(COUNT) / 7)
    assert run.config_text == trial.CONFIGURATION
    assert run.settings == trial.make_provenance().settings


def test_xarray_opens_both_files_without_a_warning(run_folder):
    with Run(run_folder).snapshots() as dataset:
        for name in NAMES:
            dimensions = {"eta": ("y", "x"), "u": ("y", "x_face"), "v": ("y_face", "x"), "pv": ("y_face", "x_face")}
            assert dataset[name].dims == ("time", *dimensions[name])
            np.testing.assert_array_equal(dataset[name][2], trial.field(GRID, name, 2))
        assert dataset["f"].dims == ("y_face", "x_face")
        assert dataset["time"].values[1] == np.datetime64("2000-01-01T00:01:00")
        assert dataset.encoding["unlimited_dims"] == {"time"}
    with Run(run_folder).diagnostics() as dataset:
        np.testing.assert_array_equal(dataset["mass"], np.arange(COUNT) / 3)
    with Run(run_folder).diagnostics("energy_budget") as dataset:
        np.testing.assert_array_equal(dataset["pressure_work"], np.arange(COUNT) / 7)
        assert dataset["time"].values[1] == np.datetime64("2000-01-01T00:01:00")


def test_xarray_opens_them_by_its_other_engine_too(file):
    xarray = pytest.importorskip("xarray")
    with xarray.open_dataset(file, engine="netcdf4") as dataset, xarray.open_dataset(file, engine="h5netcdf") as other:
        xarray.testing.assert_identical(dataset.load(), other.load())
        assert dataset.attrs["title"] == "Stör"
        assert str(dataset["configuration"].values) == trial.CONFIGURATION


def test_netcdf4_reads_both_files(run_folder):
    netCDF4 = pytest.importorskip("netCDF4")
    with netCDF4.Dataset(run_folder / "snapshots.h5") as dataset:
        assert dataset.dimensions["time"].isunlimited()
        assert [name for name, item in dataset.dimensions.items() if not item.isunlimited()] == [
            "x", "y", "x_face", "y_face",
        ]  # fmt: skip
        for name in NAMES:
            assert not np.ma.is_masked(dataset[name][:])
            np.testing.assert_array_equal(dataset[name][3], trial.field(GRID, name, 3))
        assert not np.ma.is_masked(dataset["y_face"][:])  # it holds 0, HDF5's own fill value
    with netCDF4.Dataset(run_folder / "diagnostics.h5") as dataset:
        assert dataset["energy_budget"]["pressure_work"].dimensions == ("time",)
        np.testing.assert_array_equal(dataset["energy_budget/pressure_work"][:], np.arange(COUNT) / 7)


def test_netcdf4_can_append_to_a_copy_of_a_finished_run(tmp_path):
    netCDF4 = pytest.importorskip("netCDF4")
    write(tmp_path / "run")
    with netCDF4.Dataset(tmp_path / "run" / "snapshots.h5", "a") as dataset:
        dataset["time"][COUNT] = 1000.0
        dataset["eta"][COUNT] = 1.5
    np.testing.assert_array_equal(Run(tmp_path / "run").fields.field("eta", COUNT), 1.5)


@pytest.mark.skipif(shutil.which("ncdump") is None, reason="needs ncdump")
def test_ncdump_reads_both_files_without_a_word_of_complaint(file):
    answer = subprocess.run(["ncdump", str(file)], capture_output=True, text=True, check=True)
    assert answer.stderr == ""
    assert "time = UNLIMITED ; // (5 currently)" in answer.stdout
    wanted = {"snapshots": "double pv(time, y_face, x_face)", "diagnostics": "double pressure_work(time)"}
    assert wanted[file.stem] in answer.stdout


@pytest.mark.filterwarnings("ignore")  # the checker's own
@pytest.mark.skipif(importlib.util.find_spec("compliance_checker") is None, reason="needs compliance-checker")
def test_the_cf_checker_finds_nothing_but_the_role_that_sgrid_asks_for(file, tmp_path):
    from compliance_checker.runner import CheckSuite, ComplianceChecker

    shown = tmp_path / f"{file.stem}.nc"  # CF 2.1 wants this ending; a link keeps the parts of an index in reach
    shown.symlink_to(file)
    report = tmp_path / "report.json"
    CheckSuite.load_all_available_checkers()
    ComplianceChecker.run_checker(
        str(shown), ["cf:1.11"], 0, "strict", output_filename=str(report), output_format="json"
    )
    found = json.loads(report.read_text())["cf:1.11"]
    rows = [row for level in ("high_priorities", "medium_priorities", "low_priorities") for row in found[level]]
    # a row that reaches its full score may carry a remark all the same
    messages = [message for row in rows if row["value"][0] < row["value"][1] for message in row["msgs"]]
    role = "grid_topology is not a valid cf_role value. It must be one of timeseries_id, profile_id, trajectory_id"
    assert messages == ([role] if file.stem == "snapshots" else [])
    assert len(rows) > 20  # it did look


def test_the_staggering_is_declared_as_sgrid_wants_it(run_folder):
    # SGRID 0.3: required are cf_role, topology_dimension, node_dimensions, face_dimensions
    with h5py.File(run_folder / "snapshots.h5") as file:
        topology = dict(file["grid"].attrs.items())
        assert topology["cf_role"] == b"grid_topology"
        assert topology["topology_dimension"] == 2
        assert topology["node_dimensions"] == b"x_face y_face"
        # no padding: one cell less than nodes, and so nodes at both ends
        assert topology["face_dimensions"] == b"x: x_face (padding: none) y: y_face (padding: none)"
        places = {name: file[name].attrs["location"] for name in NAMES}
        assert places == {"eta": b"face", "u": b"edge1", "v": b"edge2", "pv": b"node"}
        for axis in ("x_face", "y_face"):
            assert file[axis].attrs["c_grid_axis_shift"] == -0.5
            assert file[axis].attrs["axis"] == axis[0].upper().encode()


@pytest.mark.parametrize("precision", ["double", "single"])
@pytest.mark.parametrize("compression", [True, False])
@pytest.mark.parametrize("inflater", ["isal", "zlib"])
def test_fields_come_back_to_the_last_bit(tmp_path, monkeypatch, precision, compression, inflater):
    if inflater == "zlib":
        import zlib

        monkeypatch.setattr(layout, "deflate", zlib)
    elif importlib.util.find_spec("isal") is None:
        pytest.skip("needs isal")
    # bands of 5 rows of 15: the last band of every kind of plane is a part of one
    monkeypatch.setattr(layout, "CHUNK_BYTES", 5 * 15 * (8 if precision == "double" else 4))
    basin = trial.make_basin(15, 12, precision)
    folder = write(tmp_path / "run", basin=basin, compression=compression)
    with h5py.File(folder / "snapshots.h5") as file:
        for name in NAMES:
            assert file[name].dtype == basin.grid.dtype
            assert file[name].chunks[0] == 1
            assert file[name].chunks[1] < file[name].shape[1]
            assert (file[name].compression, file[name].shuffle) == (("gzip", True) if compression else (None, False))
            np.testing.assert_array_equal(file[name][4], trial.field(basin.grid, name, 4))
        assert file["f"].dtype == np.float64


def test_smooth_fields_take_less_room_than_their_bytes():
    # lossless ratio of smooth doubles by shuffle and deflate: more than 1.2 even on eddying flow (measured)
    smooth = np.sin(np.linspace(0.0, 3.0, 256))[None, :] * np.cos(np.linspace(0.0, 2.0, 128))[:, None]
    assert len(packed(smooth)) < smooth.nbytes / 1.2


def test_a_part_of_the_domain_is_stored_with_its_coordinates(tmp_path):
    basin = trial.make_basin(15, 12)
    folder = write(tmp_path / "run", basin=basin, region=("-2 km", "7 km", "0 km", "13.5 km"), stride=3)
    fields = Run(folder).fields
    np.testing.assert_array_equal(fields.x_face, [-2000.0, 1000.0, 4000.0, 7000.0])
    np.testing.assert_array_equal(fields.y, [2250.0, 6750.0, 11250.0])
    whole = trial.field(basin.grid, "u", 1)
    np.testing.assert_array_equal(fields.field("u", 1), whole[1:9:3, 1:11:3])
    np.testing.assert_array_equal(fields.depth, basin.depth[1:9:3, 2:10:3])
    np.testing.assert_array_equal(fields.f, basin.f[0:10:3, 1:11:3])


def test_every_name_that_can_be_stored_is_stored(tmp_path, monkeypatch):
    monkeypatch.setattr(trial, "LOCATIONS", {name: row.location for name, row in FIELDS.items()})
    folder = write(tmp_path / "run", fields=tuple(FIELDS), count=1)
    with h5py.File(folder / "snapshots.h5") as file:
        for name, row in (FIELDS | STILL_FIELDS).items():
            assert file[name].attrs["units"].decode() == row.units
            assert file[name].attrs["long_name"].decode() == row.long_name


def test_units_and_standard_names_are_those_of_the_cf_table():
    # CF standard name table: coriolis_parameter has canonical units s-1 (value from memory)
    assert (STILL_FIELDS["f"].standard_name, STILL_FIELDS["f"].units) == ("coriolis_parameter", "s-1")
    assert {row.standard_name for row in FIELDS.values()} == {""}  # sea or air only: not true of every layer


@pytest.mark.parametrize(
    ("epoch", "units"),
    [
        (datetime.datetime(2000, 1, 1), "seconds since 2000-01-01 00:00:00"),
        (datetime.datetime(1969, 7, 20, 20, 17, 40, 500_000), "seconds since 1969-07-20 20:17:40.500000"),
        (
            datetime.datetime(2024, 2, 29, 1, 0, tzinfo=datetime.timezone(datetime.timedelta(hours=2))),
            "seconds since 2024-02-28 23:00:00",
        ),
    ],
)
def test_time_counts_from_the_start_of_the_run(tmp_path, monkeypatch, epoch, units):
    xarray = pytest.importorskip("xarray")
    monkeypatch.setattr(trial, "EPOCH", epoch)
    folder = write(tmp_path / "run", fields=("eta",), count=2)
    with h5py.File(folder / "snapshots.h5") as file:
        assert file["time"].attrs["units"].decode() == units
    utc = epoch.astimezone(datetime.UTC).replace(tzinfo=None) if epoch.tzinfo else epoch
    assert Run(folder).fields.epoch == utc
    with xarray.open_dataset(folder / "snapshots.h5") as dataset:
        assert dataset["time"].values[1] == np.datetime64(utc) + np.timedelta64(60, "s")


def test_every_file_carries_what_made_it(file):
    with h5py.File(file) as content:
        assert content["configuration"][()].decode() == trial.CONFIGURATION
        assert json.loads(content["settings"][()]) == trial.make_provenance().settings
        assert content.attrs["comment"].decode() == CAUTION
        assert content.attrs["command"] == b"swmodel run front.toml"
        assert content.attrs["package_versions"].decode() == f"swmodel 0.1.0, numpy {np.__version__}"
        assert content.attrs["Conventions"] == b"CF-1.11"


def test_a_configuration_beyond_the_room_of_an_attribute_is_kept(tmp_path, monkeypatch):
    text = "# long\n" * 20_000  # 140 kB; an attribute holds 64 KiB
    monkeypatch.setattr(trial, "CONFIGURATION", text)
    folder = write(tmp_path / "run", fields=("eta",), count=1)
    assert Run(folder).config_text == text
    with h5py.File(folder / "snapshots.h5") as file:
        assert file["configuration"][()].decode() == text


def test_nothing_of_the_host_is_in_the_provenance(tmp_path):
    command = [
        "/home/someone/bin/swmodel",
        "run",
        "front.toml",
        "--into=/scratch/x/front",
        "--set",
        "a.b=C:\\data\\f.nc",
    ]
    assert without_host(command) == "swmodel run front.toml --into=front --set a.b=f.nc"
    made = gather_provenance("", {"start": [{"file": "/data/secret/spin.h5"}]}, command)
    assert {"python", "numpy", "h5py"} <= made.versions.keys()
    with h5py.File(tmp_path / "x.h5", "w", track_order=True) as file:
        layout.add_provenance(file, made)
        assert json.loads(file["settings"][()]) == {"start": [{"file": "spin.h5"}]}


def test_the_digest_of_an_experiment_leaves_out_what_changes_no_number():
    settings = {"time": {"until": 1.0, "step": 2.0}, "numerics": {"threads": 1}}
    assert digest(settings) == digest({"numerics": {"threads": 2}, "time": {"step": 2.0, "until": 3.0}})
    assert digest(settings) != digest({"time": {"until": 1.0, "step": 3.0}})


def test_a_folder_outside_a_checkout_has_no_revision(tmp_path):
    assert git_revision(tmp_path) == ""
    # a package that lies in someone's repository without being part of it takes no revision from there
    if shutil.which("git"):
        subprocess.run(["git", "init", "-q", str(tmp_path)], check=True)
        (tmp_path / "provenance.py").write_text("")
        assert git_revision(tmp_path) == ""


def test_types_that_other_readers_drop_are_never_written(run_folder):
    def check(name, item):
        dtypes = [value.dtype for value in map(np.asarray, item.attrs.values())]
        for dtype in [*dtypes, *([item.dtype] if isinstance(item, h5py.Dataset) else [])]:
            assert dtype.kind in "iufSOV", (name, dtype)  # V, O: references between axes and fields; text
            assert dtype.kind != "f" or dtype.itemsize >= 4, name

    for path in run_folder.rglob("*.h5"):
        with h5py.File(path) as file:
            file.visititems(check)


def test_attributes_are_fixed_length_text_also_beyond_ascii(tmp_path):
    with h5py.File(tmp_path / "x.h5", "w") as file:
        attach(file, plain="m s-1", other="Stör", empty="")
        assert list(file.attrs) == ["other", "plain"]
        for name in file.attrs:
            assert not file.attrs.get_id(name).get_type().is_variable_str()


def test_without_xarray_the_files_come_as_hdf5(run_folder, monkeypatch):
    monkeypatch.setitem(sys.modules, "xarray", None)
    with Run(run_folder).snapshots() as file:
        assert isinstance(file, h5py.File)
    budget = Run(run_folder).diagnostics("energy_budget")
    assert list(budget) == ["pressure_work"]
    budget.file.close()


def test_a_run_that_has_stored_nothing_yet_says_so(tmp_path):
    with trial.open_writer(tmp_path / "run"):
        run = Run(tmp_path / "run")
        with pytest.raises(RequestError, match="holds no snapshots yet"):
            run.snapshots()
        with pytest.raises(RequestError, match="holds no diagnostics yet"):
            run.diagnostics()
        with pytest.raises(RequestError, match=r"holds no verdict\.json: it was not judged yet"):
            run.verdict()
        assert run.series.names == ()


def test_a_verdict_is_written_whole_and_read_back(tmp_path):
    write(tmp_path / "run", count=1)
    write_json(tmp_path / "run" / "verdict.json", {"overall": "holds", "claim": "Störung", "grid": None})
    assert Run(tmp_path / "run").verdict() == {"overall": "holds", "claim": "Störung", "grid": None}
    with pytest.raises(ValueError, match="not JSON compliant"):
        write_json(tmp_path / "run" / "verdict.json", {"overall": math.nan})
    assert Run(tmp_path / "run").verdict()["overall"] == "holds"
