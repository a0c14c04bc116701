"""How one step is made, judged and filled in."""
