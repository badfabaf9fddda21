"""What a frame refuses: every fault at once, in these words."""

from __future__ import annotations

from typing import Any

import pytest

from swmodel.errors import RequestError
from swmodel.frame import FrameSettings, build_frame


def faults_of(**keys: Any) -> list[tuple[str, str]]:
    with pytest.raises(RequestError) as caught:
        build_frame(FrameSettings(**keys), 0.0)
    return [(".".join(map(str, fault.key)), str(fault)) for fault in caught.value.faults]


@pytest.mark.parametrize(
    ("plane", "refused"),
    [
        ("equatorial", {"latitude": 0.1, "f0": 1e-4}),
        ("polar", {"y0": 0.0}),
        ("tank", {"latitude": 0.1, "y0": 0.0, "body": "earth"}),
        ("none", {"latitude": 0.1}),
    ],
)
def test_each_plane_refuses_what_has_no_meaning_on_it_all_at_once(plane: str, refused: dict[str, Any]) -> None:
    good = {"polar": {"latitude": "90 deg"}, "tank": {"rotation_rate": 1.0}}.get(plane, {})
    found = [key for key, _ in faults_of(plane=plane, **good, **refused)]
    assert sorted(found) == sorted(f"frame.{key}" for key in refused)


@pytest.mark.parametrize("plane", ["f", "beta", "sine"])
def test_latitude_and_f_outright_are_never_taken_together(plane: str) -> None:
    outright = {"f0": 1e-4} if plane == "f" else {"f0": 1e-4, "beta": 1e-11}
    found = [key for key, _ in faults_of(plane=plane, latitude="45 deg", **outright)]
    assert found == [f"frame.{key}" for key in outright]
    assert [key for key, _ in faults_of(plane=plane)] == ["frame.latitude"]


@pytest.mark.parametrize(
    ("keys", "messages"),
    [
        (
            {},
            ['frame.latitude: plane = "f" needs a latitude; latitude, or f0 outright, never both; say where'],
        ),
        (
            {"latitude": "95 deg"},
            ["frame.latitude: 95 deg is no latitude; -90 deg to 90 deg; north is positive"],
        ),
        (
            {"plane": "beta", "f0": 1e-4},
            ["frame.beta: beta is missing; latitude, or f0 and beta outright, never both; give beta too"],
        ),
        (
            {"plane": "beta", "beta": 1e-11},
            ["frame.f0: f0 is missing; latitude, or f0 and beta outright, never both; give f0 too"],
        ),
        (
            {"plane": "polar", "latitude": "80 deg"},
            [
                "frame.latitude: 80 deg is not a pole; 90 deg or -90 deg; "
                'off the pole, choose plane = "beta" or "sine"',
            ],
        ),
        (
            {"plane": "tank", "latitude": "45 deg"},
            [
                'frame.latitude: plane = "tank" takes no latitude; a turntable is no planet: its f is 2 rotation_rate '
                "everywhere; leave it out",
                'frame.rotation_rate: a turntable needs its rotation_rate; for example "10 rpm"; clockwise is negative',
            ],
        ),
        (
            {"plane": "tank", "rotation_rate": 0.0},
            ['frame.rotation_rate: the table does not turn; a rate that is not 0; or choose plane = "none"'],
        ),
        (
            {"latitude": "45 deg", "rotation_rate": -1e-4},
            [
                "frame.rotation_rate: -0.0001 rad/s; a rate above 0: north is the pole about which the body turns "
                "anticlockwise; for the other hemisphere give a negative latitude"
            ],
        ),
        (
            {"plane": "beta", "body": "custom", "latitude": "-95 deg"},
            [
                "frame.latitude: -95 deg is no latitude; -90 deg to 90 deg; north is positive",
                'frame.gravity: body = "custom" has no gravity of its own; give gravity outright',
                'frame.rotation_rate: body = "custom" has no rotation_rate of its own; give rotation_rate outright',
                'frame.radius: body = "custom" has no radius of its own; give radius outright',
            ],
        ),
        (
            {"plane": "none", "body": "custom"},
            ['frame.gravity: body = "custom" has no gravity of its own; give gravity outright'],
        ),
    ],
)
def test_a_wrong_frame_gets_these_messages(keys: dict[str, Any], messages: list[str]) -> None:
    assert [text for _, text in faults_of(**keys)] == messages
