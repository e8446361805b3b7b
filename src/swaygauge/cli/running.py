"""Commands that run nights, on demand or on a schedule, and look after the store."""

from __future__ import annotations

from datetime import datetime
from typing import TYPE_CHECKING, Annotated

import typer

from swaygauge.cli.context import (
    DAMAGED,
    FINE,
    HELD,
    REFUSED,
    UNEXPECTED,
    AsJson,
    Network,
    place_of,
    settings_folder,
)
from swaygauge.cli.output import complain, print_json, say
from swaygauge.config.place import Place, find_file
from swaygauge.errors import ConfigError
from swaygauge.visible import visible

if TYPE_CHECKING:
    from swaygauge.night import Outcome

DAY = ["%Y-%m-%d"]
Day = datetime | None


def tell(outcome: Outcome) -> None:
    when = outcome.night or "file"
    say(f"  {when}  {outcome.outcome:<9} {visible(outcome.detail, limit=None)}  ({outcome.seconds:.1f} s)")


def say_if_compiling() -> None:
    """A first night on a machine compiles the loops; say so rather than look stuck."""
    from importlib import import_module

    import_module("swaygauge.scores.spectrum")  # defines the loops that a night uses
    if import_module("swaygauge.kernels.compiled").first_use():
        complain("compiling the loops, once on this machine (about 20 s of work) ...")


def _exit_code(outcomes: list[Outcome]) -> int:
    ended = {outcome.outcome for outcome in outcomes}
    for names, code in (({"failed"}, UNEXPECTED), ({"refused", "unclear"}, REFUSED), ({"held"}, HELD)):
        if ended & names:
            return code
    return FINE


def _finish(outcomes: list[Outcome], network: str, as_json: bool) -> None:
    if as_json:
        from dataclasses import asdict

        print_json([asdict(outcome) for outcome in outcomes])
    elif not outcomes:
        say("nothing is due: every dated snapshot is stored as it would be now.")
    else:
        say(f"next: swaygauge brief {network}")
    code = _exit_code(outcomes)
    if code:
        raise typer.Exit(code)


def night(
    network: Network,
    on: Annotated[
        Day, typer.Option("--night", formats=DAY, help="Start with this night instead of the first due.")
    ] = None,
    accept_anyway: Annotated[bool, typer.Option(help="Release the held night of --night and score it.")] = False,
    reason: Annotated[str, typer.Option(help="Why it may be accepted; kept with the night.")] = "",
    as_json: AsJson = False,
) -> None:
    """Run every night that is due, in date order: new, late or replaced files, and what rests on them."""
    place = place_of(network)
    day = on.date() if on else None
    if accept_anyway:
        _accept(place, on, reason)
    from swaygauge.flows.prepare import prepare

    prepare(place.workspace)
    say_if_compiling()
    from swaygauge.flows.start import run_nightly

    _finish(run_nightly(place.file, day, None if as_json else tell), place.network, as_json)


def _accept(place: Place, on: Day, reason: str) -> None:
    if on is None or not reason.strip():
        missing = "--night DATE" if on is None else "--reason TEXT"
        raise typer.BadParameter(
            f"--accept-anyway needs {missing}: say which held night, and why", param_hint="--accept-anyway"
        )
    import getpass

    from swaygauge.night import work_for

    work = work_for(place.file)
    row = work.store.night_row(place.network, on.date())
    if row is None or row.state != "held":
        state = "is not stored" if row is None else f"is {row.state}"
        raise typer.BadParameter(
            f"the night of {on.date()} {state}; only a held night can be accepted", param_hint="--night"
        )
    work.store.accept(place.network, on.date(), reason=reason.strip(), who=getpass.getuser())


def backfill(
    network: Network,
    start: Annotated[Day, typer.Option("--from", formats=DAY, help="First night; default: the first there is.")] = None,
    end: Annotated[Day, typer.Option("--to", formats=DAY, help="Last night; default: the last there is.")] = None,
    again: Annotated[
        bool, typer.Option(help="Also nights that are stored already; they are replaced exactly.")
    ] = False,
    as_json: AsJson = False,
) -> None:
    """Replay historical nights in date order. Stopped half-way, the same command goes on where it was."""
    place = place_of(network)
    from swaygauge.flows.prepare import prepare

    prepare(place.workspace)
    say_if_compiling()
    from swaygauge.flows.start import run_backfill

    outcomes = run_backfill(
        place.file,
        start.date() if start else None,
        end.date() if end else None,
        again=again,
        tell=None if as_json else tell,
    )
    _finish(outcomes, place.network, as_json)


def schedule(network: Network) -> None:
    """Stay running and start the night by the network's cron line. End it with Ctrl-C."""
    place = place_of(network)
    from swaygauge.flows.prepare import prepare

    prepare(place.workspace)
    from swaygauge.flows.serving import serve_network

    serve_network(place.file, say)


def checkup(network: Network, as_json: AsJson = False) -> None:
    """Verify the store: every part against the catalog's hash, the chain of nights, the name table."""
    place = place_of(network)
    from swaygauge.store import Store
    from swaygauge.store.checkup import checkup as check_store

    with Store.open(place.workspace, url=place.catalog or None) as store:
        findings = check_store(store, place.network)
        nights = len(store.nights(place.network))
    if as_json:
        from dataclasses import asdict

        print_json([asdict(finding) for finding in findings])
    else:
        for finding in findings:
            say(f"  {finding.level:<8} {finding.night or ''}  {finding.what}  {finding.todo}".rstrip())
        damaged = sum(finding.level == "damaged" for finding in findings)
        say(f"{place.network}: {nights} nights checked, {damaged} damaged part(s), {len(findings)} finding(s) in all.")
    if any(finding.level == "damaged" for finding in findings):
        raise typer.Exit(DAMAGED)


def config_check(network: Network, as_json: AsJson = False) -> None:
    """Read a network's settings and name every mistake at once."""
    file = find_file(network, settings_folder())
    from swaygauge.config.settings import load_settings

    try:
        load_settings(file)
    except ConfigError as error:
        if as_json:
            print_json({"file": str(file), "problems": list(error.problems)})
            raise typer.Exit(2) from None
        raise
    if as_json:
        print_json({"file": str(file), "problems": []})
    else:
        say(f"{file}: every setting is in order.")
