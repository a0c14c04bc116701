"""The tableau files that ship with newel: data only, one TOML file a method."""
