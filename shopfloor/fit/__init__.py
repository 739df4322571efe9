"""Which orders to run this shift and which to carry over, with proof that the chosen ones fit."""
