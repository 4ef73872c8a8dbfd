"""Reading YAML and kinds of values, with refusals that name the place."""
