"""How a model is marched."""
