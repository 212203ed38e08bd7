# SPDX-License-Identifier: GPL-3.0-or-later
"""Bad usage and bad input: exit code 2, one line on stderr that names what and where, nothing on stdout."""

import json

import pytest
from command import FIRN, halfplane, refused

def write_json(path, points, **more):
    path.write_text(json.dumps({"name": "x", "points": points, **more}))
    return path


def point(label, i, q, **more):
    return {"label": label, "i": i, "q": q, **more}


@pytest.mark.parametrize(
    ("arguments", "says"),
    [
        (["curvy"], "curvy"),
        (["curve"], "SET"),
        (["curve", FIRN], "--es-n0 or --eb-n0"),
        (["curve", FIRN, "--es-n0", "1", "--eb-n0", "1"], "--es-n0 or --eb-n0"),
        (["curve", FIRN, "--es-n0", "0..10"], "0..10"),
        (["curve", FIRN, "--es-n0", "nan"], "nan"),
        (["curve", FIRN, "--es-n0", "1", "--law", "sunshine"], "sunshine"),
        (["curve", FIRN, "--es-n0", "1", "--detector", "best"], "best"),
        (["curve", FIRN, "--es-n0", "1", "--plot", "x.gif"], ".svg"),
        (["curve", FIRN, "--es-n0", "1", "--plot", "no/such/folder/x.svg"], "folder"),
        (["curve", FIRN, "--es-n0", "1", "--csv", "no/such/folder/x.csv"], "no/such/folder"),
        (["curve", "psk:7.5", "--es-n0", "1"], "psk"),
        (["curve", "qam:17", "--es-n0", "1"], "17"),
        (["curve", "no-such-file.json", "--es-n0", "1"], "no-such-file.json"),
        (["inspect", FIRN, "--tolerance", "0.5"], "0.5"),
        (["inspect", FIRN, "--tolerance", "x"], "x"),
        (["sets", "std:38.211/17qam"], "17qam"),
    ],
)
def test_usage(arguments, says, tmp_path):
    assert says in refused(*arguments, cwd=tmp_path)
    assert list(tmp_path.iterdir()) == []


SET_FILES = [
    ([point("0", 1, 0)], ["at least 2 points", "got 1"]),
    ([point("00", 1, 0), point("01", -1, 0), point("10", 1, 0)], ["point 2", "(1, 0)", "point 0"]),
    ([point("00", 1, 0), point("00", -1, 0)], ["point 1", '"00"', "already the label of point 0"]),
    ([point("00", 1, 0), point("1", -1, 0)], ["point 1", "one length", '"1"']),
    ([point("", 1, 0), point("1", -1, 0)], ["point 0", '"label"', '""']),
    ([point("0a", 1, 0), point("01", -1, 0)], ["point 0", '"label"', '"0a"']),
    ([point("0" * 13, 1, 0), point("1" * 13, -1, 0)], ["point 0", "1 to 12 characters", "0" * 13]),
    ([point("0", 1, 0, p=-0.5), point("1", -1, 0, p=1.5)], ["point 0", '"p"', "got -0.5"]),
    ([point("0", 1, 0, p=0), point("1", -1, 0, p=1)], ["point 0", '"p"', "got 0"]),
    ([point("0", 1, 0, p=0.4), point("1", -1, 0, p=0.4)], ["sum to 1 within 1e-06", "0.8"]),
    ([point("0", 1, 0, p=0.5), point("1", -1, 0)], ["point 1", '"p"', "point 0 has one"]),
    ([point("0", "1", 0), point("1", -1, 0)], ["point 0", '"i"', "a number"]),
    ([point("0", 1, 0, phase=3), point("1", -1, 0)], ["point 0", "unknown field", '"phase"']),
    ([{"label": "0", "i": 1}, point("1", -1, 0)], ["point 0", '"q" is missing']),
]


@pytest.mark.parametrize(("points", "says"), SET_FILES)
def test_set_file(points, says, tmp_path):
    path = write_json(tmp_path / "bad.json", points)
    text = refused("inspect", path)
    assert "bad.json" in text
    for word in says:
        assert word in text.replace(str(path), ""), text


def test_unknown_field_of_a_set_file(tmp_path):
    path = write_json(tmp_path / "bad.json", [point("0", 1, 0), point("1", -1, 0)], colour="blue")
    assert "colour" in refused("inspect", path)


@pytest.mark.parametrize("number", ["NaN", "Infinity", "1e999"])
def test_numbers_that_are_none(number, tmp_path):
    path = tmp_path / "bad.json"
    path.write_text('{"points": [{"label": "0", "i": %s, "q": 0}, {"label": "1", "i": 1, "q": 0}]}' % number)
    assert "bad.json" in refused("inspect", path)
    path = tmp_path / "bad.csv"
    path.write_text(f"label,i,q\n0,{number.lower()},0\n1,1,0\n")
    assert "bad.csv" in refused("inspect", path)


def test_csv_names_the_line(tmp_path):
    path = tmp_path / "bad.csv"
    path.write_text("label,i,q\n0,1,0\n1,one,0\n")
    text = refused("inspect", path)
    assert "3" in text.replace(str(path), "") and "one" in text


def test_broken_json_and_empty_files(tmp_path):
    for name, content in (("half.json", '{"points": ['), ("empty.json", ""), ("empty.csv", ""), ("bytes.json", "\x00\x01")):
        path = tmp_path / name
        path.write_text(content)
        assert name in refused("inspect", path)


def test_a_folder_is_no_set_file(tmp_path):
    assert tmp_path.name in refused("inspect", tmp_path)


def test_help_is_no_error():
    for arguments in (["--help"], ["curve", "--help"], ["inspect", "-h"], ["sets", "--help"], ["--version"]):
        done = halfplane(*arguments)
        assert done.returncode == 0 and done.stdout and not done.stderr
