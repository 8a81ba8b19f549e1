"""Write the reference pages from the tables that the program itself reads.

    python docs/make_reference.py

`case-file.md` comes from the table of keys, `network-file.md` from the fields table, `sources.md` from the
literature rows. A test holds that the pages are what this script writes.
"""

from __future__ import annotations

from pathlib import Path

from geomprep.case.keys import Key, key_table
from geomprep.literature import rows
from geomprep.model.fields import Field, field_tables

HERE = Path(__file__).parent


def case_file_page() -> str:
    """Every section and key of the case file."""
    parts = [
        "# The case file\n\nOne TOML file says everything about a run. A quantity is text with its unit "
        '(`"443 mL/min"`); a bare number where a unit is needed and an unknown key are errors. `[[name]]` may be '
        "repeated, `*` stands for a name of your choice.\n"
    ]
    for section, keys in key_table().items():
        title = f"[[{section.removesuffix('[]')}]]" if section.endswith("[]") else f"[{section}]"
        parts.append(
            f"\n## `{title}`\n\n| key | value | default | rule | example | meaning |\n|---|---|---|---|---|---|\n"
        )
        parts += [_key_row(key) for key in keys.values()]
    return "".join(parts)


def _key_row(key: Key) -> str:
    value = " or ".join(f"`{word}`" for word in key.words) if key.kind == "choice" else key.kind
    if key.words and key.kind != "choice":
        value += " or " + " or ".join(f"`{word}`" for word in key.words)
    cells = (f"`{key.key}`", value, key.default, key.rule, f"`{key.example}`" if key.example else "", key.description)
    return "| " + " | ".join(cell.replace("|", "\\|") for cell in cells) + " |\n"


def network_file_page() -> str:
    """Every table and field of the network file."""
    parts = [
        "# The network file\n\nJSON in UTF-8, SI values as plain numbers, units as UCUM codes in the block `units`. "
        "Tables that grow with the network are objects of equally long columns; short lists are lists of objects. "
        "Row numbers count from 0. Above 200,000 stations the columns of `stations` stand in a companion `.npz` that "
        "the block names with its SHA-256. "
        "`tests/reader_example.py` is a receiver in fewer than forty lines.\n"
    ]
    for name, table in field_tables().items():
        parts.append(f"\n## `{name or 'top level'}`\n\n{table.description}\n")
        if table.fields:
            parts.append("\n| field | type | unit | shape | range | basis | meaning |\n|---|---|---|---|---|---|---|\n")
            parts += [_field_row(field) for field in table.fields]
    return "".join(parts)


def _field_row(field: Field) -> str:
    low = "" if field.low is None else ("> " if field.above_low else "≥ ") + f"{field.low:g}"
    high = "" if field.high is None else f"≤ {field.high:g}"
    kind = " or ".join(f"`{word}`" for word in field.choices) if field.type == "choice" else field.type
    if field.nullable:
        kind += ", or null"
    basis = f"{field.basis}: {field.basis_detail}" if field.basis_detail else field.basis
    cells = (
        f"`{field.name}`",
        kind,
        field.unit,
        ", ".join(field.shape),
        " ".join((low, high)).strip(),
        basis,
        field.description,
    )
    return "| " + " | ".join(cell.replace("|", "\\|") for cell in cells) + " |\n"


def sources_page() -> str:
    """Every literature row."""
    parts = [
        "# Published numbers and relations\n\n`checked` says whether the number was seen in public text of the "
        "source, written from memory of it, or is common practice. A row from memory must be confirmed before it is "
        "quoted.\n\n"
        "| key | what | class | source | place | checked | note |\n|---|---|---|---|---|---|---|\n"
    ]
    for row in rows():
        source = row.citation + (f" doi:{row.doi}" if row.doi else "")
        checked = row.checked + (f" ({row.confidence} confidence)" if row.confidence else "")
        cells = (
            f"`{row.key}`",
            row.of,
            row.vessel_class,
            source,
            row.place,
            checked,
            " ".join((row.note, row.caution)).strip(),
        )
        parts.append("| " + " | ".join(cell.replace("|", "\\|") for cell in cells) + " |\n")
    return "".join(parts)


PAGES = {"case-file.md": case_file_page, "network-file.md": network_file_page, "sources.md": sources_page}

if __name__ == "__main__":
    for name, make in PAGES.items():
        (HERE / name).write_text(make(), encoding="utf-8")
