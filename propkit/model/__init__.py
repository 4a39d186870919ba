"""The immutable objects: propellant case, chamber, nozzle, performance."""
