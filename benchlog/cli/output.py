"""What every command prints for scripts."""

import json

import click


def print_json(data: object) -> None:
    """Print strict JSON: no NaN, no infinity."""
    click.echo(json.dumps(data, indent=2, allow_nan=False))
