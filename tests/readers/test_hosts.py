"""Host names and URLs in one spelling, against RFC 3986 and the examples of idna and UTS 46."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from swaygauge.readers import ReadOptions, read_links
from swaygauge.readers.hosts import normalise_host, remove_dot_segments


@pytest.mark.parametrize(
    ("name", "normal"),
    [
        # RFC 3986 section 6.2.2 and 6.2.2.1
        ("eXAMPLE://a/./b/../b/%63/%7bfoo%7d", "example://a/b/c/%7Bfoo%7D"),
        ("HTTP://www.EXAMPLE.com/", "http://www.example.com/"),
        # RFC 3986 section 6.2.3: four spellings of one
        ("http://example.com", "http://example.com/"),
        ("http://example.com/", "http://example.com/"),
        ("http://example.com:/", "http://example.com/"),
        ("http://example.com:80/", "http://example.com/"),
        # a port that is not the scheme's own stays; user information and query keep their case
        ("http://example.com:443/", "http://example.com:443/"),
        ("https://example.com:443", "https://example.com/"),
        ("FTP://Me@Example.COM:21/A?b=C#D", "ftp://Me@example.com/A?b=C#D"),
        ("http://[2001:DB8::1]:80/", "http://[2001:db8::1]/"),
    ],
)
def test_rfc_3986(name, normal):
    assert normalise_host(name) == normal


@pytest.mark.parametrize(
    ("path", "left"),
    # RFC 3986 section 5.2.4: the two worked examples; the rest are the merged paths of section 5.4
    [
        ("/a/b/c/./../../g", "/a/g"),
        ("mid/content=5/../6", "mid/6"),
        ("/b/c/.", "/b/c/"),
        ("/b/c/..", "/b/"),
        ("/b/c/../g", "/b/g"),
        ("/b/c/../../../g", "/g"),
        ("/../g", "/g"),
        ("/b/c/g.", "/b/c/g."),
        ("/b/c/..g", "/b/c/..g"),
        ("/b/c/./g/.", "/b/c/g/"),
        ("/b/c/g;x=1/../y", "/b/c/y"),
    ],
)
def test_dot_segments(path, left):
    assert remove_dot_segments(path) == left


@pytest.mark.parametrize(
    ("name", "normal"),
    [
        # documentation of the idna package
        ("ドメイン.テスト", "xn--eckwd4c7c.xn--zckzah"),
        ("Königsgäßchen", "xn--knigsgchen-b4a3dun"),
        # UTS 46, table of examples (from memory): mapping, non-transitional
        ("Bloß.de", "xn--blo-7ka.de"),
        ("faß.de", "xn--fa-hia.de"),
        ("日本語。ＪＰ", "xn--wgv71a119e.jp"),
        ("Ü.com", "xn--tda.com"),
        # RFC 3986 section 3.2.2: a registered name may be percent-encoded UTF-8
        ("b%C3%BCcher.example", "xn--bcher-kva.example"),
        ("xn--bcher-kva.example", "xn--bcher-kva.example"),
        ("ex%41mple.com", "example.com"),
        ("Port.Example:8080", "port.example:8080"),
        ("Port.Example:443", "port.example"),
        ("root.example.", "root.example"),
        ("my_Site.example", "my_site.example"),
        ("192.0.2.7", "192.0.2.7"),
    ],
)
def test_bare_hosts(name, normal):
    assert normalise_host(name) == normal


@pytest.mark.parametrize(
    "name",
    ["☕.us", "a b", "", ".", "a..b", "http:///path", "mailto:a@b.example", "Site/Path", "@Ada", "a:b:c", "%zz%00"],
)
def test_what_is_no_host_keeps_its_spelling(name):
    assert normalise_host(name) == name


@settings(max_examples=500, deadline=None)
@given(
    st.text(st.sampled_from("aB.:/?#@%4e1f[]ü☕ -_"), max_size=14), st.sampled_from(["", "http://", "HTTPS://a.B:443"])
)
def test_normalising_twice_changes_nothing_more(rest, start):
    once = normalise_host(start + rest)
    assert normalise_host(once) == once


def test_links_under_normal_names_count_what_merged(tmp_path):
    path = tmp_path / "links.csv"
    path.write_text(
        "source,target\nA.example,b.example\na.example:80,B.EXAMPLE.\na.example,c.example\n", encoding="utf-8"
    )
    raw = read_links(path, ReadOptions(normalise_hosts=True))
    assert raw.names.to_pylist() == ["a.example", "b.example", "c.example"]
    assert raw.origin.names_merged == 3
    np.testing.assert_array_equal(raw.source_code, [0, 0, 0])
    np.testing.assert_array_equal(raw.target_code, [1, 1, 2])
    assert read_links(path, ReadOptions()).origin.names_merged == 0
    assert len(read_links(path, ReadOptions()).names) == 6
