"""datapackage.json: the exchange folder described by the open Tabular Data Package standard, from the sheets."""

from __future__ import annotations

from typing import Any

from electrolog.record import columns as kinds
from electrolog.record.columns import LABEL_LIMIT, TEXT_LIMIT, Column
from electrolog.record.sheets import BY_NAME, SHEETS, Sheet

DESCRIPTOR_FILE = "datapackage.json"
# RFC 4180, said in full: readers differ in what they take for granted.
DIALECT = {
    "delimiter": ",",
    "lineTerminator": "\r\n",
    "quoteChar": '"',
    "doubleQuote": True,
    "skipInitialSpace": False,
    "header": True,
}


def descriptor() -> dict[str, Any]:
    """The same for every export: nothing in it depends on the record, the day or the machine."""
    return {
        "profile": "tabular-data-package",
        "name": "electrolog-exchange",
        "title": "Lives and calibrations of carbon-fibre microelectrodes",
        "resources": [_resource(sheet) for sheet in SHEETS if sheet.exchanged],
    }


def _resource(sheet: Sheet) -> dict[str, Any]:
    return {
        "profile": "tabular-data-resource",
        "name": sheet.name,
        "description": sheet.about,
        "path": f"{sheet.name}.csv",
        "format": "csv",
        "mediatype": "text/csv",
        "encoding": "utf-8",
        "dialect": DIALECT,
        "schema": _schema(sheet),
    }


def _schema(sheet: Sheet) -> dict[str, Any]:
    links = [column for column in sheet.columns if isinstance(column, kinds.Link)]
    schema: dict[str, Any] = {"fields": [_field(column) for column in sheet.columns], "missingValues": [""]}
    if sheet.key:
        schema["primaryKey"] = list(sheet.key)
    if links:
        schema["foreignKeys"] = [_foreign_key(link) for link in links]
    return schema


def _foreign_key(link: kinds.Link) -> dict[str, Any]:
    target = BY_NAME[link.to]
    return {
        "fields": [link.name],
        "reference": {"resource": target.name, "fields": [target.key[0]]},
    }


def _field(column: Column) -> dict[str, Any]:
    field: dict[str, Any] = {"name": column.name, "type": _type(column), "description": _description(column)}
    constraints = _constraints(column)
    if constraints:
        field["constraints"] = constraints
    return field


def _type(column: Column) -> str:
    if isinstance(column, kinds.Number):
        return "integer" if column.whole else "number"
    if isinstance(column, kinds.Moment):
        return "datetime"
    return "date" if isinstance(column, kinds.Day) else "string"


def _description(column: Column) -> str:
    if isinstance(column, kinds.Number):
        unit = f", in {column.unit.sign}" if column.unit.sign else ""
        above = f"; above {kinds.number_text(column.above)}" if column.above is not None else ""
        return f"{column.about}{unit}{above}"
    if isinstance(column, kinds.Word):
        return f"{column.about}; a word of the list '{column.kind}'"
    return column.about


def _constraints(column: Column) -> dict[str, Any]:
    found: dict[str, Any] = {"required": True} if column.required else {}
    if isinstance(column, kinds.Choice):
        found["enum"] = list(column.choices)
    if isinstance(column, kinds.Number):
        low = column.least if column.least is not None else column.above
        found |= {"minimum": low} if low is not None else {}
        found |= {"maximum": column.most} if column.most is not None else {}
    if isinstance(column, kinds.Text | kinds.Label):
        found["maxLength"] = TEXT_LIMIT if isinstance(column, kinds.Text) else LABEL_LIMIT
    return found
