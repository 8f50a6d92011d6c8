"""What `swirlight response` prints."""

from swirlight.analysis.statistics import MANY
from swirlight.results.observables import OBSERVABLES
from swirlight.run.answer import conclusion, heating_text, number, short_p

_HEAD = ("  {:<34} {:<34} {:>8} {:>9} {:>10} {:>7}")


def response_text(content):
    """The answer, the tables and the notes, of `results.overview`."""
    lines = [content["title"], conclusion(content["response"]), ""]
    for part, title in (("odd", "odd in helicity"), ("even", "even")):
        lines += _table(content["response"], part, title)
    lines += [
        "p: Student's t at that time; p peak: largest |t| at any time from the beginning of the"
        f" light on, with sign flips over starts (not below {_smallest(content):.2g}); p mean: of"
        " the mean over those times.",
        f"starts: that reach p < {content['level']:g} at that time in nine of ten repeats, if mean"
        " and scatter are those seen. Of twenty such p one is below 0.05 by chance.",
        "", _pairing(content["pairing"]), *map(_delivered, *_items(content["delivered"]))]
    if content["heating"]:
        lines.append("heating: " + heating_text(**content["heating"]))
    if content["control"]:
        lines.append(_control(content["control"]))
    peaks = content["drawn"]["peak"]
    lines += [_peak(content["drawn"], part, peak) for part, peak in peaks.items()
              if peak["interval"][0] == peak["interval"][0]]
    return "\n".join(lines + [f"note: {note}" for note in content["notes"]])


def _items(found):
    return found.keys(), found.values()


def _unit(text):
    return text.replace("hbar", "ħ").replace("nm2", "nm²").replace("m-2", "m⁻²").replace(
        "mol-1", "mol⁻¹")


def _table(response, part, title):
    rows = {name: parts[part] for name, parts in response.items() if part in parts}
    if not rows:
        return []
    at = next(iter(rows.values()))["at"]["value"]
    lines = [f"{title}, along the beam, ± standard error",
             _HEAD.format("", f"at {at:.2f} ps", "p", "p peak", "p mean", "starts")]
    for name, f in rows.items():
        value = f"{f['value']:+.3e} ± {number(f['error'])} {_unit(f['unit'])}"
        if f["value"] == f["error"] == f["integrated"]["error"] == 0.0:
            value = "none: the same to the last bit"
        needed = f["starts_needed"]
        lines.append(_HEAD.format(
            OBSERVABLES[name].label, value, short_p(f["p"]), short_p(f["peak"]["p"]),
            short_p(f["integrated"]["p"]), f"> {MANY}" if needed > MANY else needed))
    return [*lines, ""]


def _smallest(content):
    return content["response"]["light_impulse"]["odd"]["peak"]["smallest_p"]


def _pairing(pairing):
    parted = pairing["parted"]
    if not pairing["gain"] < float("inf"):
        return f"pairing: at {pairing['at']:.2f} ps the twins do not differ from start to start."
    text = (f"pairing: at {pairing['at']:.2f} ps twins of opposite helicity cut the variance of"
            f" their difference of angular momentum {number(pairing['gain'])} times;")
    text += (" they have not parted by the end" if parted is None else
             f" they have parted at {parted:.2f} ps (below 2 times)")
    if pairing["phase_gain"] is not None:
        text += (f"; the mean over {pairing['phases']} carrier phases cuts that of one"
                 f" {number(pairing['phase_gain'])} times")
    return (f"{text}. While twins are close, starts needed do not depend on the intensity I; once"
            " they have parted they grow as 1/I².")


def _delivered(name, f):
    return (f"{name.replace('_', ' ')}: {f['value']:+.4g} ± {number(f['error'])}"
            f" {_unit(f['unit'])}{_interval(f['interval'])}, {f['of']}")


def _interval(interval):
    low, high = interval
    return f" (95 %: {low:.4g} to {high:.4g})" if low == low else ""


def _control(control):
    parts = [f"{OBSERVABLES[name].label} {f['value']:+.2g} ± {number(f['error'])} {f['unit']}"
             f" (p {short_p(f['p'])})" for name, f in control.items()]
    return "control, zero by symmetry in an isotropic liquid: odd part of " + ", of ".join(parts)


def _peak(drawn, part, peak):
    return (f"peak of the {part} part of {OBSERVABLES[drawn['observable']].label}:"
            f" {peak['value']:+.3e} ± {number(peak['error'])} {_unit(drawn['unit'])}"
            f"{_interval(peak['interval'])} at {peak['time']:.2f} ps")
