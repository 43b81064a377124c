"""Life tables and rates by cause of death."""
