"""From the text of a launch config to a validated model, with a place for every fault."""

from swirlight.config.load import (
    config_hash,
    config_schema,
    load_config,
    parse_config,
    physical_differences,
    physical_part,
)
from swirlight.config.models import Config

__all__ = ["Config", "config_hash", "config_schema", "load_config", "parse_config",
           "physical_differences", "physical_part"]
