"""Write the demo worlds.

    python demo_data/make_demo.py --out FOLDER

needs numpy only and writes the same bytes every time (the shipped files are its output for ``--out demo_data``).

**ostrel/**: the public web of the invented Ostrel islands, 45 nightly crawls from 2031-03-01 to 2031-04-14.

    links-YYYY-MM-DD.csv.gz       from_site,to_site: from_site links to, so endorses, to_site
    late/links-2031-03-29.csv.gz  the night that arrives late; copy it up one folder to deliver it
    aliases.csv                   old,new,valid_from: the one renamed host
    truth.json                    what was planted, when, by whom, and what it did

The web changes by itself every night (about .25 % of the links come, .15 % go, two or three sites appear, a few small
stories are told) and the crawl is imperfect (.2-1 % of the links flicker, .3 % of the sources are not fetched). On top:

    night  date        what
    16-30  2031-03-17  slow drip: two fresh sites a night begin to endorse one site, for fifteen nights
    18     2031-03-19  news: 25 established sites link one site on one night
    20     2031-03-21  hub drop: a leading site drops its link to a site that few others endorse (noticed a night later)
    22     2031-03-23  rename: a host disappears, a new one takes over its links; aliases.csv keeps its history whole
    24     2031-03-25  missing night: there is no file
    26     2031-03-27  partial crawl: 35 % of the sources were not fetched
    28     2031-03-29  late file: the night's file lies in late/ at first
    32     2031-04-02  dense ring: 23 fresh sites all link to each other and are tied to six leading sites; lambda jumps
    35     2031-04-05  departure: a well-placed site is gone
    38     2031-04-08  capped lists: every list is cut at 60 links
    40     2031-04-10  hub link: a leading site begins to link a little-known one
    44     2031-04-14  fresh farm: 50 sites that did not exist the day before link one site; the last night

**tidemark/**: who follows whom on an invented chat service, 20 nights from 2031-05-05, weighted by interactions.

    follows-YYYY-MM-DD.tsv.gz     follower, followed, interactions (the first night is plain text: follows-....tsv)
    truth.json                    news on 2031-05-21, a fresh farm on the last night, 2031-05-24

How the worlds are made: ``islands/`` beside this file. Names are drawn from word lists; any likeness is chance.
"""

from __future__ import annotations

import argparse
from pathlib import Path
from typing import Any

from islands import ostrel, tidemark
from islands.files import write_json, write_table
from islands.lively import stories_of
from islands.series import Series
from islands.truth import day, truth


def links_of(series: Series, night: int, *, weighted: bool) -> list[tuple[str, ...]]:
    """The rows of one night's file."""
    seen, names, capacity = series.shots[night].observed, series.world.names, series.world.capacity
    ends = [(names[key // capacity], names[key % capacity]) for key in seen.keys]
    if not weighted:
        return list(ends)
    return [(*pair, str(weight)) for pair, weight in zip(ends, seen.weight, strict=True)]


def write_ostrel(folder: Path) -> None:
    """The web of the islands."""
    runner = ostrel.runner()
    series = runner.run(ostrel.NIGHTS)
    shipped = [night for night in range(ostrel.NIGHTS) if night != ostrel.MISSING]
    for night in shipped:
        name = f"links-{day(ostrel.FIRST, night)}.csv.gz"
        path = folder / "late" / name if night == ostrel.LATE else folder / name
        write_table(path, ("from_site", "to_site"), links_of(series, night, weighted=False), separator=",")
    renamed = next(planted for planted in series.planted if planted.event == "rename")
    old, new = (series.world.names[node] for node in renamed.nodes)
    alias = [(old, new, day(ostrel.FIRST, renamed.night))]
    write_table(folder / "aliases.csv", ("old", "new", "valid_from"), alias, separator=",")
    content = truth(
        series,
        network="ostrel",
        first=ostrel.FIRST,
        shipped=shipped,
        faults=_faults(series),
        stories=stories_of(runner.change),
    )
    write_json(folder / "truth.json", content)


def _faults(series: Series) -> list[dict[str, Any]]:
    """Nights that went wrong, with their measured size."""
    faults: list[dict[str, Any]] = [
        {"number": ostrel.MISSING, "fault": "missing night", "expected": "gap"},
        {"number": ostrel.LATE, "fault": "late file", "expected": "gap until delivered"},
    ]
    for night, fault in ostrel.FAULTS.items():
        seen, source = series.shots[night].seen, series.shots[night].keys // series.world.capacity
        sources = len(set(source.tolist()))
        if fault.missing:
            share = round(len(seen.unfetched) / sources, 4)
            faults.append({"number": night, "fault": "partial crawl", "expected": "degraded", "sources_missing": share})
        else:
            faults.append(
                {
                    "number": night,
                    "fault": "capped lists",
                    "expected": "degraded",
                    "cap": fault.cap,
                    "cut": len(seen.cut),
                }
            )
    return sorted(faults, key=lambda entry: entry["number"])


def write_tidemark(folder: Path) -> None:
    """The chat service; its first night is plain text, the others are compressed."""
    runner = tidemark.runner()
    series = runner.run(tidemark.NIGHTS)
    for night in range(tidemark.NIGHTS):
        name = f"follows-{day(tidemark.FIRST, night)}.tsv" + (".gz" if night else "")
        header = ("follower", "followed", "interactions")
        write_table(folder / name, header, links_of(series, night, weighted=True), separator="\t")
    content = truth(
        series,
        network="tidemark",
        first=tidemark.FIRST,
        shipped=range(tidemark.NIGHTS),
        stories=stories_of(runner.change),
    )
    write_json(folder / "truth.json", content)


def main() -> None:
    parser = argparse.ArgumentParser(description="Write the demo worlds ostrel and tidemark.")
    parser.add_argument("--out", type=Path, required=True, help="folder that gets ostrel/ and tidemark/")
    out: Path = parser.parse_args().out
    write_ostrel(out / "ostrel")
    write_tidemark(out / "tidemark")
    size = sum(path.stat().st_size for part in ("ostrel", "tidemark") for path in (out / part).rglob("*.*"))
    print(f"wrote {out / 'ostrel'} and {out / 'tidemark'}: {size / 1e6:.2f} MB")


if __name__ == "__main__":
    main()
