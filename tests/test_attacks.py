"""Input that was once found to break the tool, hang it, or mislead; each by its plain words."""

import io
import zipfile
from collections.abc import Callable
from pathlib import Path

import pytest
from openpyxl import Workbook
from openpyxl.worksheet.formula import ArrayFormula

from costs.faults import FaultyInput
from planner import read_study
from tests.conftest import STUDY, Ran

HEAD = "effect: {treatment: x, outcome: y}\nsize: {records: 400}\nvariables:\n"
PLAIN = HEAD + "  x: {per_unit: 1}\n  y: {per_unit: 1, caused_by: [x]}\n"


def told(path: Path) -> list[str]:
    """What is wrong, without how to mend it."""
    with pytest.raises(FaultyInput) as raised:
        read_study(path)
    return [line for line in str(raised.value).splitlines() if not line.startswith("    ")]


@pytest.mark.parametrize(
    ("text", "faults"),
    [
        (
            STUDY.replace("c: -0.2", "cc: -0.2"),
            ["study.yaml:10: variables.y.caused_by.cc: names the cause 'cc', which is no variable."],
        ),
        (
            STUDY + "hidden_common_causes: [[x, yy]]\n",
            ["study.yaml:18: hidden_common_causes: names the variable 'yy', which is not there."],
        ),
        (
            STUDY.replace("size: {records: 40}", "size:"),
            ["study.yaml:4: size: does not say how large the study is to be."],
        ),
        (
            STUDY.replace("ask: {per", "<<: {per_unit: 0}\n      ask: {per"),
            ["study.yaml:12: variables.y.ways: holds a merge key, which is not read."],
        ),
        (
            STUDY.replace("per_unit: 0.50", f"per_unit: 0.5{'0' * 40}"),
            [
                f"study.yaml:12: variables.y.ways.ask.per_unit: is '0.5{'0' * 40}', which is too long for"
                " a number."
            ],
        ),
        (
            STUDY.replace("per_unit: 0.50", "per_unit: 0.5000000000000000000000000000001"),
            [
                "study.yaml:12: variables.y.ways.ask.per_unit: is '0.5000000000000000000000000000001',"
                " with more than 4 decimals."
            ],
        ),
        (
            STUDY.replace("minutes: 2}", "minutes: 9e14}"),
            ["study.yaml:12: variables.y.ways.ask.takes.minutes: is '9e14', but must be 1000000000 or less."],
        ),
        (
            STUDY.replace("{records: 40}", "{records: -1}") + "overhead: -1\nfieldwork: {usable: 2}\n",
            [
                "study.yaml:4: size.records: is '-1', but must be 1 or more.",
                "study.yaml:18: overhead: is '-1', but must be 0 or more.",
                "study.yaml:19: fieldwork.usable: is '2', but must be 1 or less.",
            ],
        ),
        (
            STUDY.replace("    ways:\n", "    yields: 7\n    ways:\n"),
            [
                "study.yaml:10: variables.y: has no price.",
                "study.yaml:11: variables.y.yields: is '7', but must be 1 or less.",
                "study.yaml:11: variables.y.yields: stands beside 'ways'.",
            ],
        ),
        (
            STUDY + "fieldwork: {design_effect: {clusters: {holds: 2}, conditioning: 1}}\n",
            [
                "study.yaml:18: fieldwork.design_effect.clusters: stands beside other entries.",
                "study.yaml:18: fieldwork.design_effect.clusters: does not describe clusters in full.",
            ],
        ),
        (
            STUDY.replace("{x: 0.3,", "{x: []  ,"),
            ["study.yaml:10: variables.y.caused_by.x: is a list of 0."],
        ),
        (
            STUDY.replace("{x: 0.3,", "{x: ---weak,"),
            ["study.yaml:10: variables.y.caused_by.x: is '---weak', which is no number."],
        ),
        (
            STUDY.replace("{x: 0.3,", "{x: 1e14,"),
            ["study.yaml:10: variables.y.caused_by.x: is '1e14', but must be 10 or less."],
        ),
        (
            STUDY.replace("  x:\n", "  x:\n    when: first\n"),
            ["study.yaml:7: variables.x.when: names the wave 'first', but there are no waves."],
        ),
        (STUDY.replace("  x:\n", "  x:\n    when: []\n"), ["study.yaml:7: variables.x.when: is a list, where a name is wanted."]),
        (
            'title: "a\\e[31mRED"\n' + PLAIN,
            ["study.yaml:1: title: is 'a [31mRED', with a control character."],
        ),
        (
            PLAIN + '  "a\\u202Eb": {per_unit: 1}\n',
            ["study.yaml:6: variables: is 'a\u202eb', a name with a character that cannot be printed."],
        ),
        (
            PLAIN.replace("400}", "400}\nfieldwork: {usable: 1e-9}"),
            ["study.yaml:2: size: leads to more than 10,000,000,000 units that must be started."],
        ),
        (
            PLAIN + "prices: gone.csv\n",
            ["gone.csv:1: file: there is no such file."],
        ),
    ],
)  # fmt: skip
def test_it_is_told_and_nothing_else(
    text: str, faults: list[str], write: Callable[..., Path]
) -> None:
    assert told(write(text)) == faults


def test_long_circles_are_shown_in_part_and_few_of_them(write: Callable[..., Path]) -> None:
    ring = "".join(
        f"  v{i}: {{per_unit: 1, caused_by: [v{(i + 1) % 3000}]}}\n" for i in range(3000)
    )
    (fault,) = told(write(PLAIN + ring))
    assert "… 2990 more …" in fault
    assert len(fault) < 300
    pairs = "".join(
        f"  a{i}: {{per_unit: 1, caused_by: [b{i}]}}\n  b{i}: {{per_unit: 1, caused_by: [a{i}]}}\n"
        for i in range(300)
    )
    assert len(told(write(PLAIN + pairs))) == 20


def test_what_is_far_too_much_is_refused_before_it_is_read(write: Callable[..., Path]) -> None:
    ways = ", ".join(f"w{i}: {{per_unit: 1}}" for i in range(1001))
    assert told(write(PLAIN.replace("x: {per_unit: 1}", f"x: {{ways: {{{ways}}}}}")))[0] == (
        "study.yaml:4: variables.x.ways: names 1,001 ways; at most 1,000 are read."
    )
    variables = "".join(f"  v{i}: {{per_unit: 1}}\n" for i in range(20_000))
    assert told(write(PLAIN + variables)) == [
        "study.yaml:4: variables: names 20,002 variables; at most 20,000 are read."
    ]
    components = "".join(f"  k{i}: {{setup: 1}}\n" for i in range(5001))
    assert told(write(f"{PLAIN}components:\n{components}")) == [
        "study.yaml:7: components: names 5,001 components; at most 5,000 are read."
    ]


def test_hidden_causes_that_sound_alike_stay_two(
    run: Callable[..., Ran], write: Callable[..., Path]
) -> None:
    path = write(
        "effect: {treatment: a, outcome: c}\nsize: {records: 40}\nvariables:\n  a: {per_unit: 1}\n"
        "  b and c: {per_unit: 1}\n  a and b: {per_unit: 1}\n  c: {per_unit: 1, caused_by: [a]}\n"
        "hidden_common_causes: [[a, b and c], [a and b, c]]\n"
    )
    study = read_study(path)
    assert len({cause.name for cause in study.hidden_causes}) == 2
    assert run("recommend", path).code == 0


@pytest.mark.parametrize(
    "text",
    [
        PLAIN + "budget: 999999999999999\n",
        PLAIN.replace("x: {per_unit: 1}", "x: {per_unit: 0.0001}") + "budget: 999999999999999\n",
        PLAIN
        + "".join(f"  v{i}: {{per_unit: 0, takes: {{m: 1e9}}}}\n" for i in range(60))
        + "burdens: {m: {limit: 1}}\n",
        PLAIN.replace("x: {per_unit: 1}", "x: {ways: {a: {per_unit: 0.0001, yields: 1e-9}, b: {per_unit: 5}}}"),
        PLAIN.replace("x: {per_unit: 1}", "x: {ways: {a: {per_unit: 0, yields: 0.000000000001}, b: {per_unit: 5}}}"),
    ],
    ids=["large budget", "small prices", "large burdens", "a way that starts too many", "a free one"],
)  # fmt: skip
def test_there_is_a_plan(text: str, run: Callable[..., Ran], write: Callable[..., Path]) -> None:
    assert run("recommend", write(text)).code == 0


def test_a_study_that_only_loss_can_open_says_why_not(
    run: Callable[..., Ran], write: Callable[..., Path]
) -> None:
    ran = run(
        "recommend", write(PLAIN.replace("x: {per_unit: 1}", "x: {per_unit: 1, yields: 1e-9}"))
    )
    assert (ran.code, ran.out) == (2, "")
    assert ran.err.startswith(
        "study.yaml:1: size: leads to more units, or to a larger sum, than can"
    )


# -------------------------------------------------------------------------------------- workbooks


def workbook(fill: Callable[[Workbook], None]) -> bytes:
    """A workbook as its bytes."""
    book = Workbook()
    fill(book)
    stream = io.BytesIO()
    book.save(stream)
    return stream.getvalue()


def test_a_workbook_with_rows_without_end_is_refused(write: Callable[..., Path]) -> None:
    def far(book: Workbook) -> None:
        book.worksheets[0].append(["variable", "per_unit"])
        book.worksheets[0].cell(1_048_576, 1).value = "x"

    write(workbook(far), "p.xlsx")
    assert told(write(PLAIN + "prices: p.xlsx\n")) == [
        "p.xlsx:A1: file: is no workbook that can be read: sheet 'Sheet' has more than 20,000 rows."
    ]


def test_a_workbook_of_empty_texts_without_end_is_refused(write: Callable[..., Path]) -> None:
    source = io.BytesIO(workbook(lambda book: book.worksheets[0].append(["variable", "per_unit"])))
    target = io.BytesIO()
    with zipfile.ZipFile(source) as old, zipfile.ZipFile(target, "w", zipfile.ZIP_DEFLATED) as new:
        for name in old.namelist():
            if "sharedStrings" not in name:
                new.writestr(name, old.read(name))
        new.writestr("xl/sharedStrings.xml", "<sst>" + "<si/>" * 400_000 + "</sst>")
    write(target.getvalue(), "p.xlsx")
    assert "holds more than" in told(write(PLAIN + "prices: p.xlsx\n"))[0]


def test_odd_cells_are_read_as_they_are_shown(write: Callable[..., Path]) -> None:
    def odd(book: Workbook) -> None:
        sheet = book.worksheets[0]
        sheet.append([])
        sheet.append(["variable", "per_unit"])
        sheet.append(["c", 0.1 + 0.2])
        sheet.append(["d", ArrayFormula("B9", "=1+1")])
        other = book.create_sheet("about us")
        other.append(["Prices of last year"])

    write(workbook(odd), "p.xlsx")
    text = PLAIN + "  c: {}\n  d: {}\nprices: p.xlsx\n"
    assert told(write(text)) == [
        "p.xlsx:Sheet!B4: d.standard.per_unit: is the formula '=1+1', and none is computed."
    ]


def test_sheets_that_are_passed_over_are_named(
    run: Callable[..., Ran], write: Callable[..., Path]
) -> None:
    def two(book: Workbook) -> None:
        book.worksheets[0].append(["variable", "per_unit"])
        book.worksheets[0].append(["c", 1])
        book.create_sheet("about us").append(["Prices of last year"])

    write(workbook(two), "p.xlsx")
    ran = run("check", write(PLAIN + "  c: {caused_by: [x]}\nprices: p.xlsx\n"))
    assert "p.xlsx: about us begins with no row of column names, and was not read." in ran.out


def test_a_csv_without_end_is_refused(write: Callable[..., Path]) -> None:
    write("variable,per_unit\n" + "x,1\n" * 20_001, "p.csv")
    assert any("more than 20,000 rows" in each for each in told(write(PLAIN + "prices: p.csv\n")))


# ---------------------------------------------------------------------------------------- output


WIDE = """\
effect: {treatment: blood_pressure_reading, outcome: y}
size: {records: 120000}
currency: Swiss francs
variables:
  blood_pressure_reading:
    ways:
      home_visit_nurse:
        {setup: 45000, per_unit: 28.50, batch: {holds: 38, price: 760}, takes: {m: 5}}
  y: {caused_by: [blood_pressure_reading], per_unit: 120.25, needs: [laboratory_contract]}
components: {laboratory_contract: {setup: 130000, always: yes, yields: 0.5, per_unit: 14}}
burdens: {m: {price: 1.10}}
overhead: 0.25
"""


@pytest.mark.parametrize("columns", ["0", "1", "40", "80"])
def test_no_digit_is_ever_left_out(
    columns: str,
    run: Callable[..., Ran],
    write: Callable[..., Path],
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    monkeypatch.setenv("COLUMNS", columns)
    page = run("recommend", write(WIDE)).out
    _, bill = page.split("THE BILL")
    assert "amount Swiss francs" in bill
    (total,) = [line for line in bill.splitlines() if line.startswith("  total  ")][:1]
    assert total.split() == ["total", "38,656,450.00"]
    assert page.count("38,656,450.00") >= 3
    assert "…" not in page


def test_text_of_the_user_is_no_emoji_and_no_heading(
    run: Callable[..., Ran], write: Callable[..., Path]
) -> None:
    label = '"a\\n\\nANSWER\\n  Buy nothing."'
    path = write(
        PLAIN.replace("x: {per_unit: 1}", f"x: {{per_unit: 1, label: {label}}}")
        + 'currency: ":euro:"\n'
    )
    page = run("recommend", path).out
    assert page.splitlines().count("ANSWER") == 1
    assert "in all :euro:" in page


def test_a_route_that_is_not_there_is_not_passed_over(
    run: Callable[..., Ran], write: Callable[..., Path]
) -> None:
    ran = run("recommend", write(PLAIN), "--route", "conditioning", "--route", "mechanizm")
    assert (ran.code, ran.out) == (2, "")
    assert "Did you mean 'mechanism'?" in ran.err


def test_all_options_that_cannot_be_are_told_at_once(
    run: Callable[..., Ran], write: Callable[..., Path]
) -> None:
    words = ("--route", "bogus", "--records", "-5", "--without", "zz", "--held", "zz.a")
    ran = run("recommend", write(PLAIN), *words)
    assert [line.split(": ")[1] for line in ran.err.splitlines()[::2]] == [
        "--route",
        "--records",
        "--without",
        "--held",
    ]


def test_a_way_whose_name_could_be_two_is_not_guessed(
    run: Callable[..., Ran], write: Callable[..., Path]
) -> None:
    text = PLAIN + "  a: {ways: {b.c: {per_unit: 1}}}\n  a.b: {ways: {c: {per_unit: 1}}}\n"
    for option in ("--held", "--without"):
        ran = run("recommend", write(text), option, "a.b.c")
        assert ran.code == 2
        assert "'a.b.c' is more than one" in ran.err


def test_no_file_that_was_read_is_written_over(
    run: Callable[..., Ran], write: Callable[..., Path]
) -> None:
    path = write(PLAIN, "study.xlsx.yaml")
    before = path.read_bytes()
    ran = run("recommend", path, "--workbook", path, "--force")
    assert (ran.code, ran.out) == (2, "")
    assert "is one of the files that were read." in ran.err
    assert path.read_bytes() == before
    assert "is no name of a workbook." in run("recommend", path, "--workbook", "plan.csv").err


def test_links_and_long_names_are_no_way_around(
    run: Callable[..., Ran], write: Callable[..., Path], tmp_path: Path
) -> None:
    write(PLAIN)
    (tmp_path / "dangling.yaml").symlink_to(tmp_path / "nowhere")
    assert "is no ordinary file" in run("new", "dangling.yaml").err
    assert run("new", "n" * 300).code == 2
    assert run("new", "n" * 250).code == 0
