"""Pure calculation: arrays in, frozen records out."""

VERSION = "0.4.0"  # pyproject.toml says the same
