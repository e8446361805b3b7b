"""The night on a schedule: Prefect flows around ``swaygauge.night``. The only modules that import prefect.

Prefect passes dates and names between stages, never arrays; what a stage makes lies in the store. Truth is the store's
catalog, not Prefect's database, which may be thrown away at any time.
"""
