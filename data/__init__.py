"""The demo sets; installed as `shopfloor.sample`, from where `shopfloor demo` copies them."""
