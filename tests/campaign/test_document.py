"""The campaign document: every problem at once, each with place, cause and remedy."""

from __future__ import annotations

import pytest

from clockgeo.campaign import campaign_schema, read_document
from clockgeo.errors import CampaignError, DataError

GOOD = """
[campaign]
name = "two sites"
tide_system = "zero_tide"
reference_site = "valley"

[[site]]
id = "valley"
latitude = 47.0
longitude = 11.0
geopotential_number = 5000.0

[[site]]
id = "summit"
latitude = 46.9
longitude = 11.5

[[clock]]
id = "a"
transition = "87Sr"
effect = [{ name = "light", u = 1e-18 }]

[[clock]]
id = "b"
transition = "171Yb"

[[link]]
id = "fibre"

[[session]]
id = "one"
numerator = { clock = "a", site = "summit" }
denominator = { clock = "b", site = "valley" }
links = ["fibre"]
start = 2027-05-01T00:00:00Z
hours = 10

[[session]]
id = "two"
numerator = { clock = "a", site = "valley" }
denominator = { clock = "b", site = "valley" }
start = 2027-05-03T00:00:00
stop = 2027-05-03T12:00:00
"""


def written(tmp_path, text):
    path = tmp_path / "campaign.toml"
    path.write_text(text, encoding="utf-8")
    return path


def problems_of(tmp_path, text):
    with pytest.raises(CampaignError, match="the campaign document has") as caught:
        read_document(written(tmp_path, text))
    return caught.value.problems


def test_a_good_document_is_read(tmp_path):
    campaign = read_document(written(tmp_path, GOOD)).campaign
    assert [site.id for site in campaign.sites] == ["valley", "summit"]
    assert campaign.clock("a").effects[0].u == 1e-18
    assert campaign.sessions[0].planned_seconds == 36_000.0
    assert campaign.sessions[1].start == campaign.sessions[1].start.astimezone()
    assert campaign.sessions[1].planned_seconds == 43_200.0


@pytest.mark.parametrize(
    ("old", "new", "expected"),
    [
        ("latitude = 47.0", "latitude = 95.0", r"[[site]] 'valley', latitude: must be less than"),
        ("longitude = 11.5", "longitud = 11.5", "unknown key; did you mean 'longitude'?"),
        ("u = 1e-18", "u = -1e-18", "[[clock]] 'a', [[effect]] 'light', u: must be greater than"),
        ("u = 1e-18", "u = nan", "u: must be a finite number"),
        ('"zero_tide"', '"zero"', "[campaign], tide_system: must be 'mean_tide', 'zero_tide' or"),
        ('name = "two sites"\n', "", "[campaign], name: missing; it must be given"),
        ('clock = "b", site = "valley" }\nlinks', 'clock = "c", site = "valley" }\nlinks',
         "[[session]] 'one', denominator, clock: no [[clock]] is called 'c'"),
        ('site = "summit"', 'site = "sumit"', "called 'sumit'; did you mean 'summit'?"),
        ('["fibre"]', '["fiber"]', "no [[link]] is called 'fiber'; did you mean 'fibre'?"),
        ('id = "b"', 'id = "a"', "[[clock]] 'a': the id is used 2 times"),
        ("hours = 10", "", "[[session]] 'one': needs a stop or hours"),
        ("hours = 10", "hours = 100", "'two': clock 'a' is at 'valley' while session 'one'"),
        ("stop = 2027-05-03T12", "stop = 2027-05-02T12", "'two': stop 2027-05-02T12:00Z"),
        ("hours = 10", "hours = 10\nuptime = 1.5", "[[session]] 'one', uptime: must be less than"),
        ("geopotential_number = 5000.0", "", "the reference site needs a geopotential_number"),
        ('"171Yb"', '"171Yc"', "[[clock]] 'b': no transition of this name: '171Yc'"),
        ('transition = "171Yb"', "", "[[clock]] 'b': needs a transition"),
        ("[[link]]", "[[links]]", "[links]: unknown key; did you mean 'link'?"),
    ],
)  # fmt: skip
def test_each_problem_is_told_with_place_and_remedy(tmp_path, old, new, expected):
    assert old in GOOD
    found = problems_of(tmp_path, GOOD.replace(old, new, 1))
    assert any(expected in problem for problem in found), found


def test_all_problems_are_told_at_once(tmp_path):
    text = GOOD.replace("47.0", "95.0").replace('["fibre"]', '["fiber"]').replace("1e-18", "-1.0")
    assert len(problems_of(tmp_path, text)) == 3


def test_not_toml_is_told_with_the_line(tmp_path):
    with pytest.raises(DataError, match=r"is not TOML: .*line 1.*campaign\.toml"):
        read_document(written(tmp_path, "[campaign\n"))


def test_a_missing_document_names_its_neighbours(tmp_path):
    written(tmp_path, GOOD)
    with pytest.raises(DataError, match=r"not there: .*other\.toml.*folder: campaign\.toml"):
        read_document(tmp_path / "other.toml")


def test_a_binary_file_is_no_document(tmp_path):
    (tmp_path / "campaign.toml").write_bytes(b"\xff\xfe\x00\x01")
    with pytest.raises(DataError, match=r"is not text in UTF-8: byte 0xff at position 0"):
        read_document(tmp_path / "campaign.toml")


def test_a_folder_is_no_document(tmp_path):
    with pytest.raises(DataError, match=r"is a folder: .*Name the TOML file"):
        read_document(tmp_path)


def test_the_schema_speaks_the_words_of_the_file():
    schema = campaign_schema()
    assert {"campaign", "site", "clock", "link", "session"} <= set(schema["properties"])
    site = schema["$defs"]["Site"]
    assert site["additionalProperties"] is False
    assert "degrees" in site["properties"]["latitude"]["description"]
