"""Lower bounds: each a value, a witness and a sentence."""
