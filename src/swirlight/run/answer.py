"""What a finished run says, in a few lines for people."""

import pathlib

from swirlight.errors import InputError
from swirlight.run.response import DETECTED, verdict
from swirlight.store.run import read_json

NAMES = {
    "light_impulse": "angular impulse",
    "angular_momentum": "angular momentum",
    "alignment": "alignment ⟨P2⟩",
}
LATE = "spacing-too-short"  # the warning that is only known after the run


def answer(folder):
    """Where the results are and what they say.

    folder : of a finished run. Raises InputError when it has no summary.
    """
    folder = pathlib.Path(folder)
    summary = read_json(folder / "summary.json")
    if summary is None:
        raise InputError(f"{folder}: has no summary.json yet; `swirlight status {folder}`")
    lines = [f"{summary['title']}", f"results in {folder}/"]
    if (folder / "response.png").is_file():
        lines.append(f"picture    {folder / 'response.png'}")
    lines += _response(summary["response"]) or _averages(summary["averages"])
    heating = summary["heating"]
    if heating:
        lines.append("heating: " + _heating(**heating))
    lines += [f"warning: {text}" for code, text in summary["warnings"] if code == LATE]
    return "\n".join(lines)


def _heating(absorbed_over_heat_capacity, work_over_heat_capacity, own_temperature=None):
    parts = [f"{work_over_heat_capacity['value']:+.3g} K (mechanical work of the light over heat"
             " capacity)"]
    if own_temperature is not None:
        parts.append(f"{own_temperature['value']:+.2g} ± {_number(own_temperature['error'])} K (the"
                     " bodies' own thermometer, lit less dark)")
    absorbed = absorbed_over_heat_capacity["value"]
    parts.append(f"{absorbed:.3g} K more once the absorbed energy, kept aside, has become heat"
                 if absorbed else "no electronic absorption in this model")
    return "; ".join(parts)


def _response(response):
    if not response:
        return []
    impulse = response["light_impulse"]["odd"]
    lines = [f"at {impulse['at']['value']:.2f} ps (end of the light), {impulse['starts']} starts,"
             " along the beam, per body, ± standard error:"]
    for part, name in (("odd", "odd in helicity"), ("even", "even")):
        for signal, parts in response.items():
            if part in parts:
                f = parts[part]
                unit = f" {f['unit']}" if f["unit"] else ""
                lines.append(
                    f"  {name:<16} {NAMES[signal]:<17} {f['value']:+.3e} ±"
                    f" {_number(f['error'])}{unit.replace('hbar', 'ħ')}"
                    f"  ({_p(f['p'])}): {verdict(f)}"
                )
    return [*lines, _conclusion(impulse, response["angular_momentum"]["odd"])]


def _conclusion(impulse, spin):
    """Does the pulse turn the molecules? One sentence from two odd parts."""
    starts = impulse["starts"]
    if verdict(impulse) != DETECTED:
        head = f"not settled with {starts} start" + "s" * (starts != 1)
    elif verdict(spin) != DETECTED:
        head = ("the pulse delivers turning, but at that time it cannot be told from noise in the"
                " molecules' motion")
    else:
        head = "yes, the pulse turns these molecules"
    delivered, left = (f"{f['value']:+.2e} ± {_number(f['error'])} ħ" for f in (impulse, spin))
    return (f"Answer: {head}. By then the light has delivered {delivered} a body along the beam,"
            f" and {left} of it is in their motion (odd in helicity, from twins that share their"
            " noise; a laboratory has no twins and needs more repeats).")


def _averages(averages):
    return [f"  {name.replace('_', ' '):<17} {f['value']:.5g} ± {_number(f['error'])} {f['unit']}"
            for name, f in averages.items()]


def _p(value):
    if value is None:
        return "p unknown"
    return f"p = {value:.1e}" if value >= 1e-12 else "p < 1e-12"


def _number(value):
    return "unknown" if value is None or value != value else f"{value:.2g}"
