"""Part of `check` about what a run will cost: memory, disk, time."""

import math
import os
import pathlib
import shutil

from swirlight.run.plan.page import Notice, Row, Section
from swirlight.run.rates import expected_rate, workload

# Numbers that a frame holds for each body (position brings `image`, int32), and for the box.
COMPONENTS = {"orientation": 4, "axes": 9}
TOTALS_DARK, TOTALS_LIT = 33, 47
START_NUMBERS = 13  # per body and start file: position, orientation, velocity, angular momentum
MEBIBYTE = 2.0**20

# Memory of a process, measured: the interpreter with everything loaded, and per-part sizes.
PROCESS_BYTES = 290e6
BODY_BYTES, SITE_BYTES, CHARGE_BYTES = 650.0, 90.0, 330.0  # the last where there is a mesh
LIST_SKIN, LIST_SHARE = 0.07, 1.1  # nm beyond the cut-off; room over entries of the list
MESH_SPACING = 0.09  # nm, where it is chosen automatically
MESH_POINT_BYTES = {"mixed": 16.0, "double": 32.0}  # kept, and needed in passing
SEGMENT_BYTES = 64e6  # frames of a segment, twice while it is sealed


def cost(subject):
    """Memory, disk and time, with where the rate comes from."""
    disk = disk_bytes(subject)
    total = disk["trajectory"] * len(subject.exposures) + disk["preparation"]
    cores = core_count()
    side = min(cores, len(subject.exposures))
    memory = memory_bytes(subject)
    rows = [
        Row("memory of one process", memory / MEBIBYTE, "MiB", "estimate"),
        Row("processes side by side", side, "", "one single-threaded worker per core"),
        Row("disk per trajectory", disk["trajectory"] / MEBIBYTE, "MiB"),
        Row("disk for preparation", disk["preparation"] / MEBIBYTE, "MiB",
            "equilibrium, continuation and start files"),
        Row("disk in all", total / MEBIBYTE, "MiB", "more while segments are put together"),
    ]
    rows += _time(subject, cores, side)
    yield Section("cost", tuple(rows))
    free = free_bytes(subject.config.output)
    if free is not None and total > free:
        yield Notice("disk-space", f"output: the run leaves {total / MEBIBYTE:.4g} MiB, and"
                     f" {free / MEBIBYTE:.4g} MiB are free there")
    installed = installed_bytes()
    if installed is not None and memory * side > installed:
        yield Notice("memory", f"{side} processes of {memory / MEBIBYTE:.4g} MiB, and this machine"
                     f" has {installed / MEBIBYTE:.4g} MiB; --threads bounds them")


def _time(subject, cores, side):
    """Rows of steps, rates and the time they make."""
    alone = expected_rate(workload(subject.system, subject.box, cores))
    beside = expected_rate(workload(subject.system, subject.box, 1)) if side > 1 else alone
    before, each = preparation_steps(subject), subject.last_stage.steps
    count = len(subject.exposures)
    seconds = before / alone.steps_per_second
    seconds += math.ceil(count / side) * each / beside.steps_per_second
    spacing = subject.config.exposures is not None and subject.config.exposures.spacing is None
    rows = [
        Row("steps of preparation", before, "",
            "without the spacing of starts, which is found while equilibrating" if spacing else ""),
        Row("steps of a trajectory", each),
        Row("steps in all", before + count * each),
    ]
    if before or side == 1:
        rows.append(_rate(f"rate on {cores} threads", alone))
    if side > 1:
        rows.append(_rate("rate on 1 thread", beside))
    return [*rows, Row("time", seconds / 60.0, "min", "estimate, compilation and output left out")]


def _rate(name, rate):
    return Row(name, rate.steps_per_second, "steps/s", rate.source)


def preparation_steps(subject):
    """Steps of the unlit stages, and of the continuation where its spacing is known."""
    *unlit, _ = subject.config.stages
    steps, exposures = sum(stage.steps for stage in unlit), subject.config.exposures
    if unlit and exposures is not None and exposures.spacing is not None:
        steps += (exposures.starts - 1) * round(exposures.spacing / unlit[-1].timestep)
    return steps


def disk_bytes(subject):
    """{"trajectory": of one exposure, "preparation": of everything before}. [B]"""
    record, bodies = subject.config.record, subject.system.bodies
    size = 4 if record.precision == "single" else 8
    frame = sum(size * COMPONENTS.get(name, 3) for name in record.vectors)
    frame += 12 if "position" in record.vectors else 0
    lit = bool(subject.pulses) or subject.bias is not None
    length = subject.last_stage.length
    trajectory = (
        _frames(length, record.every) * frame * bodies
        + _frames(length, record.totals_every) * 8 * (TOTALS_LIT if lit else TOTALS_DARK)
    )
    starts = len({e.start for e in subject.exposures})
    *unlit, _ = subject.config.stages
    quiet = sum(stage.length for stage in unlit)
    exposures = subject.config.exposures
    if unlit and exposures is not None and exposures.spacing is not None:
        quiet += (exposures.starts - 1) * exposures.spacing
    preparation = (
        (_frames(quiet, record.totals_every) * 8 * TOTALS_DARK if unlit else 0)
        + starts * bodies * 8 * START_NUMBERS
    )
    return {"trajectory": trajectory, "preparation": preparation}


def _frames(length, every):
    return math.floor(length / every * (1.0 + 1e-9)) + 1


def memory_bytes(subject):
    """Resident memory of one process that moves the bodies. [B]"""
    system, box = subject.system, subject.box
    forces = system.interactions
    bytes_ = PROCESS_BYTES + SEGMENT_BYTES
    bytes_ += BODY_BYTES * system.bodies + SITE_BYTES * len(system.type_of_site)
    reach = forces.cutoff + LIST_SKIN + max(species.radius for species in system.species)
    listed = system.bodies / math.prod(box) * 4.0 / 3.0 * math.pi * reach**3
    bytes_ += 4.0 * LIST_SHARE * system.bodies * listed
    if forces.electrostatics == "mesh-ewald":
        spacing = forces.mesh_spacing or MESH_SPACING
        points = math.prod(edge / spacing for edge in box)
        bytes_ += MESH_POINT_BYTES[forces.precision] * points
        bytes_ += CHARGE_BYTES * (system.site_charge != 0.0).sum()
    return bytes_


def core_count():
    """Cores this process may use."""
    return len(os.sched_getaffinity(0)) if hasattr(os, "sched_getaffinity") else os.cpu_count() or 1


def free_bytes(output):
    """Free space where the run folder goes, or None where that cannot be told. [B]"""
    place = pathlib.Path(output).absolute()
    while not place.exists() and place != place.parent:
        place = place.parent
    try:
        return shutil.disk_usage(place).free
    except OSError:
        return None


def installed_bytes():
    """Memory of this machine, or None where that cannot be told. [B]"""
    try:
        return os.sysconf("SC_PAGE_SIZE") * os.sysconf("SC_PHYS_PAGES")
    except (AttributeError, ValueError, OSError):
        return None
