"""The running shift: what moved between plans, what really happened, and what is left to plan anew."""
