"""Which methods, controllers and sinks there are."""
