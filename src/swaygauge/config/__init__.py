"""One TOML file per network: where its snapshots are, how they are read, judged, scored and watched.

``place`` answers "which network, which workspace" without heavy imports, for the reading commands;
``settings`` reads and checks everything, for the night.
"""
