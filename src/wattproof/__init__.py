"""States what an audio amplifier really delivers, with evidence that someone else can re-check."""
