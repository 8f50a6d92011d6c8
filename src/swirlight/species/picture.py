"""A drawing of one body along its three axes."""

import numpy as np
from matplotlib.figure import Figure
from matplotlib.patches import Circle

from swirlight.species.describe import DEBYE, KINDS, group_of

# Three views that keep a right-handed pair of axes on the page; the third points at the reader.
VIEWS = (("x", "y", "z"), ("y", "z", "x"), ("z", "x", "y"))
POINT_RADIUS = 0.03  # nm, of a site without Lennard-Jones
COLOURS = ("#4477aa", "#ee6677", "#228833", "#ccbb44", "#66ccee", "#aa3377", "#bbbbbb")


def draw_species(species, path):
    """Draw a species to an image file; the suffix says which kind.

    Circles have the radius sigma/2; arrows show the directions of the dipole (black) and of
    the gyration (red), the cross the centre of mass.
    """
    radius = np.where(species.epsilon > 0, species.sigma / 2, POINT_RADIUS)
    reach = 1.05 * (np.abs(species.sites).max(axis=1) + radius).max()
    colour = {label: COLOURS[k % len(COLOURS)]
              for k, label in enumerate(dict.fromkeys(species.labels))}
    figure = Figure(figsize=(11, 4.2), layout="constrained")
    figure.suptitle(f"{species.name}: {KINDS[species.freedom]}, {species.total_mass:.4g} u, "
                    f"dipole {np.linalg.norm(species.dipole) / DEBYE:.3g} D, symmetry "
                    f"{group_of(species).name}; body frame")
    for axes, names in zip(figure.subplots(1, 3), VIEWS, strict=True):
        across, up, towards = ("xyz".index(name) for name in names)
        _sites(axes, species, radius, colour, across, up, towards)
        _arrows(axes, species, reach, across, up)
        axes.set(xlim=(-reach, reach), ylim=(-reach, reach), aspect="equal",
                 xlabel=f"{names[0]} / nm", ylabel=f"{names[1]} / nm",
                 title=f"{names[2]} towards you")
        axes.grid(True, linewidth=0.3)
        axes.set_axisbelow(True)
    figure.savefig(path, dpi=150)


def _sites(axes, species, radius, colour, across, up, towards):
    """Circles from far to near, with their labels."""
    for rank, k in enumerate(np.argsort(species.sites[:, towards], kind="stable")):
        centre = species.sites[k, [across, up]]
        axes.add_patch(Circle(centre, radius[k], facecolor=colour[species.labels[k]], alpha=0.45,
                              edgecolor="black", linewidth=0.8, zorder=2 + 0.01 * rank))
        axes.plot(*centre, "k.", markersize=4, zorder=4)
        axes.annotate(species.labels[k], centre, xytext=(4, 4), textcoords="offset points",
                      zorder=5, fontsize=9)


def _arrows(axes, species, reach, across, up):
    """Directions of dipole and gyration from the centre of mass, at fixed length."""
    axes.plot(0, 0, "k+", markersize=9, zorder=6)
    gyration = next((r.gyration for r in species.responses if r.gyration.any()), np.zeros(3))
    dust = 1e-9 * np.abs(species.charge).sum() * species.radius
    for vector, least, colour, name in ((species.dipole, dust, "black", "μ"),
                                        (gyration, 0.0, "#bb2200", "g")):
        size = np.linalg.norm(vector)
        if size <= least:
            continue
        tip = 0.8 * reach * vector[[across, up]] / size
        if np.hypot(*tip) < 0.02 * reach:
            continue  # it points at the reader or away
        arrow = {"arrowstyle": "-|>", "color": colour, "linewidth": 1.6}
        axes.annotate("", tip, (0, 0), zorder=6, arrowprops=arrow)
        axes.annotate(name, tip, xytext=(5, -10), textcoords="offset points", color=colour,
                      zorder=6)
