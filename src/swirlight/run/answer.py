"""What a finished run says, in a few lines for people."""

import pathlib

from swirlight.errors import InputError
from swirlight.run.response import verdict
from swirlight.store.run import read_json

NAMES = {
    "light_impulse": "light impulse",
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
        lines.append("heating by the end: " + _heating(**heating))
    lines += [f"warning: {text}" for code, text in summary["warnings"] if code == LATE]
    return "\n".join(lines)


def _heating(absorbed_over_heat_capacity, own_temperature=None):
    absorbed = f"{absorbed_over_heat_capacity['value']:.3g} K (absorbed energy over heat capacity)"
    if own_temperature is None:
        return absorbed
    return (f"{own_temperature['value']:+.2f} ± {_number(own_temperature['error'])} K (own"
            f" thermometer, lit less dark), {absorbed}")


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
    spin = response["angular_momentum"]["odd"]
    lines.append("Does the pulse turn these molecules? The turning it delivers (light impulse):"
                 f" {verdict(impulse)}; the turning they have then (angular momentum):"
                 f" {verdict(spin)}.")
    return lines


def _averages(averages):
    return [f"  {name.replace('_', ' '):<17} {f['value']:.5g} ± {_number(f['error'])} {f['unit']}"
            for name, f in averages.items()]


def _p(value):
    if value is None:
        return "p unknown"
    return f"p = {value:.1e}" if value >= 1e-12 else "p < 1e-12"


def _number(value):
    return "unknown" if value is None or value != value else f"{value:.1e}"
