"""Invented names: hosts of an archipelago's public web, handles of a chat service. No real person, brand or place."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np

from islands.world import Ids, Trait


def _words(text: str) -> tuple[str, ...]:
    return tuple(text.split())


# Heads and tails of village names; islands have names of their own.
_HEADS = _words(
    """
    brask quelv tum orv skell vand hirr lopp mesk durv fjell grast nurr pelv rusk svall tirr ulv yst zarr bjor
    eskr gamm havv isk jorv kvarn lundr
    """
)
_TAILS = ("olm", "ask", "erri", "imra", "ossa", "unna", "evol", "arn", "ittle", "owen", "ura", "eny")
ISLANDS = ("oldrem", "quessel", "mirrowen", "fenlask", "dovrin", "tammeroy", "velk", "hallisk")
# villages whose names need letters beyond ASCII; written as A-labels in host names
_NORTHERN = ("kværnask", "bjørimra", "tårnossa", "gråsterri", "ülvarn", "smørunna", "våndeny", "ærskolm")

_ADJECTIVES = _words(
    """
    amber blue bright calm copper dappled drift early far flat foggy grey half high hollow idle iron late little
    long low mossy narrow odd old pale plain quiet ragged round rusty salt seven silver slow south tall tarred
    west windy
    """
)
_NOUNS = _words(
    """
    anchor apron barrel beacon bell boathook bollard breaker buoy cairn candle cockle cove crane curlew dinghy
    dune eider fender gannet gate gull hatch heron kelp kettle ladder lantern limpet loaf mast mitten net oar
    otter oven pebble pier plover porthole quay reed rope rudder sail seal shingle skiff slipway spade stile
    tern thrift tide tiller turbine turnstone wharf whelk winch
    """
)

# kind of site: how common, how it links and is linked, how its host is named (v village, i island, a adjective, n noun)
KINDS: dict[str, tuple[Trait, tuple[str, ...]]] = {
    "portal": (Trait(0.002, 60, 24), ("start.{i}", "{i}-online", "isles-{a}{n}")),
    "newspaper": (Trait(0.005, 46, 18), ("{v}-courier", "harbour-sheet.{v}", "{i}-morning", "the-{n}.{i}")),
    "council": (Trait(0.012, 31, 14), ("council.{v}", "{v}-parish", "works.{i}", "records.{i}")),
    "ferry line": (Trait(0.006, 23, 16), ("ferry-{i}", "{a}-{n}-ferries", "{v}-crossings")),
    "harbour": (Trait(0.02, 10, 6), ("harbour.{v}", "{v}-moorings", "pilots.{v}")),
    "library": (Trait(0.015, 17, 5), ("library.{v}", "{v}-reading-room")),
    "school": (Trait(0.04, 9, 3, 0.05), ("school.{v}", "{v}-lower-school", "evening-classes.{v}")),
    "weather station": (Trait(0.02, 5, 4), ("weather.{v}", "{v}-wind", "tidewatch-{v}", "snowline.{i}")),
    "museum": (Trait(0.015, 9, 3), ("museum.{v}", "{n}-museum.{i}", "{v}-boat-hall")),
    "club": (Trait(0.17, 6, 1.1, 0.12), ("{v}-{n}-club", "{a}-{n}-rowers", "chess.{v}", "{a}-{n}-walkers")),
    "choir": (Trait(0.045, 5, 0.8, 0.12), ("choir-{v}", "{a}-{n}-choir", "{v}-fiddlers", "brass.{v}")),
    "shop": (Trait(0.2, 4, 0.8, 0.22), ("{a}-{n}", "{a}{n}-{v}", "{n}-and-{m}", "{v}-stores", "{a}-{n}-books")),
    "bakery": (Trait(0.05, 4, 0.9, 0.2), ("{v}-bakery", "{a}-{n}-bakery", "bread.{v}", "{n}-buns")),
    "guesthouse": (Trait(0.11, 4, 0.8, 0.22), ("{a}-{n}-rooms", "stay-{v}", "{v}-{n}-house", "beds.{a}-{n}")),
    "boatyard": (Trait(0.06, 4, 0.9, 0.15), ("{v}-boatyard", "{a}-{n}-rigging", "{n}-sails", "slip.{v}")),
    "farm": (Trait(0.05, 4, 0.6, 0.2), ("{v}-dairy", "{a}-{n}-farm", "eggs-{v}", "kelpworks-{v}")),
    "journal": (Trait(0.18, 9, 0.6, 0.03), ("{a}{n}", "{a}-{n}-notes", "from-{v}", "{m}.{a}{n}", "letters-{v}")),
}  # fmt: skip
_NAMES_OF_KIND = list(KINDS)
_NEWCOMERS = ("shop", "guesthouse", "journal", "club", "bakery", "farm", "choir", "boatyard")


@dataclass
class Hosts:
    """Names sites of an island, each name once."""

    rng: np.random.Generator
    used: set[str] = field(default_factory=set)

    def __post_init__(self) -> None:
        villages = [head + tail for head in _HEADS for tail in _TAILS]
        order = self.rng.permutation(len(villages))
        self._villages = {
            i: [villages[k] for k in order[i * 14 : i * 14 + 14]] + [_NORTHERN[i]] for i in range(len(ISLANDS))
        }

    def named(self, kinds: Ids, groups: Ids) -> list[str]:
        """A host for each site; ``kinds`` are positions in KINDS, ``groups`` are islands."""
        return [self._host(_NAMES_OF_KIND[kind], int(group)) for kind, group in zip(kinds, groups, strict=True)]

    def newcomers(self, groups: Ids) -> list[str]:
        """Hosts of sites that appear later: shops, guest houses, journals and the like."""
        return [self._host(_NEWCOMERS[self.rng.integers(len(_NEWCOMERS))], int(group)) for group in groups]

    def _one(self, words: tuple[str, ...] | list[str]) -> str:
        return words[int(self.rng.integers(len(words)))]

    def _host(self, kind: str, group: int) -> str:
        villages = self._villages[group % len(ISLANDS)]
        # northern spellings are rare: most of their sites write themselves plainly
        village = villages[-1] if self.rng.random() < 0.01 else self._one(villages[:-1])
        for attempt in range(1, 1000):
            label = self._one(KINDS[kind][1]).format(
                v=village,
                i=ISLANDS[group % len(ISLANDS)],
                a=self._one(_ADJECTIVES),
                n=self._one(_NOUNS),
                m=self._one(_NOUNS),
            )
            # a small world runs out of plain names for some kinds: then the village, then a number is added
            label += f"-{village}" if attempt > 6 and village not in label else ""
            label += f"-{attempt}" if attempt > 12 else ""
            host = (label + ".example").encode("idna").decode("ascii")
            if host not in self.used:
                self.used.add(host)
                return host
        raise RuntimeError(f"no free name left for a {kind} of {ISLANDS[group % len(ISLANDS)]}")


_BIRDS = _words(
    """
    gullwing ternlight eiderdown ploverfoot saltsock kelpmitten driftnote buoyant oarsong tidepool lowlantern
    ropewalk cairnstone whelkshell mistbell foghorn skiffhand netmender lampwick shorecrab stormjar pierlight
    cockleboat windrow saltbread ottertrack reedpipe galewatch limpetgrip sølvfjær tårntang måkevind bølgeøre
    sjöfågel žrak_i_sol 潮の灯 прибой
    """
)


@dataclass
class Handles:
    """Names accounts of the chat service, each handle once; some carry letters beyond ASCII."""

    rng: np.random.Generator
    used: set[str] = field(default_factory=set)

    def accounts(self, groups: Ids) -> list[str]:
        return [self._handle() for _ in groups]

    def _handle(self) -> str:
        while True:
            word = _BIRDS[int(self.rng.integers(len(_BIRDS)))]
            other = _NOUNS[int(self.rng.integers(len(_NOUNS)))]
            number = int(self.rng.integers(1, 100))
            handle = (f"@{word}_{number}", f"@{word}.{other}", f"@{other}_{word}")[int(self.rng.integers(3))]
            if handle not in self.used:
                self.used.add(handle)
                return handle
