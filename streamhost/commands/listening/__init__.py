"""What `streamhost listen` does: on the clock or on a sound card, unattended or with a terminal."""
