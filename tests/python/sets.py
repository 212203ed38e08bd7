# SPDX-License-Identifier: GPL-3.0-or-later
"""`halfplane sets`: the listing, single sets, and that what it prints can be read back."""

import json

from command import document, halfplane


def test_every_listed_name_can_be_inspected():
    listing = document("sets")
    names = [entry["name"] for entry in listing]
    assert {name.split(":")[0] for name in names} == {"psk", "qam", "cross", "hex", "star", "apsk", "std"}
    assert sum(name.startswith("std:") for name in names) >= 4
    assert all(set(entry) == {"name", "about", "source"} for entry in listing)
    # A published set names document and clause.
    assert all("§" in entry["source"] for entry in listing if entry["name"].startswith("std:"))
    table = halfplane("sets").stdout
    for name in names:
        assert document("inspect", name)["size"] >= 2
        assert f"\n{name} " in table


def test_a_set_reads_back_to_the_same_bits(tmp_path):
    text = halfplane("sets", "std:302307-1/16apsk/3-4", "--json").stdout
    path = tmp_path / "again.json"
    path.write_text(text)
    assert json.loads(text)["points"][0].keys() == {"label", "i", "q"}
    assert halfplane("sets", path, "--json").stdout == text


def test_priors_are_shown_where_they_differ(tmp_path):
    path = tmp_path / "uneven.csv"
    path.write_text("label,i,q,p\n0,-1,0,0.25\n1,1,0,0.75\n")
    lines = halfplane("sets", path).stdout.splitlines()
    assert lines[1].split() == ["index", "label", "i", "q", "p"]
    assert lines[3].split() == ["0", "0", "-1.000000", "0.000000", "0.250000"]
