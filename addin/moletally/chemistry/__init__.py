"""Text and numbers on a sheet become a network: species, equations, rate laws, constants, units, streams."""
