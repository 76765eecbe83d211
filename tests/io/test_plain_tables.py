"""Tables as spreadsheets of several countries save them mean the same."""

import pytest

from unitclass.errors import UsageError
from unitclass.io.plain_tables import read_plain_table

ROWS = [["Type", "Word", "seconds"], ["post-I", "früh-E", "1.5"], ["aug-E", "späte E, lang", "2.5"]]


def _saved(path, delimiter, encoding, line_end="\n", decimal="."):
    lines = [delimiter.join(f'"{cell}"' if delimiter in cell else cell for cell in row) for row in ROWS]
    text = line_end.join(lines) + line_end
    path.write_bytes(text.replace("1.5", f"1{decimal}5").replace("2.5", f"2{decimal}5").encode(encoding))
    return str(path)


@pytest.mark.parametrize("line_end", ["\n", "\r\n", "\r"])
@pytest.mark.parametrize("encoding", ["utf-8", "utf-8-sig", "cp1252"])
@pytest.mark.parametrize(("delimiter", "decimal"), [(",", "."), (";", ","), ("\t", ",")])
def test_commas_semicolons_tabs_code_pages_and_line_ends_give_the_same_cells(tmp_path, delimiter, decimal, encoding,
                                                                              line_end):
    path = _saved(tmp_path / "t.csv", delimiter, encoding, line_end, decimal)
    table = read_plain_table(path, ("type", "word"), remedy="")
    assert table.columns == ("type", "word", "seconds")
    assert [row.cells["word"] for row in table.rows] == ["früh-E", "späte E, lang"]
    assert [float(table.point(row.cells["seconds"])) for row in table.rows] == [1.5, 2.5]


def test_a_cell_may_hold_a_line_end_and_empty_lines_count_for_nothing(tmp_path):
    path = tmp_path / "t.csv"
    path.write_text('type,word\n"post\nI",x\n,\n\naug-E,y\n')
    table = read_plain_table(str(path), ("type",), remedy="")
    assert [row.cells["type"] for row in table.rows] == ["post\nI", "aug-E"]
    assert table.rows[1].where.endswith("line 6")


def test_what_is_no_table_is_refused_with_its_name(tmp_path):
    path = tmp_path / "t.csv"
    path.write_bytes(b"PK\x03\x04\x00\x00")
    with pytest.raises(UsageError, match="plain table"):
        read_plain_table(str(path), ("type",), remedy="")
    path.write_text("word\nx\n")
    with pytest.raises(UsageError, match="'type'"):
        read_plain_table(str(path), ("type",), remedy="name it")
