"""What is marched: the physics of a simulation."""
