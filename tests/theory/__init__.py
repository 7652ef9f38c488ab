"""Tests of the room `theory`."""
