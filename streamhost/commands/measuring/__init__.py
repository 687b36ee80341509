"""What the instruments of `measure` say on a terminal: a module for each."""
