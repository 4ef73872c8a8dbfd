"""Map families: records, their reader, the catalogue."""
