"""Small models, addressed on the command line as `example:name`."""
