"""What a finished run says, in a few lines for people."""

import pathlib

from swirlight.analysis.statistics import MANY
from swirlight.errors import InputError
from swirlight.results.observables import OBSERVABLES
from swirlight.results.response import CLEAR, HINT
from swirlight.store.run import read_json

DETECTED = "clear detection"
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
        lines.append("heating: " + heating_text(**heating))
    lines += [f"warning: {text}" for code, text in summary["warnings"] if code == LATE]
    return "\n".join(lines)


def heating_text(absorbed_over_heat_capacity, work_over_heat_capacity, own_temperature=None):
    """The heating of a summary in words."""
    parts = [f"{work_over_heat_capacity['value']:+.3g} K (mechanical work of the light over heat"
             " capacity)"]
    if own_temperature is not None:
        parts.append(f"{own_temperature['value']:+.2g} ± {number(own_temperature['error'])} K (the"
                     " bodies' own thermometer, lit less dark)")
    absorbed = absorbed_over_heat_capacity["value"]
    parts.append(f"{absorbed:.3g} K more once the absorbed energy, kept aside, has become heat"
                 if absorbed else "no electronic absorption in this model")
    return "; ".join(parts)


def _response(response):
    return [*table(response), conclusion(response)] if response else []


def table(response):
    """Lines of every signal's odd and even part at the end of the light.

    response : signal -> {"odd", "even": figures}, as in summary.json.
    """
    first = next(iter(response.values()))["odd"]
    lines = [f"at {first['at']['value']:.2f} ps, {first['starts']} starts, along the beam, per"
             " body, ± standard error:"]
    wide = max(len(_label(signal)) for signal in response)
    for part, name in (("odd", "odd in helicity"), ("even", "even")):
        for signal, parts in response.items():
            if part in parts:
                f = parts[part]
                unit = f" {f['unit']}" if f["unit"] else ""
                value = "unknown" if f["value"] is None else f"{f['value']:+.3e}"
                lines.append(
                    f"  {name:<16} {_label(signal):<{wide}} {value} ±"
                    f" {number(f['error'])}{unit.replace('hbar', 'ħ')}"
                    f"  ({_p(f['p'])}): {verdict(f)}"
                )
    return lines


def _label(signal):
    return OBSERVABLES[signal].label


def verdict(figures):
    """What one odd or even part says, in words."""
    starts, p = figures["starts"], figures["p"]
    if starts < 2:
        return "one start only: no error, no statement"
    if figures["value"] == 0.0 and figures["error"] == 0.0:
        return "no response: the twins are identical"
    if p is None or p != p:
        return "not defined"
    if p < CLEAR:
        return DETECTED
    needed = max(starts + 1, figures["starts_needed"])
    more = "" if needed > MANY else f"; if it is this large, some {needed} starts would tell"
    return ("a hint" if p < HINT else "not told from zero") + more


def conclusion(response):
    """Does the pulse turn the molecules? Two sentences from the odd parts of the light's
    impulse and of the angular momentum."""
    impulse, spin = response["light_impulse"]["odd"], response["angular_momentum"]["odd"]
    starts = impulse["starts"]
    if verdict(impulse) != DETECTED:
        head = f"not settled with {starts} start" + "s" * (starts != 1)
        if starts > 1 and impulse["value"] == 0.0 and impulse["error"] == 0.0:
            head = "no, this pulse cannot: the twins are identical"
    elif verdict(spin) != DETECTED:
        head = ("the pulse delivers turning, but at that time it cannot be told from noise in the"
                " molecules' motion")
    else:
        head = "yes, the pulse turns these molecules"
    delivered, left = (f"{f['value']:+.2e} ± {number(f['error'])} ħ" for f in (impulse, spin))
    return (f"Answer: {head}. By {impulse['at']['value']:.2f} ps the light has delivered"
            f" {delivered} a body along the beam, and their motion holds {left} (odd in"
            " helicity, from twins that share their noise; a laboratory has no twins and needs"
            " more repeats).")


def _averages(averages):
    return [f"  {name.replace('_', ' '):<17} {f['value']:.5g} ± {number(f['error'])} {f['unit']}"
            for name, f in averages.items()]


def short_p(value):
    """A p for a column."""
    if value is None or value != value:
        return "unknown"
    return f"{value:.1e}" if value >= 1e-12 else "< 1e-12"


def _p(value):
    if value is None:
        return "p unknown"
    return f"p = {value:.1e}" if value >= 1e-12 else "p < 1e-12"


def number(value):
    """Two digits of an error."""
    return "unknown" if value is None or value != value else f"{value:.2g}"
