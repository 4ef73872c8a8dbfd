"""Windows on two axes, integer tile addresses, arrays of counts and their shading. Knows no maps."""
