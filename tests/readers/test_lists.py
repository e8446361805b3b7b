"""Fetched sources and each node's own importance."""

import gzip
import hashlib

import pytest

from swaygauge.errors import BadRows, MissingColumn, NoLinks, UnreadableFile
from swaygauge.readers.lists import read_names, read_values


def put(tmp_path, content, name="list.txt"):
    path = tmp_path / name
    path.write_bytes(content.encode() if isinstance(content, str) else content)
    return path


def test_names_one_a_line(tmp_path):
    path = put(tmp_path, '# fetched\r\nb.example\r\n a \na,"x"\n\nb.example\n# more\nlast')
    found = read_names(path)
    assert found.names == (" a ", 'a,"x"', "b.example", "last")
    assert found.repeated == 1
    assert found.sha256 == hashlib.sha256(path.read_bytes()).hexdigest()
    assert found.size == path.stat().st_size
    packed = put(tmp_path, gzip.compress(b"\xef\xbb\xbfB.example.\nb.example\n"), "list.txt.gz")
    assert read_names(packed, normalise=True).names == ("b.example",)
    assert read_names(put(tmp_path, "# none tonight\n")).names == ()


def test_bad_names_are_all_named(tmp_path):
    path = put(tmp_path, b"good\ncaf\xe9\n" + b"x" * 3000 + b"\nn\0l\n")
    with pytest.raises(BadRows) as error:
        read_names(path)
    assert [problem.split(":")[0] for problem in error.value.problems] == ["line 2", "line 3", "line 4"]
    assert "Correct these lines" in str(error.value)
    with pytest.raises(NoLinks, match="0 bytes"):
        read_names(put(tmp_path, ""))
    with pytest.raises(UnreadableFile, match="no such file"):
        read_names(tmp_path / "nowhere")


def test_values_by_name(tmp_path):
    path = put(tmp_path, 'name,value\n# core\nregistry.example,5\n"a,b",0.25\n')
    assert read_values(path).values == {"registry.example": 5.0, "a,b": 0.25}
    assert read_values(put(tmp_path, "name,value\nA.example:80,2\n"), normalise=True).values == {"a.example": 2.0}


def test_bad_values_are_all_named(tmp_path):
    path = put(tmp_path, "name,value\na,0\nb,-1\nc,nan\nd,many\n,1\ne,1\ne,2\nf\n")
    with pytest.raises(BadRows) as error:
        read_values(path)
    told = {problem.split(":")[0]: problem for problem in error.value.problems}
    assert set(told) == {f"line {line}" for line in (2, 3, 4, 5, 6, 8, 9)}
    assert told["line 8"].endswith("expected each name once, 'e' already stands on line 7")
    with pytest.raises(MissingColumn, match="first row must be 'name,value'"):
        read_values(put(tmp_path, "a,1\n"))
