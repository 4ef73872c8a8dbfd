"""The config: its keys, its records, its reader and schema."""
