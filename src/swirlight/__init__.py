"""swirlight: molecular liquids in pulsed, circularly polarised light.

    config = swirlight.load_config("configs/first-light.yaml")
    run = swirlight.launch(config, into="runs/first")
    run["plus", 0].angular_momentum

Names are imported when they are first used, so that `import swirlight` costs nothing.
"""

import importlib

__version__ = "0.1.0"

_HOME = {
    "load_config": "swirlight.config",
    "load_species": "swirlight.species.library",
    "check": "swirlight.run.plan",
    "build": "swirlight.run.build",
    "launch": "swirlight.run.launch",
    "resume": "swirlight.run.launch",
    "open_run": "swirlight.store.run",
    "correlate": "swirlight.results.correlate",
    "correlation_map": "swirlight.results.correlate",
    "helicity_signature": "swirlight.results.correlate",
    "spectrum": "swirlight.results.spectrum",
    "linear_response": "swirlight.results.linear",
    "linear_range": "swirlight.results.linear",
    "response": "swirlight.results.response",
}
__all__ = ["__version__", *_HOME]


def __getattr__(name):
    if name not in _HOME:
        raise AttributeError(f"module 'swirlight' has no attribute {name!r}")
    value = getattr(importlib.import_module(_HOME[name]), name)
    globals()[name] = value
    return value


def __dir__():
    return sorted([*globals(), *_HOME])
