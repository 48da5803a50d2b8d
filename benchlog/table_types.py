"""Look into the types that describe a TOML file: keys, words, descriptions."""

from typing import Any, get_args, get_origin, get_type_hints

import msgspec


def item_of(hint: object) -> object:
    """Return what a list or a mapping holds, looking through unions and annotations."""
    origin = get_origin(hint)
    if origin is list:
        return get_args(hint)[0]
    if origin is dict:
        return get_args(hint)[1]
    found = (item_of(part) for part in get_args(hint))
    return next((item for item in found if item is not None), None)


def structs(hint: object) -> list[type[msgspec.Struct]]:
    """Return the tables that may stand at a place."""
    return [leaf for leaf in leaves(hint) if isinstance(leaf, type(msgspec.Struct))]


def leaves(hint: object) -> list[Any]:
    """Return the innermost parts of a type: classes, and the words of literals."""
    parts = [part for part in get_args(hint) if not isinstance(part, msgspec.Meta)]
    return [leaf for part in parts for leaf in leaves(part)] if parts else [hint]


def metas(hint: object) -> list[msgspec.Meta]:
    """Return the descriptions of a type, outermost first."""
    if isinstance(hint, msgspec.Meta):
        return [hint]
    own = [part for part in get_args(hint) if isinstance(part, msgspec.Meta)]
    own += getattr(hint, "__metadata__", ())
    deeper = [meta for part in get_args(hint) for meta in metas(part)]
    return own + [meta for meta in deeper if meta not in own]


def hints(struct: type[msgspec.Struct]) -> dict[str, object]:
    """Return the type of each key, by its name in the file."""
    by_field = get_type_hints(struct, include_extras=True)
    names = zip(struct.__struct_fields__, struct.__struct_encode_fields__, strict=True)
    return {written: by_field[field] for field, written in names}


def keys(struct: type[msgspec.Struct]) -> list[str]:
    """Return the keys of a table as written in the file, the one that names its kind first."""
    tag = struct.__struct_config__.tag_field
    return ([tag] if tag else []) + list(struct.__struct_encode_fields__)
