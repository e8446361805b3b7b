"""The invented islands of Ostrel: a network that changes by itself, events planted in it, and a nightly crawl of it.

``world`` holds the network, ``change`` and ``lively`` are two models of how it changes by itself, ``events`` plants
what a monitor should find, ``crawl`` is what a nightly crawl sees of it, ``series`` runs all of them over the nights,
``scoring`` tells what an event did. ``ostrel`` and ``tidemark`` are the two shipped scenarios. Everything is drawn
from seeded generators; the same arguments give the same arrays.
"""
