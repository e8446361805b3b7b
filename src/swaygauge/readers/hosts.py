"""Host names and URLs in one spelling: RFC 3986 section 6.2 (syntax and scheme), IDNA A-labels (UTS 46). Opt-in.

What is no host name or URL with a host keeps its spelling.
"""

from __future__ import annotations

import dataclasses
import re
import string

import idna

from swaygauge.readers.raw import RawLinks, renamed

# RFC 3986 appendix B, for references with an authority; names without "//" are hosts, with a port perhaps
_URL = re.compile(
    r"(?P<scheme>[A-Za-z][A-Za-z0-9+.-]*)://(?P<authority>[^/?#]*)(?P<path>[^?#]*)(?P<tail>.*)", re.DOTALL
)
_AUTHORITY = re.compile(r"(?:(?P<user>[^@]*)@)?(?P<host>\[[0-9A-Fa-fvV:.]+\]|[^:@\[\]]+)(?::(?P<port>[0-9]*))?")
_BARE = re.compile(r"(?P<host>\[[0-9A-Fa-fvV:.]+\]|[^\s:@/?#\[\]]+)(?::(?P<port>[0-9]*))?")
_SETTLED = re.compile(r"(?!xn--)[a-z0-9_-]+(?:\.(?!xn--)[a-z0-9_-]+)*")  # nothing to do, as for most names
_ASCII_HOST = re.compile(r"[A-Za-z0-9._~!$&'()*+,;=%-]+")  # RFC 3986 section 3.2.2 reg-name
_ENCODED = re.compile("(?:%[0-9A-Fa-f]{2})+")
_OCTET = re.compile("%([0-9A-Fa-f]{2})")
_UNRESERVED = frozenset(string.ascii_letters + string.digits + "-._~")

PORTS = {"http": "80", "https": "443", "ws": "80", "wss": "443", "ftp": "21"}  # RFC 9110, 6455, 1738


def normalise_host(name: str) -> str:
    """One host or URL in its normal spelling.

    Case of scheme and host; percent-encoding (upper-case digits, unreserved characters plain); dot segments; the
    scheme's default port and an empty port; an empty path of http and https becomes "/"; the root's trailing dot;
    international labels as A-labels. A bare host loses port 80 and 443 alike. A host that IDNA refuses keeps its
    spelling.

    >>> normalise_host("WWW.Brevik-Ferries.Example.:443")
    'www.brevik-ferries.example'
    >>> normalise_host("HTTP://Brevik.Example:80")
    'http://brevik.example/'
    """
    if _SETTLED.fullmatch(name):
        return name
    url = _URL.fullmatch(name)
    if url is None:
        bare = _BARE.fullmatch(name)
        host = None if bare is None else _host(bare["host"])
        if bare is None or host is None:
            return name
        return host if bare["port"] in (None, "", "80", "443") else f"{host}:{bare['port']}"
    scheme = url["scheme"].lower()
    parts = _AUTHORITY.fullmatch(url["authority"])
    host = None if parts is None else _host(parts["host"])
    if parts is None or host is None:
        return name
    user = "" if parts["user"] is None else _octets(parts["user"]) + "@"
    port = "" if parts["port"] in (None, "", PORTS.get(scheme)) else f":{parts['port']}"
    path = remove_dot_segments(_octets(url["path"]))
    if not path and scheme in ("http", "https"):
        path = "/"
    return f"{scheme}://{user}{host}{port}{path}{_octets(url['tail'])}"


def _host(host: str) -> str | None:
    """The normal spelling of a host, or None when it is none."""
    if host.startswith("["):
        return host.lower()
    host = _ENCODED.sub(_decoded, host)
    if host.isascii():
        if not _ASCII_HOST.fullmatch(host):
            return None
        host = _OCTET.sub(lambda hit: hit[0].upper(), host.lower())
    else:
        try:
            host = idna.encode(host, uts46=True).decode("ascii")
        except UnicodeError:  # idna's own errors are UnicodeErrors
            return None
    host = host.removesuffix(".")
    return None if "" in host.split(".") else host


def _decoded(run: re.Match[str]) -> str:
    """Percent-encoded UTF-8 as characters (RFC 3986 section 3.2.2), unless reserved characters are among them."""
    try:
        text = bytes.fromhex(run[0].replace("%", "")).decode("utf-8")
    except UnicodeDecodeError:
        return run[0]
    return run[0] if any(char.isascii() and char not in _UNRESERVED for char in text) else text


def _octets(text: str) -> str:
    """RFC 3986 sections 6.2.2.1 and 6.2.2.2."""

    def one(hit: re.Match[str]) -> str:
        char = chr(int(hit[1], 16))
        return char if char in _UNRESERVED else hit[0].upper()

    return _OCTET.sub(one, text)


def remove_dot_segments(path: str) -> str:
    """RFC 3986 section 5.2.4.

    >>> remove_dot_segments("/a/b/c/./../../g")
    '/a/g'
    """
    done: list[str] = []
    while path:
        if path.startswith(("../", "./")):
            path = path[path.index("/") + 1 :]
        elif path.startswith("/./") or path == "/.":
            path = "/" + path[3:]
        elif path.startswith("/../") or path == "/..":
            path = "/" + path[4:]
            if done:
                done.pop()
        elif path in (".", ".."):
            path = ""
        else:
            end = path.find("/", 1)
            end = len(path) if end < 0 else end
            done.append(path[:end])
            path = path[end:]
    return "".join(done)


def normalise_hosts(raw: RawLinks) -> RawLinks:
    """The same links under normal host names; ``origin.names_merged`` counts the names that fell together."""
    after = renamed(raw, [normalise_host(name) for name in raw.names.to_pylist()])
    merged = len(raw.names) - len(after.names)
    return dataclasses.replace(after, origin=dataclasses.replace(after.origin, names_merged=merged))
