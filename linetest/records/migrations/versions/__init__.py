"""Migrations of the record's database, one module a revision."""
