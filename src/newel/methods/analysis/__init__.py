"""Properties of a method, each defined once as data: name, function, unit, source."""
