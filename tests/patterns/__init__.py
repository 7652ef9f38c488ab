"""Tests of the room `patterns`."""
