"""What is done in a run folder, how fast it goes, what is left and what failed.

Reads files only, so it answers while a run is under way and after its driver died.
"""

from swirlight.light.build import pulses_from_config
from swirlight.run.exposures import list_exposures
from swirlight.run.folder import RunFolder
from swirlight.sample import build_system
from swirlight.store.lock import locked
from swirlight.store.run import read_json


def read_status(path):
    """The status of a run folder, as plain values.

    Raises InputError when it is not a run folder.
    """
    folder = RunFolder(path)
    config = folder.config()
    system = build_system(config)
    pulses = pulses_from_config(config.light, system, config.stages[-1])
    names = [e.name for e in list_exposures(config, pulses)]
    unlit = ["equilibrium"] * (len(config.stages) > 1)
    under_way, failed = {}, {}
    for name in unlit + ["continuation"] + names:
        if folder.final(name).is_file():
            continue
        if progress := read_json(folder.working(name) / "progress.json"):
            under_way[name] = progress
        if failure := read_json(folder.failure(name)):
            failed[name] = failure["reason"]
    done = [n for n in names if folder.final(n).is_file()]
    running = locked(folder.root)
    return {
        "folder": str(folder.root),
        "state": "complete" if folder.summary.is_file() and len(done) == len(names)
        else "running" if running else "failed" if failed else "interrupted",
        "equilibrated": not unlit or folder.equilibrium.is_file(),
        "trajectories": len(names), "complete": len(done),
        "under_way": under_way, "failed": failed,
        "seconds_left": _left(config, names, done, under_way) if running else None,
    }


def _left(config, names, done, under_way):
    """Seconds until the trajectories are done at the present rate, or None if none is known."""
    pace = sum(p["rate"] for p in under_way.values())
    if not pace:
        return None
    left = (len(names) - len(done)) * config.stages[-1].steps
    left -= sum(p["step"] for name, p in under_way.items() if name in names)
    return left / pace


def status_text(status):
    """The same for people."""
    lines = [f"{status['folder']}: {status['state']}, {status['complete']} of"
             f" {status['trajectories']} trajectories complete"]
    if status["seconds_left"] is not None:
        lines.append(f"about {status['seconds_left']:.0f} s left")
    for name, p in status["under_way"].items():
        rate = f", {p['rate']:.0f} steps/s" if status["state"] == "running" else ""
        lines.append(f"  {name}: step {p['step']} of {p['steps']}{rate}")
    for name, reason in status["failed"].items():
        lines.append(f"  {name}: failed: {reason}")
    if status["state"] in ("interrupted", "failed"):
        again = "goes on" if status["state"] == "interrupted" else "tries again"
        lines.append(f"`swirlight resume {status['folder']}` {again}")
    return "\n".join(lines)
