"""Integers and graphs: the mathematics under the shop, knowing nothing of orders or machines."""
