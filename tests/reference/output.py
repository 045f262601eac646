"""Writes reference results as JSON that is short and still comparable line by line: lists of numbers stay on one line."""

import json


def is_plain(value):
    """Numbers, texts, and lists of nothing else."""
    if isinstance(value, list):
        return all(is_plain(item) for item in value)
    return not isinstance(value, dict)


def text(value, indent=""):
    if is_plain(value):
        return json.dumps(value, ensure_ascii=False)
    inner = indent + " "
    if isinstance(value, dict):
        rows = [f"{inner}{json.dumps(key)}: {text(item, inner)}" for key, item in value.items()]
        return "{\n" + ",\n".join(rows) + f"\n{indent}}}"
    return "[\n" + ",\n".join(inner + text(item, inner) for item in value) + f"\n{indent}]"


def write(content, path):
    with open(path, "w", encoding="utf-8") as file:
        file.write(text(content) + "\n")
